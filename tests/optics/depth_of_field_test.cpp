#include "analysis/optics/depth_of_field.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

struct Case {
  double f, n, c, s, near_mm, far_mm;
};

// Recomputed independently with scipy from s H0 / (H0 +- (s - f)); printed to 5 decimals or 8 digits.
TEST(DepthOfField, LimitsFollowTheExactFormula) {
  constexpr Case kCases[] = {
      {50, 1.4, .03, 2000, 1936.55835, 2067.73913},   {85, 1.4, .03, 1500, 1487.76225, 1512.44074},
      {24, 5.6, .03, 1000, 778.41204, 1397.94967},    {35, 2, .02, 2500, 2313.76549, 2718.83878},
      {100, 2.8, .03, 400, 398.99453, 401.01055},     {200, 4, .03, 5000, 4929.02208, 5073.05195},
      {400, 2.8, .03, 10000, 9949.85274, 10050.6553}, {50, 16, .03, 5000, 2563.57670, 100806.45},
  };
  for (const Case& k : kCases) {
    const DepthLimits limits = depth_limits({.focal_length_mm = k.f, .f_number = k.n}, k.s, k.c);
    EXPECT_NEAR(limits.near_mm, k.near_mm, 1e-6 * k.near_mm) << k.f << " mm f/" << k.n;
    EXPECT_NEAR(limits.far_mm, k.far_mm, 1e-6 * k.far_mm) << k.f << " mm f/" << k.n;
  }
}

TEST(DepthOfField, BlurAtTheLimitsIsTheAcceptableOne) {
  for (const double pupil : {0.5, 1.0, 2.0}) {
    const Lens lens{.focal_length_mm = 300, .f_number = 4, .pupil_magnification = pupil};
    const DepthLimits limits = depth_limits(lens, 8000, 0.02);
    EXPECT_NEAR(signed_blur_disc_mm(lens, 8000, limits.near_mm), 0.02, 1e-12);
    EXPECT_NEAR(signed_blur_disc_mm(lens, 8000, limits.far_mm), -0.02, 1e-12);
  }
}

// 2 N c (1 + m/P) / (m^2 - (N c / f)^2), recomputed with scipy for 100 mm f/4, c .03 mm, m = .5 (300 mm).
TEST(DepthOfField, DepthInCloseUpFollowsThePupils) {
  EXPECT_NEAR(depth_limits({100, 4, 1}, 300, .03).depth_mm(), 1.440008, 1e-6);
  EXPECT_NEAR(depth_limits({100, 4, .5}, 300, .03).depth_mm(), 1.920011, 1e-6);
  EXPECT_NEAR(depth_limits({100, 4, 2}, 300, .03).depth_mm(), 1.200007, 1e-6);
}

TEST(DepthOfField, FocusLiesBetweenTheLimitsAndStoppingDownWidensThem) {
  for (const double s : {1000.0, 5000.0, 40000.0, kInfinity}) {
    DepthLimits wider{.near_mm = s, .far_mm = s};
    for (const double n : {1.4, 2.0, 2.8, 5.6, 11.0, 22.0}) {
      const DepthLimits limits = depth_limits({.focal_length_mm = 85, .f_number = n}, s, 0.03);
      EXPECT_LT(limits.near_mm, wider.near_mm);
      EXPECT_GE(limits.far_mm, wider.far_mm);
      EXPECT_LE(limits.near_mm, s);
      EXPECT_GE(limits.far_mm, s);
      wider = limits;
    }
  }
}

// Kingslake and every manual: from the hyperfocal distance all is sharp from half of it to infinity.
TEST(DepthOfField, HyperfocalSettingReachesFromHalfOfItToInfinity) {
  const Lens lens{.focal_length_mm = 35, .f_number = 8};
  const double h = hyperfocal_mm(lens, 0.03);
  const DepthLimits limits = depth_limits(lens, h, 0.03);
  EXPECT_TRUE(limits.far_infinite());
  EXPECT_NEAR(limits.near_mm, h / 2, 1e-9 * h);
  EXPECT_FALSE(depth_limits(lens, 0.999 * h, 0.03).far_infinite());
  EXPECT_TRUE(std::isinf(limits.depth_mm()));
  // Focused at infinity the near limit is H0 = H - f.
  EXPECT_NEAR(depth_limits(lens, kInfinity, 0.03).near_mm, h - 35, 1e-9 * h);
}

// 2 N c (1 + m): N c to either side of a lens far away, more in close-up.
TEST(DepthOfField, DepthOfFocusIsTwiceFNumberTimesBlur) {
  EXPECT_DOUBLE_EQ(depth_of_focus_mm({50, 8, 1}, 0, 0.03), 0.48);
  EXPECT_DOUBLE_EQ(depth_of_focus_mm({50, 8, 1}, 1, 0.03), 0.96);
  EXPECT_DOUBLE_EQ(depth_of_focus_mm({100, 4, .5}, .5, 0.03), 0.48);
}

// The play of the sensor against the cone of light itself: a shift of half the depth of focus makes a disc of c.
TEST(DepthOfField, SensorAtTheEndOfTheDepthOfFocusSeesTheAcceptableDisc) {
  const Lens lens{.focal_length_mm = 400, .f_number = 2.8};
  const double s = 6000, m = magnification(400, s), v = image_distance_mm(400, s);
  const double shift_mm = depth_of_focus_mm(lens, m, 0.03) / 2;
  EXPECT_NEAR(entrance_pupil_mm(lens) * shift_mm / v, 0.03, 1e-12);
}

}  // namespace
}  // namespace focusfall
