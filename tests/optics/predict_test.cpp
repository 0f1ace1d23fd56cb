#include "analysis/optics/predict.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "analysis/optics/acceptable_blur.h"
#include "analysis/optics/exposure.h"
#include "analysis/optics/motion_blur.h"
#include "analysis/optics/solve.h"

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

// A long fast lens on 24 MP of 36 x 24 mm, focused at thirty metres.
OpticalSetup long_lens() {
  OpticalSetup setup;
  setup.focal_length_mm = 400;
  setup.f_number = 2.8;
  setup.focus_distance_m = Interval{30, 29, 31};
  setup.pixel_pitch_um = Interval{6, 6, 6};
  setup.width_px = 6000;
  setup.height_px = 4000;
  setup.exposure_time_s = 1. / 2000;
  setup.iso_speed = 800;
  return setup;
}

// 400 mm at .03 rad/s for 1/2000 s: 6 um, or one pixel, focused at infinity.
TEST(Predict, TurningCameraBlursByImageDistanceTimesAngle) {
  EXPECT_NEAR(camera_motion_um(400, .03, 1. / 2000), 6, 1e-9);
  OpticalSetup setup = long_lens();
  setup.focus_distance_m = Interval{kInfinity, kInfinity, kInfinity};
  setup.angular_rate_rad_s = 0.03;
  EXPECT_NEAR(*predict(setup).motion_blur_px, 1, 1e-9);
}

// A subject: magnification x speed x time.
TEST(Predict, CrossingSubjectBlursByMagnificationTimesWay) {
  EXPECT_NEAR(subject_motion_um(0.01, 10, 1. / 1000), 100, 1e-9);
  OpticalSetup setup = long_lens();
  setup.subject_speed_m_s = 10;
  const Prediction prediction = predict(setup);
  EXPECT_NEAR(*prediction.motion_blur_px, 1e6 * *prediction.magnification * 10 / 2000 / 6, 1e-9);
}

// With flash the pulse freezes, not the shutter: nothing is said unless its duration is known.
TEST(Predict, FlashFreezesByItsDurationOrNothingIsSaid) {
  OpticalSetup setup = long_lens();
  setup.angular_rate_rad_s = 0.03;
  setup.flash_fired = true;
  EXPECT_FALSE(predict(setup).motion_blur_px);
  setup.flash_duration_s = 1. / 20000;
  const auto with_flash = predict(setup).motion_blur_px;
  setup.flash_fired = false;
  ASSERT_TRUE(with_flash);
  EXPECT_NEAR(*with_flash * 10, *predict(setup).motion_blur_px, 1e-9);
}

TEST(Predict, WithoutPixelPitchNothingIsSaidInMetresByPixels) {
  OpticalSetup setup = long_lens();
  setup.pixel_pitch_um.reset();
  const Prediction prediction = predict(setup);
  EXPECT_TRUE(prediction.acceptable_blur_px);
  EXPECT_FALSE(prediction.acceptable_blur_um);
  EXPECT_FALSE(prediction.near_limit_m);
  EXPECT_FALSE(prediction.airy_diameter_px);
  EXPECT_TRUE(prediction.image_distance_mm);
}

// Film-plane distance: 3000 mm for 50 mm at f/8, c .03 mm are 2949.138 mm from the lens; recomputed with scipy.
TEST(Predict, DistancesFromTheSensorAreNotThoseFromTheLens) {
  OpticalSetup setup;
  setup.focal_length_mm = 50;
  setup.f_number = 8;
  setup.focus_distance_m = Interval{3, 3, 3};
  setup.acceptable_blur_um = 30;
  setup.distance_from = DistanceOrigin::sensor;
  EXPECT_NEAR(*predict(setup).near_limit_m, 2.357909, 1e-6);
  EXPECT_NEAR(*predict(setup).far_limit_m, 4.137336, 1e-6);
  setup.distance_from = DistanceOrigin::lens;
  EXPECT_NEAR(*predict(setup).near_limit_m, 2.337905, 1e-6);
  EXPECT_NEAR(*predict(setup).far_limit_m, 4.185268, 1e-6);
}

TEST(Predict, LimitsCarryTheIntervalOfTheFocusDistance) {
  const Prediction prediction = predict(long_lens());
  EXPECT_LT(prediction.near_limit_bounds_m->low, *prediction.near_limit_m);
  EXPECT_GT(prediction.near_limit_bounds_m->high, *prediction.near_limit_m);
  EXPECT_GE(*prediction.far_limit_m, 30);
  EXPECT_LE(*prediction.near_limit_m, 30);
  const auto front = blur_at(long_lens(), 28), back = blur_at(long_lens(), 32);
  EXPECT_GT(front->signed_disc_um.value, 0);   // focus fell behind a point that is nearer
  EXPECT_LT(back->signed_disc_um.value, 0);
  EXPECT_NEAR(*blur_at(long_lens(), *prediction.near_limit_m)->limits, 1, 1e-9);
  EXPECT_NEAR(*blur_at(long_lens(), *prediction.far_limit_m)->limits, -1, 1e-9);
}

TEST(Predict, BlurInPixelsScalesWithThePitchAndTheFNumber) {
  OpticalSetup setup = long_lens();
  const double reference = blur_at(setup, 33)->signed_disc_px->value;
  setup.pixel_pitch_um = Interval{3, 3, 3};
  EXPECT_NEAR(blur_at(setup, 33)->signed_disc_px->value, 2 * reference, 1e-9);
  setup.f_number = 5.6;
  EXPECT_NEAR(blur_at(setup, 33)->signed_disc_px->value, reference, 1e-9);
}

TEST(Predict, AFocusDistanceWithinTheLensIsRefusedWithAReason) {
  OpticalSetup setup = long_lens();
  setup.focus_distance_m = Interval{1.5, 1.5, 1.5};   // 4 f is 1.6 m
  EXPECT_TRUE(focus_distance_problem(setup));
  EXPECT_FALSE(predict(setup).near_limit_m);
  EXPECT_FALSE(blur_at(setup, 10));
}

TEST(Predict, MidToneLevelFollowsTheLightAndIsCutAtClipping) {
  OpticalSetup setup = long_lens();
  setup.scene_luminance_cd_m2 = 50;
  const double reference = *predict(setup).mid_tone_level;
  setup.iso_speed = 1600;
  EXPECT_NEAR(*predict(setup).mid_tone_level, 2 * reference, 1e-12);
  setup.scene_luminance_cd_m2 = 1e6;
  EXPECT_EQ(*predict(setup).mid_tone_level, 1);
}

// diagonal / 1500 is .02884 mm on 24 x 36 mm (Zeiss, Camera Lens News, gives about .030).
TEST(AcceptableBlur, CircleOfConfusionIsTheDiagonalOver1500) { EXPECT_NEAR(circle_of_confusion(36, 24), .02884, 5e-6); }

TEST(AcceptableBlur, TwoPixelsOfTheDeliveredPictureWithinItsBounds) {
  EXPECT_EQ(acceptable_blur_px(6000, 4000), 3);
  EXPECT_EQ(acceptable_blur_px(4000, 3000), 2);
  EXPECT_EQ(acceptable_blur_px(1200, 800), 2);
  EXPECT_NEAR(acceptable_blur_px(6000, 4000, 600), std::hypot(6000, 4000) / 1500, 1e-12);
}

// ---- the model turned round ---------------------------------------------------------------------------------------

TEST(Solve, FNumberForLimitsGivesThoseLimitsBack) {
  for (const auto origin : {DistanceOrigin::sensor, DistanceOrigin::lens}) {
    for (const double pupil : {0.6, 1.0, 1.7}) {
      OpticalSetup setup = long_lens();
      setup.distance_from = origin;
      setup.pupil_magnification = pupil;
      const auto solved = f_number_for_limits(setup, 28, 33);
      ASSERT_TRUE(solved);
      setup.f_number = solved->f_number;
      setup.focus_distance_m = Interval{solved->focus_distance_m, solved->focus_distance_m, solved->focus_distance_m};
      const Prediction prediction = predict(setup);
      EXPECT_NEAR(*prediction.near_limit_m, 28, 1e-7);
      EXPECT_NEAR(*prediction.far_limit_m, 33, 1e-7);
      EXPECT_NEAR(solved->near_limit_m, 28, 1e-7);
    }
  }
}

TEST(Solve, FNumberForAnInfiniteFarLimitIsTheHyperfocalSetting) {
  OpticalSetup setup = long_lens();
  setup.focal_length_mm = 35;
  setup.distance_from = DistanceOrigin::lens;
  const auto solved = f_number_for_limits(setup, 3, kInfinity);
  ASSERT_TRUE(solved);
  setup.f_number = solved->f_number;
  EXPECT_NEAR(*predict(setup).hyperfocal_m, solved->focus_distance_m, 1e-9);
  EXPECT_NEAR(solved->focus_distance_m, 6, 1e-9);
  EXPECT_TRUE(std::isinf(solved->far_limit_m));
}

TEST(Solve, FNumberForADepthGivesThatDepthBack) {
  OpticalSetup setup = long_lens();
  const auto solved = f_number_for_depth(setup, 4);
  ASSERT_TRUE(solved);
  setup.f_number = solved->f_number;
  const Prediction prediction = predict(setup);
  EXPECT_NEAR(*prediction.far_limit_m - *prediction.near_limit_m, 4, 1e-9);
}

TEST(Solve, FNumberForABlurGivesThatBlurBack) {
  OpticalSetup setup = long_lens();
  const auto solved = f_number_for_blur(setup, 33, 25);
  ASSERT_TRUE(solved);
  setup.f_number = solved->f_number;
  EXPECT_NEAR(std::abs(blur_at(setup, 33)->signed_disc_um.value), 25, 1e-9);
}

TEST(Solve, DistanceForADepthGivesThatDepthBack) {
  OpticalSetup setup = long_lens();
  const auto solved = distance_for_depth_m(setup, 1.5);
  ASSERT_TRUE(solved);
  setup.focus_distance_m = Interval{*solved, *solved, *solved};
  const Prediction prediction = predict(setup);
  EXPECT_NEAR(*prediction.far_limit_m - *prediction.near_limit_m, 1.5, 1e-9);
  const auto range = range_for_blur_m(setup, *prediction.acceptable_blur_um);
  EXPECT_NEAR(range->near_m, *prediction.near_limit_m, 1e-9);
  EXPECT_NEAR(range->far_m, *prediction.far_limit_m, 1e-9);
}

TEST(Solve, ExposureTimeForMotionGivesThatBlurBack) {
  OpticalSetup setup = long_lens();
  setup.angular_rate_rad_s = 0.03;
  setup.subject_speed_m_s = 4;
  const auto solved = exposure_time_for_motion_s(setup, 12);
  ASSERT_TRUE(solved);
  setup.exposure_time_s = *solved;
  EXPECT_NEAR(*predict(setup).motion_blur_px * 6, 12, 1e-9);
}

// The solved values are exact, while `predict` reads an f-number or time near a mark as that mark (.06 and .085 stop
// at most), so the level that it predicts may differ by as much; the light itself must agree.
TEST(Solve, SettingsForALevelGiveThatLevelBack) {
  OpticalSetup setup = long_lens();
  setup.scene_luminance_cd_m2 = 50;
  const auto time_s = exposure_time_for_level_s(setup, 0.18);
  ASSERT_TRUE(time_s);
  OpticalSetup timed = setup;
  timed.exposure_time_s = *time_s;
  EXPECT_NEAR(std::log2(*predict(timed).mid_tone_level / 0.18), 0, 0.085 + 1e-9);

  const auto f_number = f_number_for_level(setup, 0.18);
  ASSERT_TRUE(f_number);
  OpticalSetup stopped = setup;
  stopped.f_number = *f_number;
  EXPECT_NEAR(std::log2(*predict(stopped).mid_tone_level / 0.18), 0, 0.06 + 1e-9);
}

TEST(Solve, SettingsForAnExposureValueGiveItBack) {
  OpticalSetup setup = long_lens();
  EXPECT_NEAR(exposure_value(*f_number_for_exposure_value(setup, 14), *setup.exposure_time_s), 14, 1e-12);
  EXPECT_NEAR(exposure_value(setup.f_number, *exposure_time_for_exposure_value_s(setup, 14)), 14, 1e-12);
}

TEST(Solve, WhatNoSettingHoldsIsRefusedWithAReason) {
  OpticalSetup setup = long_lens();
  for (const auto& refused : {f_number_for_limits(setup, 33, 28), f_number_for_limits(setup, 0, 5),
                              f_number_for_limits(setup, 1.7, kInfinity), f_number_for_depth(setup, -1),
                              f_number_for_blur(setup, 33, 0)}) {
    ASSERT_FALSE(refused);
    EXPECT_FALSE(refused.error().reason.empty());
  }
  EXPECT_FALSE(exposure_time_for_motion_s(setup, 6));    // neither rate nor speed is known
  EXPECT_FALSE(exposure_time_for_level_s(setup, 0.18));  // no luminance
  setup.focus_distance_m.reset();
  EXPECT_FALSE(f_number_for_depth(setup, 2));
}

}  // namespace
}  // namespace focusfall
