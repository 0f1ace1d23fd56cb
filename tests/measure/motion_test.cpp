#include "analysis/measure/motion.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "tests/measure/simulated_edges.h"

namespace focusfall {
namespace {

constexpr double kPi = std::numbers::pi;

// S across `normal_rad` of a movement: 16/12 L^2 cos^2 from the variance of a box, times the 5 % by which an error
// function fitted to it reads high, plus what blurs all directions alike.
double moved(double normal_rad, double length_px, double angle_deg, double isotropic_px2) {
  const double cosine = std::cos(normal_rad - angle_deg * kPi / 180);
  return isotropic_px2 + 1.05 * 16 / 12 * length_px * length_px * cosine * cosine;
}

double angle_between_deg(double a_deg, double b_deg) { return std::abs(std::remainder(a_deg - b_deg, 180.0)); }

// Targets of the product: angle within 5 degrees and length within 15 % from 4 to 15 px.
TEST(Motion, LengthAndAngleComeBackFromFourToFifteenPixels) {
  unsigned seed = 1;
  for (double length : {4.0, 8.0, 15.0})
    for (double angle : {0.0, 30.0, 90.0, 155.0})
      for (int repeat = 0; repeat < 10; ++repeat) {
        EdgeSimulator simulator(seed++);
        const auto edges =
            simulator.region(400, 344, [&](double normal) { return moved(normal, length, angle, 0.5); });
        const auto reading = motion(edges);
        ASSERT_TRUE(reading);
        EXPECT_NEAR(reading->length_px, length, 0.15 * length) << "angle " << angle;
        EXPECT_LE(angle_between_deg(reading->angle_deg, angle), 5) << "length " << length << " angle " << angle;
        EXPECT_TRUE(motion_is_significant(*reading));
      }
}

// 95 % bounds over 400 regions; 3 standard deviations of that count are 3.3 %, and bounds may be too wide by a little
// because the relative scatter between real sectors (6 %) is not drawn here.
TEST(Motion, BoundsCoverTheTruth) {
  int inside = 0;
  const int runs = 400;
  for (int run = 0; run < runs; ++run) {
    EdgeSimulator simulator(1000u + unsigned(run));
    const double length = simulator.uniform(4, 15), angle = simulator.uniform(0, 180);
    const auto edges = simulator.region(200, 344, [&](double normal) { return moved(normal, length, angle, 2); });
    const auto reading = motion(edges);
    ASSERT_TRUE(reading);
    inside += reading->length_low_px <= length && length <= reading->length_high_px;
  }
  EXPECT_GE(inside, int(0.917 * runs));
}

TEST(Motion, DefocusAloneIsNotCalledMotion) {
  int called = 0;
  const int runs = 400;
  for (int run = 0; run < runs; ++run) {
    EdgeSimulator simulator(2000u + unsigned(run));
    const double disc = simulator.uniform(0, 15);
    const auto edges = simulator.region(150, 344, [&](double) { return disc * disc; });
    const auto reading = motion(edges);
    ASSERT_TRUE(reading);
    called += motion_is_significant(*reading);
  }
  EXPECT_LE(called, int(0.02 * runs)) << "false claims of motion";
}

TEST(Motion, BesideDefocusTheLengthComesBack) {
  for (int run = 0; run < 40; ++run) {
    EdgeSimulator simulator(3000u + unsigned(run));
    const auto edges = simulator.region(500, 344, [&](double normal) { return moved(normal, 10, 70, 25); });
    const auto reading = motion(edges);
    ASSERT_TRUE(reading);
    EXPECT_NEAR(reading->length_px, 10, 1.5);
    // The isotropic part is 25 px^2; a tenth of the 140 px^2 of motion may leak into it.
    EXPECT_NEAR(reading->isotropic_squared_disc_px2, 25, 14);
  }
}

TEST(Motion, TooFewDirectionsGiveNoReading) {
  EdgeSimulator simulator(7);
  std::vector<EdgeSample> edges;
  // A picket fence: hundreds of edges, one direction.
  for (int i = 0; i < 300; ++i) edges.push_back(simulator.edge(simulator.uniform(0, 300), 10, 0.2, 4, EdgeScatter{}));
  EXPECT_FALSE(motion(edges));
  EXPECT_FALSE(motion(std::vector<EdgeSample>{}));
  EXPECT_FALSE(motion(simulator.region(20, 300, [](double) { return 9.0; })));
}

TEST(Motion, TheBoundAlongADirectionHoldsWhatWasThere) {
  EdgeSimulator simulator(11);
  const auto moving = motion(simulator.region(400, 344, [](double n) { return moved(n, 10, 20, 0); }));
  ASSERT_TRUE(moving);
  EXPECT_GE(motion_length_bound_px(*moving, 20), 10);
  EXPECT_LT(motion_length_bound_px(*moving, 20), 12);
  // Across the movement next to nothing is left, and a bound there must be far shorter than the movement.
  EXPECT_LT(motion_length_bound_px(*moving, 110), 5);
}

}  // namespace
}  // namespace focusfall
