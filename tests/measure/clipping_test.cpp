// The fast counts of clipped pixels against an obvious loop over the colours that libjpeg's conversion gives.
#include "analysis/measure/clipping.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

namespace focusfall {
namespace {

// ITU-T T.871, section 7, with 16 fractional bits as libjpeg computes it, clamped.
std::array<int, 3> rgb_of(int y, int cb, int cr) {
  const auto fixed = [](double x) { return static_cast<int>(std::floor(x * 65536 + 0.5)); };
  const int b = cb - 128, r = cr - 128;
  const int red = y + ((fixed(1.402) * r + 32768) >> 16);
  const int green = y + ((-fixed(0.34414) * b - fixed(0.71414) * r + 32768) >> 16);
  const int blue = y + ((fixed(1.772) * b + 32768) >> 16);
  return {std::clamp(red, 0, 255), std::clamp(green, 0, 255), std::clamp(blue, 0, 255)};
}

// The largest 8-connected set by flooding.
std::int64_t largest_patch(std::vector<int> marked, int width, int height) {
  std::int64_t largest = 0;
  std::vector<int> open;
  for (int start = 0; start < width * height; ++start) {
    if (marked[static_cast<std::size_t>(start)] == 0) continue;
    std::int64_t size = 0;
    open.assign(1, start);
    marked[static_cast<std::size_t>(start)] = 0;
    while (!open.empty()) {
      const int at = open.back();
      open.pop_back();
      ++size;
      for (int y = std::max(at / width - 1, 0); y <= std::min(at / width + 1, height - 1); ++y) {
        for (int x = std::max(at % width - 1, 0); x <= std::min(at % width + 1, width - 1); ++x) {
          int& flag = marked[static_cast<std::size_t>(y * width + x)];
          if (flag == 0) continue;
          flag = 0;
          open.push_back(y * width + x);
        }
      }
    }
    largest = std::max(largest, size);
  }
  return largest;
}

TEST(Clipping, OfCodedPlanesIsWhatAnObviousLoopCounts) {
  cv::RNG random(11);
  for (const auto& [width, height] : {std::pair{1, 1}, {63, 17}, {64, 16}, {131, 50}}) {
    for (const int step : {1, 2, 4}) {
      const int chroma_width = (width + step - 1) / step, chroma_height = (height + step - 1) / step;
      YccStrip strip{.y = cv::Mat(height, width, CV_8UC1),
                     .cb = cv::Mat(chroma_height, chroma_width, CV_8UC1),
                     .cr = cv::Mat(chroma_height, chroma_width, CV_8UC1),
                     .chroma_step_x = step,
                     .chroma_step_y = step};
      random.fill(strip.y, cv::RNG::UNIFORM, 0, 256);
      random.fill(strip.cb, cv::RNG::UNIFORM, 100, 160);
      random.fill(strip.cr, cv::RNG::UNIFORM, 100, 160);
      strip.y.setTo(0, strip.y < 50);
      strip.y.setTo(255, strip.y > 200);

      const PixelRect aim{width / 4, height / 4, width / 2, height / 2};
      ClippingCounts slow;
      std::vector<int> two(static_cast<std::size_t>(width * height), 0);
      for (int y = 0; y < height; ++y) {
        for (int x = 0; x < width; ++x) {
          const auto rgb = rgb_of(strip.y.at<std::uint8_t>(y, x), strip.cb.at<std::uint8_t>(y / step, x / step),
                                  strip.cr.at<std::uint8_t>(y / step, x / step));
          const int full = (rgb[0] == 255) + (rgb[1] == 255) + (rgb[2] == 255);
          slow.red += rgb[0] == 255;
          slow.green += rgb[1] == 255;
          slow.blue += rgb[2] == 255;
          slow.any += full >= 1;
          slow.two_or_more += full >= 2;
          slow.shadows += rgb[0] + rgb[1] + rgb[2] == 0;
          const bool inside = x >= aim.x && x < aim.x + aim.width && y >= aim.y && y < aim.y + aim.height;
          slow.aim_any += inside && full >= 1;
          slow.aim_two_or_more += inside && full >= 2;
          two[static_cast<std::size_t>(y * width + x)] = full >= 2;
        }
      }
      slow.largest_patch = largest_patch(two, width, height);

      ClippingAccumulator fast;
      fast.start(width, height, aim);
      fast.take(strip);
      const ClippingCounts& counts = fast.counts();
      EXPECT_EQ(counts.red, slow.red);
      EXPECT_EQ(counts.green, slow.green);
      EXPECT_EQ(counts.blue, slow.blue);
      EXPECT_EQ(counts.any, slow.any);
      EXPECT_EQ(counts.two_or_more, slow.two_or_more);
      EXPECT_EQ(counts.shadows, slow.shadows);
      EXPECT_EQ(counts.aim_any, slow.aim_any);
      EXPECT_EQ(counts.aim_two_or_more, slow.aim_two_or_more);
      EXPECT_EQ(counts.largest_patch, slow.largest_patch) << width << " x " << height << ", step " << step;
    }
  }
}

}  // namespace
}  // namespace focusfall
