#include <gtest/gtest.h>

#include <limits>

#include "analysis/compare/compare.h"
#include "analysis/optics/thin_lens.h"

namespace focusfall {
namespace {

OpticalSetup long_lens() {
  OpticalSetup setup;
  setup.focal_length_mm = 400;
  setup.f_number = 2.8;
  setup.pixel_pitch_um = Interval{6, 6, 6};
  setup.focus_distance_m = Interval{30, 30, 30};
  setup.distance_from = DistanceOrigin::lens;
  return setup;
}

Prediction three_px() {
  Prediction prediction;
  prediction.acceptable_blur_px = 3;
  prediction.working_f_number = 2.8378;   // 2.8 (1 + .4/29.6)
  return prediction;
}

// Worked by hand: 9 px x 6 um x 2.8378 = 153.24 um; 9/3 = 3 limits; K = 400^2 30000/(2.8 29600) = 57915 mm^2,
// 1/d = 1/30000 + .054/57915 = 3.42657e-5 per mm, d = 29183.7 mm, 30 - 29.1837 = .8163 m.
TEST(Defocus, NinePixelsBehindAtThirtyMetres) {
  const Defocus result = defocus({9, 8, 10}, long_lens(), three_px());
  ASSERT_TRUE(result.um && result.limits && result.offset_m);
  EXPECT_NEAR(result.um->value, 153.24, 0.01);
  EXPECT_NEAR(result.um->low, 8 * 6 * 2.8378, 0.01);
  EXPECT_NEAR(result.um->high, 10 * 6 * 2.8378, 0.01);
  EXPECT_NEAR(result.limits->value, 3, 1e-12);
  EXPECT_NEAR(result.offset_m->value, 0.8163, 5e-5);
}

TEST(Defocus, TheSubjectDistanceGivesTheBlurBack) {
  for (double blur_px : {-20.0, -3.0, 2.0, 15.0}) {
    const Defocus result = defocus({blur_px, blur_px - 1, blur_px + 1}, long_lens(), three_px());
    ASSERT_TRUE(result.offset_m);
    const double subject_mm = 30000 - 1000 * result.offset_m->value;
    EXPECT_NEAR(blur_disc_mm(400, 2.8, 30000, subject_mm), std::abs(blur_px) * 0.006, 1e-9);
    // Back focus (positive blur): the subject is nearer than the plane of focus.
    EXPECT_EQ(subject_mm < 30000, blur_px > 0);
    EXPECT_LT(result.offset_m->low, result.offset_m->value);
    EXPECT_GT(result.offset_m->high, result.offset_m->value);
  }
}

// D = s + s f/(s - f): s = (30 + sqrt(900 - 48))/2 = 29.59452 m for D = 30 m.
TEST(Defocus, DistancesFromTheSensorPlaneAreTakenToTheLens) {
  OpticalSetup setup = long_lens();
  setup.distance_from = DistanceOrigin::sensor;
  const Defocus result = defocus({9, 8, 10}, setup, three_px());
  ASSERT_TRUE(result.offset_m);
  const double s_mm = 29594.52, d_mm = s_mm - 1000 * result.offset_m->value;
  EXPECT_NEAR(blur_disc_mm(400, 2.8, s_mm, d_mm), 0.054, 2e-6);
}

TEST(Defocus, ACoarseFocusDistanceWidensOnlyTheMetres) {
  OpticalSetup setup = long_lens();
  const Defocus sharp = defocus({9, 8, 10}, setup, three_px());
  setup.focus_distance_m = Interval{30, 20, 45};
  const Defocus coarse = defocus({9, 8, 10}, setup, three_px());
  EXPECT_EQ(coarse.um->low, sharp.um->low);
  EXPECT_EQ(coarse.limits->high, sharp.limits->high);
  // The offset goes with the square of the distance: at 45 m about 2.25 times as long.
  EXPECT_GT(coarse.offset_m->high, 2 * sharp.offset_m->value);
  EXPECT_LT(coarse.offset_m->low, 0.6 * sharp.offset_m->value);
}

TEST(Defocus, MetresAreAbsentWhereFocusStoodAtInfinityOrMayHave) {
  OpticalSetup setup = long_lens();
  const double infinity = std::numeric_limits<double>::infinity();
  setup.focus_distance_m = Interval{infinity, 100, infinity};
  EXPECT_FALSE(defocus({9, 8, 10}, setup, three_px()).offset_m);
  setup.focus_distance_m = Interval{200, 100, infinity};
  EXPECT_FALSE(defocus({9, 8, 10}, setup, three_px()).offset_m);
  // -400 px would put the subject beyond infinity: 1/30000 - 2.4/57915 < 0.
  EXPECT_FALSE(defocus({-400, -401, -399}, long_lens(), three_px()).offset_m);
}

TEST(Defocus, WithoutPitchOnlyTheLimitsAreKnown) {
  OpticalSetup setup = long_lens();
  setup.pixel_pitch_um.reset();
  const Defocus result = defocus({9, 8, 10}, setup, three_px());
  EXPECT_TRUE(result.limits);
  EXPECT_FALSE(result.um);
  EXPECT_FALSE(result.offset_m);
  EXPECT_FALSE(defocus({9, 8, 10}, std::nullopt, three_px()).um);
}

}  // namespace
}  // namespace focusfall
