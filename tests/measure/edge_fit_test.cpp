#include "analysis/measure/edge_fit.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "analysis/measure/edge_tables.h"
#include "analysis/measure/forward_model.h"

namespace focusfall {
namespace {

struct GaussianEdge {
  double x, y, angle_deg, sigma_px, base, amplitude;
  float operator()(int px, int py) const {
    const double a = angle_deg * std::numbers::pi / 180;
    const double u = (px - x) * std::cos(a) + (py - y) * std::sin(a);
    return static_cast<float>(base + amplitude * 0.5 * std::erfc(-u / sigma_px / std::numbers::sqrt2));
  }
};

std::optional<EdgeFit> fit_of(const GaussianEdge& edge, double shift_px = 0) {
  const double a = edge.angle_deg * std::numbers::pi / 180;
  EdgeProfile profile;
  gather_profile(edge, static_cast<float>(edge.x + shift_px * std::cos(a)),
                 static_cast<float>(edge.y + shift_px * std::sin(a)), static_cast<float>(std::cos(a)),
                 static_cast<float>(std::sin(a)), profile);
  return fit_profile(profile);
}

TEST(EdgeFit, RecoversAGaussianStepThatIsItsOwnModel) {
  for (const double angle : {0.0, 17.0, 45.0, 112.0}) {
    for (const double sigma : {0.6, 1.2, 2.4}) {
      const auto fit = fit_of({20.3, 20.8, angle, sigma, 0.1, 0.5});
      ASSERT_TRUE(fit) << angle << ' ' << sigma;
      // Half-pixel bins average a curved profile: a few thousandths of a pixel, most where the edge is sharp.
      EXPECT_NEAR(fit->sigma_px, sigma, 0.02) << angle;
      EXPECT_NEAR(fit->amplitude, 0.5, 0.01);
      EXPECT_NEAR(fit->base, 0.1, 0.006);
      EXPECT_LT(fit->residual, 0.01);
    }
  }
}

TEST(EdgeFit, FindsTheEdgeBesideTheCrestItStartedFrom) {
  const auto fit = fit_of({20, 20, 30, 1.4, 0.05, 0.6}, 0.7);
  ASSERT_TRUE(fit);
  EXPECT_NEAR(fit->offset_px, -0.7, 0.01);
}

TEST(EdgeFit, DoesNotFitAFlatNeighbourhood) {
  EdgeProfile profile;
  gather_profile([](int, int) { return 0.4f; }, 20, 20, 1, 0, profile);
  const auto fit = fit_profile(profile);
  EXPECT_TRUE(!fit || std::abs(fit->amplitude) < 1e-3);
}

TEST(DiscEdgeSpread, HasTheSpreadOfADisc) {
  // Distance from 10 to 90 % = .6870488 c and variance c^2/16: recomputed with scipy from the closed form of the disc.
  const double c = 10;
  double low = -5, high = 5;
  for (int i = 0; i < 60; ++i) {
    const double middle = 0.5 * (low + high);
    (disc_edge_spread(c, middle) < 0.9 ? low : high) = middle;
  }
  EXPECT_NEAR(2 * low, 0.6870488 * c, 1e-6);
  double variance = 0;
  constexpr int kSteps = 20000;
  for (int i = 0; i < kSteps; ++i) {
    const double u0 = -5 + 10.0 * i / kSteps, u1 = -5 + 10.0 * (i + 1) / kSteps, u = 0.5 * (u0 + u1);
    variance += u * u * (disc_edge_spread(c, u1) - disc_edge_spread(c, u0));
  }
  EXPECT_NEAR(variance, c * c / 16, 1e-4);
}

class WidthTables : public testing::TestWithParam<int> {};

TEST_P(WidthTables, GiveBackTheDiscThatDrewTheEdge) {
  const int level = GetParam();
  const double scale = 1 << level;
  for (const double c : {1.0, 2.2, 4.5, 7.3}) {   // level px, between the knots of the table
    const auto width = width_of_drawn_edge(level, 0.45, [&](double u) { return disc_edge_spread(c * scale, u); });
    ASSERT_TRUE(width);
    // The table averages six directions; a single one differs where the pixel's own square is felt: S by .12 px^2.
    EXPECT_NEAR(squared_disc_of_width(level, *width) / (scale * scale), c * c, 0.02 * c * c + 0.1) << c;
  }
}

TEST_P(WidthTables, TurnWidthsBelowAnUnblurredEdgeIntoNegativeSquares) {
  const auto width = width_of_drawn_edge(GetParam(), 0.45, [](double u) { return disc_edge_spread(0, u); });
  ASSERT_TRUE(width);
  EXPECT_LT(squared_disc_of_width(GetParam(), 0.9f * *width), 0);
}

INSTANTIATE_TEST_SUITE_P(AllLevels, WidthTables, testing::Range(0, 5));

TEST(ForwardModel, ReportsADiscAsItself) {
  for (const double c : {2.0, 6.0, 15.0, 40.0}) {
    SystemResponse system;
    system.disc_px = c;
    const auto reading = forward_reading(system);
    ASSERT_TRUE(reading);
    EXPECT_NEAR(std::sqrt(reading->squared_disc_px2), c, 0.01 * c + 0.02);
  }
}

TEST(ForwardModel, MotionAcrossTheEdgeAddsItsVarianceInDiscUnits) {
  // A box of L along the normal has the variance L^2/12, a disc c^2/16: S = 16/12 L^2; the median over directions of the
  // normal is that at 45 degrees, half of it. The fit follows the shape and not the variance alone: drawn edges of a
  // disc and a box as wide read 4 to 23 % less than the sum, 12 % less at these sizes.
  SystemResponse still, moved;
  still.disc_px = moved.disc_px = 4;
  moved.motion_length_px = 8;
  moved.motion_angle_deg = 23;
  const auto a = forward_reading(still), b = forward_reading(moved);
  ASSERT_TRUE(a && b);
  const double expected = 0.5 * 16.0 / 12 * 64;
  EXPECT_NEAR(b->squared_disc_px2 - a->squared_disc_px2, 0.88 * expected, 0.05 * expected);
}

TEST(ForwardModel, DiffractionGrowsWithTheFNumberAndIsNoQuadrature) {
  double last = 0;
  for (const double airy : {0.5, 1.0, 2.0, 3.0}) {
    SystemResponse system;
    system.airy_lambda_n_over_p_px = airy;
    const auto reading = forward_reading(system);
    ASSERT_TRUE(reading);
    EXPECT_GT(reading->squared_disc_px2, last);
    last = reading->squared_disc_px2;
  }
}

}  // namespace
}  // namespace focusfall
