#include "analysis/optics/thin_lens.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

// Values recomputed independently with scipy from c = f^2/(N (s - f)) |d - s|/d; printed to seven digits.
TEST(ThinLens, BlurDiscFollowsTheFormula) {
  EXPECT_NEAR(blur_disc_mm(50, 1.4, 2000, 2100), 0.0436072, 5e-8);
  EXPECT_NEAR(blur_disc_mm(50, 1.4, 2000, 1900), 0.0481974, 5e-8);
  EXPECT_NEAR(blur_disc_mm(85, 1.4, 1500, 1520), 0.0479888, 5e-8);
  EXPECT_NEAR(blur_disc_mm(200, 2.8, 10000, 10500), 0.0694155, 5e-8);
  EXPECT_NEAR(blur_disc_mm(35, 2, 1000, 5000), 0.5077720, 5e-8);
  EXPECT_NEAR(blur_disc_mm(85, 1.8, 2000, kInfinity), 2.0960255, 5e-8);
}

TEST(ThinLens, BlurIsZeroAtFocusDistance) {
  EXPECT_EQ(blur_disc_mm(400, 2.8, 30000, 30000), 0);
  EXPECT_EQ(blur_disc_mm(400, 2.8, kInfinity, kInfinity), 0);
}

TEST(ThinLens, ConjugateDistancesAreInversesOfEachOther) {
  for (const double f : {24.0, 85.0, 400.0}) {
    for (const double ratio : {1.2, 2.0, 7.5, 300.0}) {
      const double s = ratio * f, v = image_distance_mm(f, s);
      EXPECT_NEAR(1 / s + 1 / v, 1 / f, 1e-15);
      EXPECT_NEAR(focus_distance_mm(f, v), s, 1e-11 * s);
      EXPECT_NEAR(magnification(f, s), v / s, 1e-14);
    }
    EXPECT_EQ(image_distance_mm(f, kInfinity), f);
    EXPECT_EQ(focus_distance_mm(f, f), kInfinity);
    EXPECT_EQ(magnification(f, kInfinity), 0);
  }
}

// D = f (2 + m + 1/m), least at m = 1 where it is 4 f; the inverse returns the solution with m <= 1.
TEST(ThinLens, DistanceFromTheSensorIsInvertedDownToFourFocalLengths) {
  for (const double m : {1.0, 0.5, 0.1, 1e-3}) {
    const double s = 50 + 50 / m, d = sensor_distance_mm(50, s);
    EXPECT_NEAR(d, 50 * (2 + m + 1 / m), 1e-9 * d);
    ASSERT_TRUE(lens_distance_mm(50, d));
    EXPECT_NEAR(*lens_distance_mm(50, d), s, 1e-9 * s);
  }
  EXPECT_FALSE(lens_distance_mm(50, 199.999));
  EXPECT_EQ(lens_distance_mm(50, kInfinity), kInfinity);
  // Recomputed with scipy: 3000 mm from the film plane of a 50 mm lens are 2949.138 mm from the lens.
  EXPECT_NEAR(*lens_distance_mm(50, 3000), 2949.138, 5e-4);
}

TEST(ThinLens, BlurIsProportionalToTheOpening) {
  for (const double d : {1500.0, 1999.0, 2600.0, 1e6}) {
    EXPECT_NEAR(2 * blur_disc_mm(85, 2.8, 2000, d), blur_disc_mm(85, 1.4, 2000, d), 1e-14);
  }
}

TEST(ThinLens, BlurGrowsAwayFromFocusOnEitherSideAndChangesItsSignThere) {
  const Lens lens{.focal_length_mm = 200, .f_number = 2.8};
  double previous = kInfinity;
  for (double d = 3000; d < 30000; d += 250) {
    const double blur = signed_blur_disc_mm(lens, 10000, d);
    EXPECT_LT(blur, previous) << "at " << d << " mm";   // positive and falling in front of focus, negative behind
    EXPECT_EQ(blur > 0, d < 10000);
    previous = blur;
  }
}

// The disc follows from similar triangles behind the lens: c = D |v_d - v_s| / v_d with D = f/N. A way of its own.
TEST(ThinLens, BlurEqualsTheConeCutByTheSensor) {
  for (const double d : {1200.0, 2500.0, 9000.0}) {
    const double v_focus = image_distance_mm(85, 2000), v_point = image_distance_mm(85, d);
    const double cone = 85 / 1.8 * std::abs(v_point - v_focus) / v_point;
    EXPECT_NEAR(blur_disc_mm(85, 1.8, 2000, d), cone, 1e-12);
  }
}

// N (1 + m/P): recomputed with scipy for f/4 at m = .5.
TEST(ThinLens, WorkingFNumberFollowsThePupils) {
  EXPECT_DOUBLE_EQ(working_f_number({100, 4, 1}, 0.5), 6);
  EXPECT_DOUBLE_EQ(working_f_number({100, 4, 0.5}, 0.5), 8);
  EXPECT_DOUBLE_EQ(working_f_number({100, 4, 2}, 0.5), 5);
  EXPECT_DOUBLE_EQ(working_f_number({100, 4, 1}, 0), 4);
  EXPECT_DOUBLE_EQ(entrance_pupil_mm({100, 4, 1}), 25);
}

}  // namespace
}  // namespace focusfall
