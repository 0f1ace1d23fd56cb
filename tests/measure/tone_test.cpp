// Tone against a sorted list of all pixels.
#include "analysis/measure/tone.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "analysis/measure/luma_picture.h"

namespace focusfall {
namespace {

TEST(Tone, IsThatOfTheSortedPixels) {
  for (const int count : {256, 65536}) {
    cv::Mat luma(37, 61, count == 256 ? CV_8UC1 : CV_16UC1);
    cv::RNG(3).fill(luma, cv::RNG::UNIFORM, 0, count);
    const std::vector<float> curve = srgb_linear_of_code(count);
    ToneAccumulator fast;
    fast.start(count, {10, 5, 20, 11});
    fast.take(0, luma.rowRange(0, 20));
    fast.take(20, luma.rowRange(20, 37));
    const auto tone = fast.tone(curve);
    ASSERT_TRUE(tone);

    std::vector<double> all, aim;
    for (int y = 0; y < luma.rows; ++y) {
      for (int x = 0; x < luma.cols; ++x) {
        const int code = count == 256 ? luma.at<std::uint8_t>(y, x) : luma.at<std::uint16_t>(y, x);
        all.push_back(static_cast<double>(curve[static_cast<std::size_t>(code)]));
        if (x >= 10 && x < 30 && y >= 5 && y < 16) aim.push_back(all.back());
      }
    }
    double sum = 0;
    for (const double value : all) sum += value;
    std::sort(all.begin(), all.end());
    std::sort(aim.begin(), aim.end());
    const auto quantile = [](const std::vector<double>& sorted, double q) {
      return sorted[static_cast<std::size_t>(std::ceil(q * static_cast<double>(sorted.size()))) - 1];
    };
    EXPECT_NEAR(tone->mean_linear, sum / static_cast<double>(all.size()), 1e-9);   // the order of summing
    EXPECT_EQ(tone->median_linear, quantile(all, 0.5));
    EXPECT_EQ(tone->p99_linear, quantile(all, 0.99));
    EXPECT_EQ(tone->aim_median_linear, quantile(aim, 0.5));
  }
}

TEST(Tone, OfNoPixelsIsAbsent) {
  ToneAccumulator none;
  none.start(256, {});
  EXPECT_FALSE(none.tone(srgb_linear_of_code(256)));
}

}  // namespace
}  // namespace focusfall
