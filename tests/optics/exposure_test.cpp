#include "analysis/optics/exposure.h"

#include <gtest/gtest.h>

#include <cmath>

namespace focusfall {
namespace {

TEST(Exposure, AdditiveValuesAddUp) {
  for (const double n : {1.4, 2.8, 11.0}) {
    for (const double t : {1.0 / 2000, 1.0 / 60, 4.0}) {
      for (const double iso : {64.0, 100.0, 6400.0}) {
        const double ev = exposure_value(n, t);
        const double luminance = luminance_of_exposure_value_cd_m2(ev, iso);
        EXPECT_NEAR(brightness_value(luminance) + speed_value(iso), ev, 1e-12);
        EXPECT_NEAR(luminance_of_brightness_value_cd_m2(brightness_value(luminance)), luminance, 1e-12 * luminance);
      }
    }
  }
}

TEST(Exposure, MoreLightRaisesTheLevelStopByStop) {
  const double reference = picture_level(focal_plane_exposure_lx_s(200, 4, 1. / 125), 100);
  EXPECT_NEAR(picture_level(focal_plane_exposure_lx_s(400, 4, 1. / 125), 100), 2 * reference, 1e-15);
  EXPECT_NEAR(picture_level(focal_plane_exposure_lx_s(200, 4, 2. / 125), 100), 2 * reference, 1e-15);
  EXPECT_NEAR(picture_level(focal_plane_exposure_lx_s(200, 4, 1. / 125), 200), 2 * reference, 1e-15);
  EXPECT_NEAR(picture_level(focal_plane_exposure_lx_s(200, 8, 1. / 125), 100), reference / 4, 1e-15);
}

TEST(Exposure, LevelAndLuminousExposureAreInverses) {
  for (const double level : {0.001, 0.18, 1.0}) {
    EXPECT_NEAR(picture_level(exposure_of_level_lx_s(level, 800), 800), level, 1e-14);
  }
  EXPECT_NEAR(picture_level(kMidToneExposure / 100, 100), kMidToneLevel, 1e-15);
  EXPECT_NEAR(raw_level(kSaturationExposure / 100, 100), 1, 1e-15);
}

// T = N / sqrt(tau): common practice, no source. Half the light is a stop.
TEST(Exposure, HalfTheTransmittanceIsOneStopOfTNumber) {
  EXPECT_NEAR(aperture_value(t_number(2.8, 0.5)) - aperture_value(2.8), 1, 1e-12);
  EXPECT_DOUBLE_EQ(t_number(2.8, 1), 2.8);
}

// The area of the opening halves with every full stop of a series in steps of sqrt(2): common practice, no source.
TEST(Exposure, FullStopsHalveTheAreaOfTheOpening) {
  for (int k = 0; k < 10; ++k) EXPECT_NEAR(aperture_value(std::exp2(k / 2.)), k, 1e-12);
}

TEST(Exposure, LensFactorLosesLightOffTheAxis) {
  double previous = 1;
  for (double angle = 0; angle <= 40; angle += 5) {
    const double q = lens_factor({.transmittance = 0.9, .vignetting = 0.98, .field_angle_deg = angle});
    EXPECT_LT(q, previous);
    previous = q;
  }
}

}  // namespace
}  // namespace focusfall
