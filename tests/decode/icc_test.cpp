// Colour profiles made by lcms2 from curves that are known, embedded in every format that carries one.
#include "src/decode/icc.h"

#include <gtest/gtest.h>

#include <cmath>

#include "tests/decode/pictures.h"

namespace focusfall::test {
namespace {

// A gamma is stored with 8 fractional bits (ICC.1:2022, curveType): it is off by at most 1/512, and the curve x^g by
// at most x^g |ln x| / 512 <= 1 / (e g 512) = .0004 for g = 1.8.
constexpr double kGammaStep = 0.0005;

void expect_power(const std::vector<float>& curve, double gamma, std::size_t count) {
  ASSERT_EQ(curve.size(), count);
  for (std::size_t code = 0; code < count; code += count / 64) {
    const double x = static_cast<double>(code) / static_cast<double>(count - 1);
    EXPECT_NEAR(static_cast<double>(curve[code]), std::pow(x, gamma), kGammaStep) << code;
  }
  EXPECT_EQ(curve.back(), 1.0F);
}

TEST(ProfileCurve, IsThePowerThatTheProfileHolds) {
  for (const double gamma : {1.0, 1.8, 2.2}) {
    for (const bool grey : {false, true}) {
      const Bytes profile = gamma_profile(gamma, grey);
      expect_power(profile_curve(profile, grey ? 1 : 3, 256).linear_of_code, gamma, 256);
      expect_power(profile_curve(profile, grey ? 1 : 3, 65536).linear_of_code, gamma, 65536);
    }
  }
}

TEST(ProfileCurve, LinearisesEveryFormatThatCarriesIt) {
  const Bytes colour = gamma_profile(1.8, false), grey = gamma_profile(1.8, true);
  const cv::Mat rgb = drawn_picture(40, 30, CV_8UC3), rgb16 = drawn_picture(40, 30, CV_16UC3);
  const cv::Mat one = drawn_picture(40, 30, CV_8UC1);
  for (const Bytes& file : {png_of(rgb, {.profile = colour}), png_of(rgb16, {.profile = colour}), png_of(one, {.profile = grey}),
                            tiff_of(rgb, {.profile = colour}), tiff_of(rgb16, {.profile = colour}), tiff_of(one, {.profile = grey}),
                            jpeg_of(rgb, {.profile = colour}), jpeg_of(one, {.profile = grey})}) {
    const Read read = read_picture(file);
    ASSERT_TRUE(read.result);
    EXPECT_EQ(read.result->transfer, Transfer::profile) << read.result->kind;
    expect_power(read.result->linear_of_code, 1.8, read.result->bits == 16 ? 65536 : 256);
  }
}

TEST(ProfileCurve, WithoutProfileSrgbIsAssumedAndSaid) {
  const cv::Mat rgb = drawn_picture(40, 30, CV_8UC3);
  for (const Bytes& file : {png_of(rgb), tiff_of(rgb), jpeg_of(rgb)}) {
    const Read read = read_picture(file);
    ASSERT_TRUE(read.result);
    EXPECT_EQ(read.result->transfer, Transfer::srgb_assumed);
    EXPECT_TRUE(read.result->linear_of_code.empty());
  }
}

TEST(ProfileCurve, AnUnusableProfileIsSaid) {
  const cv::Mat rgb = drawn_picture(40, 30, CV_8UC3);
  const Bytes noise(300, std::byte{0x5A});
  for (const Bytes& profile : {noise, gamma_profile(2.2, true), first_part(gamma_profile(2.2, false), 200)}) {
    const Read read = read_picture(jpeg_of(rgb, {.profile = profile}));
    ASSERT_TRUE(read.result);
    EXPECT_TRUE(has_note(*read.result, "profile-unusable"));
    EXPECT_EQ(read.result->transfer, Transfer::srgb_assumed);
  }
}

TEST(ProfileCurve, AProfileLargerThanOneMarkerIsPutTogether) {
  Bytes profile = gamma_profile(1.8, false);
  profile.resize(150'000);   // a marker holds 65,519 bytes of it; the size field in the header stays as it is
  const Read read = read_picture(jpeg_of(drawn_picture(40, 30, CV_8UC3), {.profile = profile}));
  ASSERT_TRUE(read.result);
  EXPECT_EQ(read.result->transfer, Transfer::profile);
}

TEST(Png, AStatedGammaLinearisesAndIsSaid) {
  const Read read = read_picture(png_of(drawn_picture(40, 30, CV_8UC3), {.gamma = 0.5}));
  ASSERT_TRUE(read.result);
  EXPECT_TRUE(has_note(*read.result, "gamma-stated"));
  expect_power(read.result->linear_of_code, 2.0, 256);
}

}  // namespace
}  // namespace focusfall::test
