#include "tests/render/exposure_shoot.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include <opencv2/imgproc.hpp>

#include "tests/render/random.h"

namespace focusfall::render {
namespace {

constexpr std::array kMarks = {1.4, 2.0, 2.8, 4.0, 5.6, 8.0, 11.0, 16.0};
constexpr int kMarginPx = 16;
constexpr double kTypicalContrast = 0.3;   // what CameraSpec calls a usual look

// Overlapping rectangles and ellipses of a palette over some five stops, a bright sky that fades towards the horizon,
// fine texture, and a few lamps far above everything else.
cv::Mat drawn_scene(const ShootSpec& spec, Random random) {
  const int width = spec.width_px + 2 * kMarginPx, height = spec.height_px + 2 * kMarginPx;
  cv::Mat scene(height, width, CV_32FC3);
  const double sky_ev = random.uniform(-0.2, 1.2), horizon = random.uniform(0.2, 0.4);
  for (int y = 0; y < height; ++y) {
    const double ev = y < horizon * height ? sky_ev - 1.5 * y / (horizon * height) : random.uniform(-0.02, 0.02) - 2.2;
    const float level = static_cast<float>(std::exp2(ev));
    scene.row(y).setTo(cv::Scalar(0.9 * static_cast<double>(level), static_cast<double>(level), static_cast<double>(level) * 1.1));
  }
  for (int i = 0; i < 90; ++i) {
    const double level = std::exp2(random.uniform(-5.0, -0.6));
    const cv::Scalar colour(level * random.uniform(0.6, 1.3), level * random.uniform(0.8, 1.1), level * random.uniform(0.5, 1.3));
    const cv::Point centre(random.below(width), static_cast<int>(height * random.uniform(0.25, 1)));
    const cv::Size half(20 + random.below(90), 20 + random.below(70));
    if (random.below(2) == 0) {
      cv::rectangle(scene, {centre - cv::Point(half), centre + cv::Point(half)}, colour, cv::FILLED);
    } else {
      cv::ellipse(scene, centre, half, random.uniform(0, 180), 0, 360, colour, cv::FILLED);
    }
  }
  cv::GaussianBlur(scene, scene, {}, 1.2);
  for (int y = 0; y < height; ++y) {
    for (int x = 0; x < width; ++x) scene.at<cv::Vec3f>(y, x) *= static_cast<float>(std::exp2(0.08 * random.normal()));
  }
  for (int i = 0; i < 3; ++i) {
    const cv::Point at(random.below(width), random.below(height));
    cv::circle(scene, at, 2, cv::Scalar::all(30), cv::FILLED);
  }
  return scene;
}

// What the lens loses towards the corners, stops at the corner.
double corner_loss_ev(double f_number) { return f_number < 1.5 ? 0.7 : f_number < 2.1 ? 0.25 : 0; }

// One frame: displaced, exposed, vignetted, developed.
Picture exposed(const cv::Mat& scene, const ShootSpec& spec, const ShootFrame& frame, Random& random) {
  const auto displaced = [&] { return kMarginPx + static_cast<int>(std::lround(random.uniform(-spec.shake_px, spec.shake_px))); };
  cv::Mat light = scene(cv::Rect(displaced(), displaced(), spec.width_px, spec.height_px)) * std::exp2(frame.gain_ev);
  const double loss_ev = corner_loss_ev(frame.f_number);
  const double radius2 = 0.25 * (spec.width_px * spec.width_px + spec.height_px * spec.height_px);
  for (int y = 0; loss_ev > 0 && y < light.rows; ++y) {
    for (int x = 0; x < light.cols; ++x) {
      const double dx = x - 0.5 * light.cols, dy = y - 0.5 * light.rows, r2 = (dx * dx + dy * dy) / radius2;
      light.at<cv::Vec3f>(y, x) *= static_cast<float>(std::exp2(-loss_ev * r2 * r2));
    }
  }
  CameraSpec camera;
  camera.tone_contrast = spec.curve == ToneCurve::s_shaped ? kTypicalContrast : 0;
  camera.jpeg_quality = 92;
  return develop(light, camera, random.branch(4));
}

double light_ev(const ShootSpec& spec, int frame, double phase) {
  const double part = static_cast<double>(frame) / std::max(1, spec.frames - 1);
  switch (spec.light) {
    case LightCourse::steady: return 0;
    case LightCourse::drift: return spec.light_change_ev * 0.5 * std::sin(std::numbers::pi * (1.3 * part + phase));
    case LightCourse::cloud: return part > 0.3 + 0.4 * phase ? -spec.light_change_ev : 0;
  }
  return 0;
}

}  // namespace

Shoot render_shoot(const ShootSpec& spec) {
  Random random(spec.key);
  Shoot shoot;
  shoot.scene = drawn_scene(spec, random.branch(1));
  Random settings = random.branch(2), pixels = random.branch(3);
  const double phase = settings.uniform(0, 1);
  for (int i = 0; i < spec.frames; ++i) {
    ShootFrame frame;
    const int mark = i % static_cast<int>(kMarks.size());
    frame.f_number = kMarks[static_cast<std::size_t>(mark)];
    // A level between two stops under and one over, in thirds; the time, in thirds of exact steps, follows from it.
    const double wanted_ev = -2 + settings.below(10) / 3.0;
    const double time_ev = std::round(3 * (wanted_ev + mark - 9)) / 3;
    frame.exposure_time_s = std::exp2(time_ev);
    frame.exposure_ev = std::log2(100.0) + time_ev - mark - 1;   // f/1.4 is one stop, f/16 eight
    frame.light_ev = light_ev(spec, i, phase);
    frame.error_ev = spec.repeatability_ev * settings.normal();
    if (frame.f_number == spec.wrong_f_number) frame.error_ev += spec.wrong_ev;
    frame.gain_ev = time_ev - mark + 9 + frame.light_ev + frame.error_ev + spec.bright_ev;
    frame.taken_at_s = 4.0 * i;
    frame.picture = exposed(shoot.scene, spec, frame, pixels);
    shoot.frames.push_back(std::move(frame));
  }
  return shoot;
}

double highlight_truth_ev(const cv::Mat& scene, double share) {
  const cv::Mat inner = scene(cv::Rect(kMarginPx, kMarginPx, scene.cols - 2 * kMarginPx, scene.rows - 2 * kMarginPx));
  std::vector<float> largest;
  largest.reserve(inner.total());
  for (int y = 0; y < inner.rows; ++y) {
    for (int x = 0; x < inner.cols; ++x) {
      const cv::Vec3f pixel = inner.at<cv::Vec3f>(y, x);
      largest.push_back(std::max({pixel[0], pixel[1], pixel[2]}));
    }
  }
  const auto place = largest.begin() + static_cast<std::ptrdiff_t>((1 - share) * static_cast<double>(largest.size()));
  std::nth_element(largest.begin(), place, largest.end());
  return std::log2(static_cast<double>(*place));
}

}  // namespace focusfall::render
