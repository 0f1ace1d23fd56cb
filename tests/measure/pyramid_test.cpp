#include "analysis/measure/pyramid.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <cstdint>

#include "analysis/measure/noise.h"
#include "tests/render/random.h"

namespace focusfall {
namespace {

LumaPicture picture_of(const cv::Mat& codes) {
  return {codes, srgb_linear_of_code(codes.depth() == CV_16U ? 65536 : 256)};
}

cv::Mat random_codes(int width, int height, std::uint64_t key) {
  render::Random random(key);
  cv::Mat codes(height, width, CV_8UC1);
  for (auto& code : cv::Mat_<std::uint8_t>(codes)) code = static_cast<std::uint8_t>(256 * random.uniform());
  return codes;
}

// The obvious way: every output pixel as a sum of 16 products, edge pixels repeated.
float slow_level1(const LumaPicture& picture, int x, int y) {
  constexpr std::array<double, 4> kernel = {0.125, 0.375, 0.375, 0.125};
  double sum = 0;
  for (int j = 0; j < 4; ++j) {
    for (int i = 0; i < 4; ++i) {
      const int sx = std::clamp(2 * x - 1 + i, 0, picture.codes.cols - 1);
      const int sy = std::clamp(2 * y - 1 + j, 0, picture.codes.rows - 1);
      sum += kernel[static_cast<std::size_t>(i)] * kernel[static_cast<std::size_t>(j)] *
             picture.linear_of_code[picture.codes.at<std::uint8_t>(sy, sx)];
    }
  }
  return static_cast<float>(sum);
}

TEST(Pyramid, HalvesLikeTheObviousConvolution) {
  const LumaPicture picture = picture_of(random_codes(96, 64, 7));
  Pyramid pyramid;
  build_pyramid(picture, {0, 0, 96, 64}, 4, pyramid);
  ASSERT_EQ(pyramid.levels[1].size(), cv::Size(48, 32));
  for (int y = 0; y < 32; ++y) {
    for (int x = 0; x < 48; ++x) {
      // Single precision over four additions.
      ASSERT_NEAR(pyramid.levels[1].at<float>(y, x), slow_level1(picture, x, y), 2e-6) << x << ' ' << y;
    }
  }
}

TEST(Pyramid, PixelsLieWhereTheHeaderSaysTheyLie) {
  // A linear ramp in linear light keeps its values under a symmetric filter, so each level shows its own positions.
  cv::Mat codes(160, 256, CV_16UC1);
  for (int y = 0; y < codes.rows; ++y) {
    for (int x = 0; x < codes.cols; ++x) codes.at<std::uint16_t>(y, x) = static_cast<std::uint16_t>(200 * x + 50 * y);
  }
  LumaPicture picture{codes, std::vector<float>(65536)};
  for (std::size_t i = 0; i < 65536; ++i) picture.linear_of_code[i] = static_cast<float>(i) / 65535.0f;
  Pyramid pyramid;
  build_pyramid(picture, {0, 0, 256, 160}, 4, pyramid);
  for (int level = 1; level <= 3; ++level) {
    const double scale = 1 << level, shift = 0.5 * (scale - 1);
    const cv::Mat& values = pyramid.levels[static_cast<std::size_t>(level)];
    const int x = values.cols / 2, y = values.rows / 2;
    EXPECT_NEAR(values.at<float>(y, x), (200 * (scale * x + shift) + 50 * (scale * y + shift)) / 65535, 1e-6);
  }
}

TEST(Pyramid, ARegionHoldsTheSameValuesAsTheWholePicture) {
  const LumaPicture picture = picture_of(random_codes(320, 256, 11));
  Pyramid whole, part;
  build_pyramid(picture, {0, 0, 320, 256}, 2, whole);
  build_pyramid(picture, {70, 50, 130, 140}, 2, part);
  EXPECT_EQ(part.region.x % 16, 0);
  EXPECT_EQ(part.region.y % 16, 0);
  const int dx = part.region.x / 4, dy = part.region.y / 4;
  // Two pixels in from the border, where repeated edge pixels no longer reach.
  for (int y = 2; y < part.levels[2].rows - 2; ++y) {
    for (int x = 2; x < part.levels[2].cols - 2; ++x) {
      ASSERT_EQ(part.levels[2].at<float>(y, x), whole.levels[2].at<float>(y + dy, x + dx));
    }
  }
}

TEST(Pyramid, TinyPicturesHaveFewerLevelsAndDoNotFail) {
  for (const cv::Size size : {cv::Size(1, 1), cv::Size(3, 2), cv::Size(17, 9)}) {
    const LumaPicture picture = picture_of(random_codes(size.width, size.height, 3));
    Pyramid pyramid;
    build_pyramid(picture, {0, 0, size.width, size.height}, 4, pyramid);
    EXPECT_TRUE(pyramid.levels[4].empty());
  }
}

cv::Mat noisy(double sigma_codes, bool step) {
  render::Random random(21);
  cv::Mat codes(512, 512, CV_8UC1);
  for (int y = 0; y < codes.rows; ++y) {
    for (int x = 0; x < codes.cols; ++x) {
      const double level = 90 + 0.1 * y + (step && x % 128 > 64 ? 60 : 0);
      codes.at<std::uint8_t>(y, x) = cv::saturate_cast<std::uint8_t>(level + sigma_codes * random.normal());
    }
  }
  return codes;
}

TEST(Noise, IsReadOffAPictureOfKnownNoise) {
  for (const double sigma : {1.5, 4.0, 9.0}) {
    const LumaPicture picture = picture_of(noisy(sigma, false));
    // Rounding to whole codes adds 1/12; the 20 % quantile of tile medians lies 3 to 5 % low of the mean (the median of
    // 1,024 correlated values scatters by 4 %, and the quantile is .84 of that below).
    EXPECT_NEAR(noise_codes(picture, {0, 0, 512, 512}), std::sqrt(sigma * sigma + 1.0 / 12), 0.07 * sigma + 0.05);
  }
}

TEST(Noise, IsNotRaisedBySteps) {
  const LumaPicture plain = picture_of(noisy(3, false)), stepped = picture_of(noisy(3, true));
  const double without = noise_codes(plain, {0, 0, 512, 512});
  EXPECT_NEAR(noise_codes(stepped, {0, 0, 512, 512}), without, 0.03 * without);
}

TEST(Noise, HasAFloorForPicturesWithoutAny) {
  const LumaPicture picture = picture_of(cv::Mat(200, 200, CV_8UC1, cv::Scalar(120)));
  EXPECT_DOUBLE_EQ(noise_codes(picture, {0, 0, 200, 200}), 0.35);
}

}  // namespace
}  // namespace focusfall
