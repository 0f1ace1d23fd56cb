// The frames' own truth: geometry, blur of an upright edge, of a plane on both sides of focus, occlusion, motion.
#include "tests/render/frame.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <memory>
#include <numbers>
#include <opencv2/imgproc.hpp>

namespace focusfall::render {
namespace {

constexpr float kLow = 0.1f, kHigh = 0.6f;

LensSpec small_frame() { return {.focal_length_mm = 200, .f_number = 2.8, .focus_m = 20, .width_px = 240, .height_px = 160}; }

constexpr double kEdgeAngleDeg = 7;  // a vertical edge would meet all rows at the same phase of the pixel grid

// Corners of everything right of the line through `centre` that leans by kEdgeAngleDeg.
std::vector<cv::Point2d> right_half(cv::Point2d centre) {
  const double angle = kEdgeAngleDeg * std::numbers::pi / 180;
  const cv::Point2d across(std::cos(angle), std::sin(angle)), along(-across.y, across.x);
  const double far = 5000;
  return {centre - far * along, centre + far * along, centre + far * along + far * across,
          centre - far * along + far * across};
}

// A board of `side` texels, opaque and dark, with a bright half right of its middle; the edge passes the axis.
cv::Mat step_board_picture(bool opaque_left) {
  Canvas canvas(cv::Size(2048, 2048), 4, 1);
  if (opaque_left) canvas.clear({kLow, kLow, kLow});
  canvas.fill_convex(right_half({1023.5, 1023.5}), {kHigh, kHigh, kHigh});
  return canvas.picture();
}

Surface step_board(const LensSpec& lens, double depth_m, double texels_per_px, bool opaque_left = true) {
  const double texel = metres_per_px(lens, depth_m) / texels_per_px;
  return billboard(std::make_shared<MipTexture>(step_board_picture(opaque_left), false),
                   {.depth_m = depth_m, .left_m = -1024 * texel, .bottom_m = 1024 * texel, .texel_m = texel});
}

// Variance and mean of the line spread across an edge of kEdgeAngleDeg through the centre, from the moments of the
// edge spread, see render_test.cpp. Pixels are averaged in bins of 1/8 px, each placed at the mean of its own distances
// (few rows fill a bin unevenly), and integrated by trapezoids.
struct Moments {
  double mean = 0, variance = 0;
};
Moments moments(const cv::Mat& linear, double angle_deg = kEdgeAngleDeg, double reach = 55) {
  const double angle = angle_deg * std::numbers::pi / 180;
  const double cx = (linear.cols - 1) / 2.0, cy = (linear.rows - 1) / 2.0;
  constexpr int kBinsPerPx = 8;
  std::vector<double> sum(static_cast<std::size_t>(2 * reach * kBinsPerPx)), count(sum.size()), place(sum.size());
  for (int y = 0; y < linear.rows; ++y) {
    for (int x = 0; x < linear.cols; ++x) {
      const double u = (x - cx) * std::cos(angle) + (y - cy) * std::sin(angle);
      const double bin = std::floor((u + reach) * kBinsPerPx);
      if (bin < 0 || bin >= static_cast<double>(sum.size())) continue;
      sum[static_cast<std::size_t>(bin)] += static_cast<double>(linear.at<cv::Vec3f>(y, x)[1]);
      count[static_cast<std::size_t>(bin)] += 1;
      place[static_cast<std::size_t>(bin)] += u;
    }
  }
  Moments m;
  double second = 0, last_u = -reach, last_rise = 0;
  for (std::size_t i = 0; i < sum.size(); ++i) {
    if (count[i] == 0) continue;
    const double u = place[i] / count[i], rise = (sum[i] / count[i] - kLow) / (kHigh - kLow);
    // Between two places the rise adds its step at their middle: mean and second moment of the line spread itself.
    const double middle = (u + last_u) / 2, step = rise - last_rise, width = u - last_u;
    m.mean += step * middle;
    second += step * (middle * middle + width * width / 12);
    last_u = u;
    last_rise = rise;
  }
  m.variance = second - m.mean * m.mean;
  return m;
}

TEST(Frame, UprightEdgeIsBlurredByTheThinLensDiscOnBothSidesOfFocus) {
  for (const double disc : {0.0, 4.0, -4.0, 12.0, -20.0}) {
    LensSpec lens = small_frame();
    const double depth = 20;
    lens.focus_m = focus_for_disc_m(lens, depth, disc);
    ASSERT_NEAR(signed_disc_px(lens, depth), disc, 1e-9);
    FrameSpec spec{.lens = lens, .surfaces = {step_board(lens, depth, 4)}};
    const Moments measured = moments(render_linear_frame(spec));
    // Disc, pixel, nearest texel of 1/4 px; a ray of N in a disc adds up to 1/N of the disc's variance.
    const double expected = disc * disc / 16 + 1.0 / 12 + 1.0 / (16 * 6);
    // The bins add .0013; the mean over 160 rows of 36-80 rays leaves a noise of some 1e-4 in level, weighted by u.
    EXPECT_NEAR(measured.variance, expected, 0.015 + 0.02 * expected) << disc;
    EXPECT_NEAR(measured.mean, 0, 0.05) << disc;  // the texture's middle lies half a texel off, 1/8 px
  }
}

TEST(Frame, MotionAddsItsLengthSquaredByTwelve) {
  const LensSpec lens = small_frame();
  FrameSpec spec{.lens = lens, .surfaces = {step_board(lens, 20, 4)}};
  spec.surfaces[0].motion_px = {6, 0};
  spec.camera_motion_px = {3, 2};
  // Across the edge the length is 9 cos 7 + 2 sin 7 degrees.
  const double angle = kEdgeAngleDeg * std::numbers::pi / 180, along = 9 * std::cos(angle) + 2 * std::sin(angle);
  const double expected = along * along / 12 + 1.0 / 12 + 1.0 / 96;
  EXPECT_NEAR(moments(render_linear_frame(spec)).variance, expected, 0.015 + 0.01 * expected);
}

TEST(Frame, LowPassFilterAddsAQuarterOfItsSpacingSquared) {
  const LensSpec lens = small_frame();
  FrameSpec spec{.lens = lens, .surfaces = {step_board(lens, 20, 4)}};
  spec.low_pass_px = 1.2;
  // Two images w apart have the variance w^2/4, whatever the direction with the same spacing in x and y.
  const double expected = 1.2 * 1.2 / 4 + 1.0 / 12 + 1.0 / 96;
  EXPECT_NEAR(moments(render_linear_frame(spec)).variance, expected, 0.015 + 0.01 * expected);
}

TEST(Frame, SignedDiscOnTheGroundIsAffineInTheFrame) {
  LensSpec lens = small_frame();
  const Surface lawn = ground(std::make_shared<MipTexture>(cv::Mat(64, 64, CV_32FC4, cv::Scalar(0.2, 0.3, 0.1, 1)), true),
                              {.height_m = 1.4, .pitch_deg = 4});
  const PlaneTruth truth = plane_truth(lens, lawn);
  // A point of the ground at depth z stands y below the axis: y = (h - z sin) / cos.
  const double pitch = 4 * std::numbers::pi / 180;
  for (const double z : {15.0, 20.0, 40.0}) {
    const cv::Point2d at = project(lens, {1.0, (1.4 - z * std::sin(pitch)) / std::cos(pitch), z});
    EXPECT_NEAR(truth.at(at.x, at.y), signed_disc_px(lens, z), 1e-9);
  }
  // measurement: k = f cos(pitch) / (N h), exact.
  EXPECT_NEAR(truth.y_gradient, 0.2 / 2.8 * std::cos(pitch) / 1.4, 1e-12);
  EXPECT_EQ(truth.x_gradient, 0);
}

TEST(Frame, GroundShowsTheDiscOfItsOwnDepth) {
  // A stripe's edge on the ground, which the view makes lean by about seven degrees: its foot lies beside the camera.
  // Along a row it is an edge at a known place, and the disc of that row blurs it.
  LensSpec lens = small_frame();
  lens.height_px = 161;
  Canvas canvas(cv::Size(4096, 64), 4, 1);
  canvas.clear({kLow, kLow, kLow});
  const std::vector<cv::Point2d> half{{2047.5, -9}, {9999, -9}, {9999, 99}, {2047.5, 99}};
  canvas.fill_convex(half, {kHigh, kHigh, kHigh});
  const double height = 0.8, pitch = 2.2 * std::numbers::pi / 180, texel = metres_per_px(lens, 20) / 4;
  for (const int row : {20, 60, 140}) {
    Surface stripes = ground(std::make_shared<MipTexture>(canvas.picture(), true),
                             {.height_m = height, .pitch_deg = 2.2, .texel_x_m = texel, .texel_z_m = texel * 20});
    // The edge passes (0, 0) of the frame's row at depth z of that row and leans by atan(offset / (height / cos)).
    const double ty = (row - 80) / (image_distance_m(lens) / (lens.pitch_um * 1e-6));
    const double depth = height / (ty * std::cos(pitch) + std::sin(pitch));
    const double slope = std::tan(kEdgeAngleDeg * std::numbers::pi / 180);
    // x = px_per_tangent * X / z with X constant and 1/z = (ty cos + sin) / h: dx/dty = X cos / h. The row itself lies
    // at X / z, which the shear below takes out again.
    const double side = -slope * height / std::cos(pitch);
    stripes.origin[0] = side - 2048 * texel;
    FrameSpec spec{.lens = lens, .surfaces = {stripes}, .effort = 4};
    const cv::Mat linear = render_linear_frame(spec);
    const double centre_x = side / depth * image_distance_m(lens) / (lens.pitch_um * 1e-6) + 119.5;
    const int half_width = std::min({70, static_cast<int>(centre_x), 238 - static_cast<int>(centre_x)});
    ASSERT_GT(half_width, 40);
    const int left = static_cast<int>(std::lround(centre_x)) - half_width;
    const cv::Mat part = linear(cv::Rect(left, row - 4, 2 * half_width + 1, 9));
    const Moments measured = moments(part, kEdgeAngleDeg, half_width - 2);
    const double disc = plane_truth(lens, stripes).at(centre_x, row);
    const double expected = disc * disc / 16 + 1.0 / 12 + 1.0 / 96;
    // Nine rows around the row: the disc changes by k = .09 px a row, at most .36 px either way.
    EXPECT_NEAR(measured.variance, expected, 0.03 + 0.03 * expected) << row << ", disc " << disc;
  }
}

TEST(Frame, SharpSubjectKeepsItsOutlineBeforeABlurredBackground) {
  // A half-board in focus before a dark board far behind it: its outline is as sharp as its own markings.
  const LensSpec lens = small_frame();
  Canvas far(cv::Size(64, 64), 4, 1);
  far.clear({kLow, kLow, kLow});
  FrameSpec spec{.lens = lens};
  spec.surfaces = {step_board(lens, 20, 4, false),
                   billboard(std::make_shared<MipTexture>(far.picture(), false), {200, -50, 50, 1.6})};
  EXPECT_NEAR(moments(render_linear_frame(spec)).variance, 1.0 / 12 + 1.0 / 96, 0.015);
}

TEST(Frame, BlurredOutlineLetsTheSharpBackgroundThroughByTheShareOfTheLens) {
  // The same half-board near the lens, out of focus, before a sharp dark board: the outline is the integral of the disc.
  const LensSpec lens = small_frame();
  Canvas far(cv::Size(2048, 2048), 4, 1);
  far.clear({kLow, kLow, kLow});
  FrameSpec spec{.lens = lens};
  const double depth = 17, disc = signed_disc_px(lens, depth);
  ASSERT_GT(disc, 4);
  const double texel = metres_per_px(lens, 20);
  spec.surfaces = {step_board(lens, depth, 4, false),
                   billboard(std::make_shared<MipTexture>(far.picture(), false), {20, -1024 * texel, 1024 * texel, texel})};
  const double expected = disc * disc / 16 + 1.0 / 12 + 1.0 / 96;
  EXPECT_NEAR(moments(render_linear_frame(spec)).variance, expected, 0.015 + 0.02 * expected);
}

TEST(CaptureData, LeavesThePictureAsItIs) {
  const LensSpec lens = small_frame();
  FrameSpec spec{.lens = lens, .surfaces = {step_board(lens, 25, 2)}};
  spec.camera.jpeg_quality = 90;
  const Picture picture = render_frame(spec);
  const Picture again = decode_jpeg(with_capture_data(picture.jpeg, lens, {.focus_distance_m = 20.2, .focus_area = cv::Rect(60, 40, 100, 80), .orientation = 8}));
  EXPECT_GT(again.jpeg.size(), picture.jpeg.size() + 300);
  EXPECT_EQ(cv::norm(picture.rgb, again.rgb, cv::NORM_INF), 0);
}

TEST(Frame, SameKeySameBytesWhateverTheThreads) {
  const LensSpec lens = small_frame();
  FrameSpec spec{.lens = lens, .surfaces = {step_board(lens, 25, 2)}};
  spec.camera = {.iso_speed = 400, .jpeg_quality = 90};
  const int threads = cv::getNumThreads();
  const auto first = render_frame(spec).jpeg;
  cv::setNumThreads(1);
  EXPECT_EQ(first, render_frame(spec).jpeg);
  cv::setNumThreads(threads);
}

}  // namespace
}  // namespace focusfall::render
