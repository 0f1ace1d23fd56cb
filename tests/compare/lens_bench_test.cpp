#include "analysis/compare/lens_bench.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <numbers>
#include <random>
#include <vector>

namespace focusfall {
namespace {

// A series of eleven positions 40 um apart at f/2.8 and 6 um pixels: k = 1 / (2.8 x 6) px per um. Errors as regions of
// rendered frames have them: 6 % of c and .2 px.
std::vector<FocusStep> series(double best_um, std::mt19937_64& random) {
  std::normal_distribution<double> normal;
  std::vector<FocusStep> steps;
  for (int i = 0; i < 11; ++i) {
    const double position_um = 40.0 * i, c = std::abs(position_um - best_um) / (2.8 * 6);
    const double sigma = std::hypot(2 * c * std::hypot(0.06 * c, 0.2), 0.4);
    steps.push_back({position_um, 1.5 + c * c + sigma * normal(random), sigma});
  }
  return steps;
}

// 2,000 series tell 95 % to 1 % (two standard errors).
TEST(BestFocus, IntervalCoversTheTruth) {
  std::mt19937_64 random(41);
  int covered = 0, found = 0;
  for (int i = 0; i < 2000; ++i) {
    const auto best = best_focus(series(170, random));
    if (!best) continue;
    ++found;
    covered += best->position_um.low <= 170 && 170 <= best->position_um.high;
  }
  EXPECT_EQ(found, 2000);
  EXPECT_GE(covered / 2000.0, 0.93);
  EXPECT_LE(covered / 2000.0, 0.97);
}

TEST(BestFocus, FindsPositionAndSlope) {
  std::mt19937_64 random(42);
  const auto best = best_focus(series(170, random));
  ASSERT_TRUE(best);
  // Depth of focus of 2 px at f/2.8 and 6 um is +-34 um; a fifth of it.
  EXPECT_NEAR(best->position_um.value, 170, 7);
  EXPECT_NEAR(best->slope_px_per_um, 1 / (2.8 * 6), 0.05 / (2.8 * 6));   // 6 % a frame over eleven
  EXPECT_TRUE(best->inside);
}

TEST(BestFocus, SaysNothingWithoutAValley) {
  std::vector<FocusStep> steps;
  for (int i = 0; i < 8; ++i) steps.push_back({10.0 * i, i % 2 == 0 ? 4.0 : 4.5, 1});
  EXPECT_FALSE(best_focus(steps));
  EXPECT_FALSE(best_focus(std::vector<FocusStep>(4)));
}

// Both geometries by tracing points of the surface through the thin lens: where each is drawn, and how large its disc.
double traced_slope(double f_mm, double n, double focus_mm, const auto& point_at) {
  const double v_mm = f_mm * focus_mm / (focus_mm - f_mm);
  const auto image = [&](double t) {
    const auto [lateral, depth] = point_at(t);
    const double disc = f_mm * f_mm * focus_mm / (n * (focus_mm - f_mm)) * (1 / focus_mm - 1 / depth);
    return std::array{lateral * v_mm / depth, disc};
  };
  const auto a = image(-0.01), b = image(0.01);
  return std::abs((b[1] - a[1]) / (b[0] - a[0]));
}

TEST(FNumberFromSlope, GivesTheFNumberBackOnATiltedSurface) {
  const double tilt = std::numbers::pi / 4, distance_mm = 2000, focus_mm = 2060;
  const double slope = traced_slope(85, 2, focus_mm, [&](double t) {
    return std::array{t * std::cos(tilt) * 1000, distance_mm + t * std::sin(tilt) * 1000};
  });
  const double k = 85.0 * 85 * focus_mm / (2.0 * (focus_mm - 85));
  const auto n = f_number_from_slope({slope, 85, focus_mm, k * (1 / focus_mm - 1 / distance_mm), 2.0}, {.tilt_rad = tilt});
  ASSERT_TRUE(n);
  EXPECT_NEAR(*n, 2, 1e-9);
}

TEST(FNumberFromSlope, GivesTheFNumberBackOnLevelGround) {
  const double height_mm = 1600, distance_mm = 8000, pitch = std::asin(height_mm / distance_mm);
  const double slope = traced_slope(200, 2.8, 8000, [&](double t) {   // along the ground through the foot of the axis
    return std::array{t * std::sin(pitch) * 1000, distance_mm + t * std::cos(pitch) * 1000};
  });
  const auto n = f_number_from_slope({slope, 200, 8000, 0, 2.8}, {.camera_height_m = 1.6});
  ASSERT_TRUE(n);
  EXPECT_NEAR(*n, 2.8, 1e-9);
  EXPECT_FALSE(f_number_from_slope({slope, 200, 8000, 0, 2.8}, {.camera_height_m = 9.0}));
}

TEST(Diaphragm, IsMarkedWhereTheFramesSaySo) {
  const auto reading = diaphragm(std::array{2.8, 2.85, 2.75, 2.82}, 2.8);
  ASSERT_TRUE(reading);
  EXPECT_LT(reading->f_number.low, 2.8);
  EXPECT_GT(reading->f_number.high, 2.8);
  EXPECT_NEAR(diaphragm(std::array{2.0, 2.0, 2.0}, 2.8284271)->stops_wider, 1, 1e-6);
}

}  // namespace
}  // namespace focusfall
