// Published exposure values, against the model. The source stands beside each.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "analysis/measure/luma_picture.h"
#include "analysis/optics/exposure.h"

namespace focusfall {
namespace {

// Definitions of GNU units 2.22: 2^EV = N^2/t = L S/K = E S/C, Av + Tv = Bv + Sv, Sv(100) = 5 with 1/3.125.
TEST(PublishedExposure, AdditiveSystemOfGnuUnits) {
  EXPECT_NEAR(speed_value(100), 5, 1e-12);
  EXPECT_NEAR(aperture_value(1.8), 1.695994, 1e-6);
  EXPECT_NEAR(time_value(1. / 400), 8.643856, 1e-6);
  // "Sunny 16": f/16 at 1/ISO seconds, EV 14.643856 at ISO 100.
  EXPECT_NEAR(exposure_value(16, 1. / 100), 14.643856, 1e-6);
}

// The same definitions with K = 12.5 and C = 250: EV 0 at ISO 100 is .125 cd/m^2 and 2.5 lx, EV 15 4096 and 81920.
TEST(PublishedExposure, LuminanceAndIlluminanceOfExposureValues) {
  EXPECT_DOUBLE_EQ(luminance_of_exposure_value_cd_m2(0, 100), .125);
  EXPECT_DOUBLE_EQ(illuminance_of_exposure_value_lx(0, 100), 2.5);
  EXPECT_DOUBLE_EQ(luminance_of_exposure_value_cd_m2(15, 100), 4096);
  EXPECT_DOUBLE_EQ(illuminance_of_exposure_value_lx(15, 100), 81920);
  EXPECT_NEAR(luminance_of_brightness_value_cd_m2(0), 4, 1e-12);   // recomputed
}

// Documentation of colour-hdri: ISO 2720 allows K 10.6-13.4, 12.5 and 14 are in use and differ by .1635 stop.
TEST(PublishedExposure, ReflectedLightConstantIsOneOfThoseInUse) {
  EXPECT_GE(kReflectedLightConstant, 10.6);
  EXPECT_LE(kReflectedLightConstant, 13.4);
  EXPECT_NEAR(std::log2(14 / kReflectedLightConstant), .1635, 5e-5);
}

// Tests of colour-hdri: q for tau .9, v .98, 10 degrees; focal plane exposure; exposure index; EV at ISO 100.
TEST(PublishedExposure, FocalPlaneExposureOfColourHdri) {
  EXPECT_NEAR(lens_factor({.transmittance = .9, .vignetting = .98, .field_angle_deg = 10}), .6515748, 1e-7);
  const double h = focal_plane_exposure_lx_s(4000, 8, 1. / 250);
  EXPECT_NEAR(h, .1628937, 1e-7);
  EXPECT_NEAR(kMidToneExposure / h, 61.38973, 1e-5);   // seven digits of a value of sixty
  EXPECT_NEAR(exposure_value_at_iso_100(8, 1. / 250, 400), 11.965784, 1e-6);
}

// ISO 12232:2006 as quoted: S = 10 / H of the mid-tone, S = 78 / H at saturation, which leaves half a stop above a
// surface of 100 %: 78 / 10 x .18 = 1.40, quoted as 141 %.
TEST(PublishedExposure, SaturationHeadroomOfIso12232) {
  const double saturating_reflectance = kSaturationExposure / kMidToneExposure * .18;
  EXPECT_NEAR(saturating_reflectance, 1.41, .01);
  EXPECT_NEAR(std::log2(saturating_reflectance), .5, .02);
}

// Recomputed: a meter with K = 12.5 puts H = 8.145 / S on the sensor, .296 stop under 10 / S.
TEST(PublishedExposure, MeterAimsBelowTheMidTone) {
  const double h = focal_plane_exposure_lx_s(luminance_of_exposure_value_cd_m2(exposure_value(8, .01), 100), 8, .01);
  EXPECT_NEAR(h * 100, 8.145, 5e-4);
  EXPECT_NEAR(std::log2(kMidToneExposure / (h * 100)), .296, 5e-4);
}

// Standard output sensitivity (ISO 12232, from memory): 461 / 1000 of full scale, 117.6 of 255, rounded to 118.
TEST(PublishedExposure, MidToneOfStandardOutputSensitivity) {
  EXPECT_EQ(std::lround(.461 * 255), 118);
  EXPECT_NEAR(srgb_linear_of_code(256)[118], kMidToneLevel, 1e-6);
}

// Sample code of CSS Color 4 and scikit-image; recomputed.
TEST(PublishedExposure, SrgbDecodingCurve) {
  const auto curve = srgb_linear_of_code(256);
  const struct {
    std::size_t code;
    double linear;
  } kRows[] = {{1, .000303527}, {10, .00303527}, {11, .00334654}, {118, .181164},
               {128, .215861}, {188, .502886},   {254, .991102}};
  for (const auto& row : kRows) EXPECT_NEAR(curve[row.code], row.linear, 3e-6 * row.linear) << row.code;
  EXPECT_EQ(curve[0], 0);
  EXPECT_EQ(curve[255], 1);
}

// The same curve the other way, read between two of 65536 codes: .18 -> 117.6458, .5 -> 187.516, .9 -> 243.445 of 255;
// a third of a stop about .18: 105.561 and 130.952. Half a step of the table is .002 of a code of 255.
TEST(PublishedExposure, SrgbEncodingCurve) {
  const auto curve = srgb_linear_of_code(65536);
  const auto code = [&](double linear) {
    const auto above = std::lower_bound(curve.begin(), curve.end(), static_cast<float>(linear));
    return static_cast<double>(above - curve.begin()) / 257;
  };
  EXPECT_NEAR(code(.18), 117.6458, .005);
  EXPECT_NEAR(code(.5), 187.516, .005);
  EXPECT_NEAR(code(.9), 243.445, .005);
  EXPECT_NEAR(code(.18 * std::exp2(-1 / 3.)), 105.561, .005);
  EXPECT_NEAR(code(.18 * std::exp2(1 / 3.)), 130.952, .005);
  EXPECT_NEAR(std::log2(1 / .18), 2.4739, 5e-5);
}

}  // namespace
}  // namespace focusfall
