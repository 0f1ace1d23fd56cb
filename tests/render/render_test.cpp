// The renderer's own truth: what it says it did to the light must be there in the numbers.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <opencv2/imgproc.hpp>
#include <vector>

#include "tests/render/tile.h"

namespace focusfall::render {
namespace {

// Variance of the line spread of a step_edges tile, from the moments of the edge spread: for an edge spread E that
// rises from 0 to 1, var = integral of 2 u (H(u) - E(u)) du - mean^2, mean = integral of (H(u) - E(u)) du. Pixels are
// sorted by their distance to the known edge into fine bins; no fit and no derivative.
double measured_lsf_variance(const cv::Mat& linear, const TileSpec& spec) {
  const double angle = spec.edge_angle_deg * std::numbers::pi / 180;
  const double centre = (spec.size_px - 1) / 2.0;
  const double reach = spec.size_px * 0.35;
  constexpr int kBinsPerPx = 8;
  const int bins = static_cast<int>(2 * reach * kBinsPerPx);
  std::vector<double> sum(static_cast<std::size_t>(bins)), count(static_cast<std::size_t>(bins));
  for (int y = 0; y < linear.rows; ++y) {
    for (int x = 0; x < linear.cols; ++x) {
      const double along = -(x - centre) * std::sin(angle) + (y - centre) * std::cos(angle);
      if (std::abs(along) > spec.size_px * 0.3) continue;
      const double u = (x - centre) * std::cos(angle) + (y - centre) * std::sin(angle);
      const int bin = static_cast<int>(std::floor((u + reach) * kBinsPerPx));
      if (bin < 0 || bin >= bins) continue;
      sum[static_cast<std::size_t>(bin)] += linear.at<float>(y, x);
      count[static_cast<std::size_t>(bin)] += 1;
    }
  }
  double mean = 0, second = 0;
  for (int i = 0; i < bins; ++i) {
    const auto k = static_cast<std::size_t>(i);
    if (count[k] == 0) return -1;
    const double u = (i + 0.5) / kBinsPerPx - reach;
    const double rise = (sum[k] / count[k] - spec.edge_low) / (spec.edge_high - spec.edge_low);
    const double difference = (u > 0 ? 1.0 : 0.0) - rise;
    mean += difference / kBinsPerPx;
    second += 2 * u * difference / kBinsPerPx;
  }
  return second - mean * mean;
}

TEST(Tile, EdgeHasTheLineSpreadVarianceOfDiscMotionAndPixel) {
  for (const double disc : {0.0, 2.0, 5.0, 12.0, 24.0}) {
    for (const double motion : {0.0, 9.0}) {
      TileSpec spec{.size_px = 192, .texture = Texture::step_edges};
      spec.blur = {.disc_px = disc, .motion_px = motion, .motion_angle_deg = 30};
      spec.edge_angle_deg = 7;
      const double measured = measured_lsf_variance(render_linear_tile(spec), spec);
      const double expected = lsf_variance_px2(spec.blur, spec.edge_angle_deg);
      // Sorting into bins of 1/8 px moves each pixel by up to 1/16 px: (1/8)^2/12 = .0013 px^2 on the variance; the
      // rest is float arithmetic over a window of 130 px, where an error of 1e-5 in level weighs u du = .04 px^2.
      EXPECT_NEAR(measured, expected, 0.01 + 0.004 * expected) << "disc " << disc << " motion " << motion;
    }
  }
}

TEST(Tile, PixelApertureAloneIsNotWidenedByTheFineGrid) {
  for (const double angle : {3.0, 12.0, 41.0, 78.5}) {
    TileSpec spec{.size_px = 160, .texture = Texture::step_edges};
    spec.edge_angle_deg = angle;
    // Variance of a square pixel projected on any direction is 1/12.
    EXPECT_NEAR(measured_lsf_variance(render_linear_tile(spec), spec), 1.0 / 12, 0.008) << angle;
  }
}

// The slow obvious version of one pixel of an edge: the closed form of a disc's edge spread, averaged over points of
// the pixel and of the motion.
double edge_pixel(const TileSpec& spec, int x, int y) {
  const double angle = spec.edge_angle_deg * std::numbers::pi / 180, turn = spec.blur.motion_angle_deg * std::numbers::pi / 180;
  const double centre = (spec.size_px - 1) / 2.0, radius = spec.blur.disc_px / 2;
  constexpr int kSteps = 40;
  const int moves = spec.blur.motion_px > 0 ? kSteps : 1;
  double sum = 0;
  for (int m = 0; m < moves; ++m) {
    const double along = spec.blur.motion_px * ((m + 0.5) / moves - 0.5) * std::cos(turn - angle);
    for (int i = 0; i < kSteps * kSteps; ++i) {
      const double px = x - centre + (i % kSteps + 0.5) / kSteps - 0.5, py = y - centre + (i / kSteps + 0.5) / kSteps - 0.5;
      const double u = px * std::cos(angle) + py * std::sin(angle) - along;
      const double t = radius > 0 ? std::clamp(u / radius, -1.0, 1.0) : (u > 0 ? 1.0 : -1.0);
      sum += 0.5 + (std::asin(t) + t * std::sqrt(1 - t * t)) / std::numbers::pi;
    }
  }
  return spec.edge_low + (spec.edge_high - spec.edge_low) * sum / (moves * kSteps * kSteps);
}

TEST(Tile, PixelsOfAnEdgeAreThoseOfTheDirectIntegral) {
  for (const BlurSpec& blur : {BlurSpec{}, BlurSpec{.disc_px = 3}, BlurSpec{.disc_px = 11}, BlurSpec{.disc_px = 4, .motion_px = 7, .motion_angle_deg = 50}}) {
    TileSpec spec{.size_px = 96, .texture = Texture::step_edges, .blur = blur};
    spec.edge_angle_deg = 23;
    const cv::Mat linear = render_linear_tile(spec);
    double worst = 0;
    for (int i = 0; i < 60; ++i) {
      const int x = 36 + i % 24, y = 40 + 7 * (i % 3);
      worst = std::max(worst, std::abs(static_cast<double>(linear.at<float>(y, x)) - edge_pixel(spec, x, y)));
    }
    // Bands beyond twice the sampling rate are cut on the fine grid: at most .3 % of the step rings where the pixel
    // alone is the blur, far less behind a disc.
    EXPECT_LT(worst, 0.003 * (spec.edge_high - spec.edge_low) + 1e-4) << "disc " << blur.disc_px << " motion " << blur.motion_px;
  }
}

TEST(Optics, DefocusedOtfHasTheTabulatedValues) {
  // check-values: exact defocused OTF, circular opening (Hopkins 1955), recomputed with scipy.
  EXPECT_NEAR(defocused_otf(0.25, 0.1), 0.838860, 2e-6);
  EXPECT_NEAR(defocused_otf(0.5, 0.5), 0.084609, 2e-6);
  EXPECT_NEAR(defocused_otf(1, 0.2), -0.014414, 2e-6);
  EXPECT_NEAR(defocused_otf(2, 0.7), -0.001668, 2e-6);
  EXPECT_NEAR(defocused_otf(0, 0.3), diffraction_otf(1, 0.3), 1e-5);
  EXPECT_NEAR(diffraction_otf(1, 0.4), 0.504632, 1e-6);
}

TEST(Optics, ExactDefocusTendsToTheDiscAtLargeWavefrontError) {
  // At c = 8 W lambda N / p with W = 20 the geometric disc holds for low frequencies.
  const double wavefront_error = 20, lambda_n_over_p = 0.1, disc = 8 * wavefront_error * lambda_n_over_p;
  for (const double f : {0.01, 0.02, 0.03})
    EXPECT_NEAR(defocused_otf(wavefront_error, f * lambda_n_over_p), disc_otf(disc, f), 0.01) << f;
}

TEST(Camera, NoiseVarianceIsAsAsked) {
  TileSpec spec{.size_px = 256, .texture = Texture::flat};
  spec.edge_high = 0.3;
  spec.camera.iso_speed = 6400;
  const Picture picture = render_tile(spec);
  cv::Mat red;
  cv::extractChannel(picture.rgb, red, 0);
  cv::Scalar mean, deviation;
  cv::meanStdDev(red, mean, deviation);
  const NoiseModel noise = noise_of(6400);
  const double linear = std::sqrt(noise.slope * 0.3 + noise.floor);
  // Slope of the sRGB curve at .3 linear, in codes; plus 1/12 for rounding.
  const double slope = 255 * 1.055 / 2.4 * std::pow(0.3, 1 / 2.4 - 1);
  const double expected = std::sqrt(slope * slope * linear * linear + 1.0 / 12);
  // Standard error of a standard deviation over 65,536 pixels is .28 %; the curve's bend adds about 1 %.
  EXPECT_NEAR(deviation[0], expected, 0.02 * expected);
}

TEST(Tile, SameKeySameTileAndAnotherKeyAnother) {
  TileSpec spec{.size_px = 96, .texture = Texture::mixed};
  spec.camera.iso_speed = 400;
  spec.camera.jpeg_quality = 90;
  const Picture first = render_tile(spec), second = render_tile(spec);
  EXPECT_EQ(first.jpeg, second.jpeg);
  spec.random_key = 2;
  EXPECT_NE(first.jpeg, render_tile(spec).jpeg);
}

TEST(Random, FirstNumbersAreThoseOfTheReference) {
  // Guards the sets of the accuracy tables: a change of the generator changes every tile.
  Random random(1);
  const std::uint64_t first = random.bits();
  EXPECT_EQ(first, Random(1).bits());
  double sum = 0, squares = 0;
  constexpr int kCount = 100000;
  for (int i = 0; i < kCount; ++i) {
    const double value = random.normal();
    sum += value;
    squares += value * value;
  }
  EXPECT_NEAR(sum / kCount, 0, 4 / std::sqrt(kCount));            // 4 standard errors
  EXPECT_NEAR(squares / kCount, 1, 4 * std::sqrt(2.0 / kCount));  // of mean and variance
}

TEST(Camera, MosaicOfANeutralPictureStaysNeutralAndKeepsItsMean) {
  TileSpec spec{.size_px = 128, .texture = Texture::flat};
  spec.camera.iso_speed = 0;
  spec.camera.mosaic = true;
  const Picture picture = render_tile(spec);
  double low = 0, high = 0;
  cv::minMaxLoc(picture.rgb.reshape(1), &low, &high);
  EXPECT_EQ(low, high);
  EXPECT_EQ(low, std::round(255 * srgb_encode(static_cast<float>(spec.edge_high))));
}

TEST(Tile, BlurNeverRaisesTheVarianceOfAScene) {
  double last = 1e9;
  for (const double disc : {0.0, 2.0, 4.0, 8.0, 16.0}) {
    TileSpec spec{.size_px = 128, .texture = Texture::dead_leaves};
    spec.blur.disc_px = disc;
    spec.random_key = 5;
    cv::Scalar mean, deviation;
    cv::meanStdDev(render_linear_tile(spec), mean, deviation);
    EXPECT_LT(deviation[0], last);
    last = deviation[0];
  }
}

}  // namespace
}  // namespace focusfall::render
