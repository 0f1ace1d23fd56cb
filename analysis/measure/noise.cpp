#include "analysis/measure/noise.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <vector>

namespace focusfall {
namespace {

constexpr int kTile = 32;
constexpr double kFloorCodes = 0.35;         // judgement: what quantisation and JPEG leave
constexpr double kCodingShare = 0.2;         // of the coding's step: one coefficient that survives alone ripples by half a
                                             // step from crest to trough, and an edge must stand out of three such by
                                             // ten times the noise (EdgeSearch)
constexpr double kQuantile = 0.2;            // measured: texture fills the other tiles of most pictures
constexpr int kMostTiles = 400;              // sampled evenly; the quantile is steady to 3 % with this many
constexpr double kMedianToSigma = 0.6745;    // of a normal distribution

// Median of |second difference| over one tile, in codes of the picture; the histogram is in sixths of a code.
template <class Code>
double tile_median(const cv::Mat& codes, int x0, int y0, double codes_per_8bit) {
  std::array<float, kTile * kTile> values{};
  std::size_t n = 0;
  for (int y = y0; y < y0 + kTile; ++y) {
    const Code* above = codes.ptr<Code>(y - 1) + x0;
    const Code* here = codes.ptr<Code>(y) + x0;
    const Code* below = codes.ptr<Code>(y + 1) + x0;
    for (int x = 0; x < kTile; ++x) {
      auto second = [x](const Code* row) { return int{row[x - 1]} - 2 * int{row[x]} + int{row[x + 1]}; };
      values[n++] = static_cast<float>(std::abs(second(above) - 2 * second(here) + second(below)));
    }
  }
  auto middle = values.begin() + values.size() / 2;
  std::nth_element(values.begin(), middle, values.end());
  return *middle / 6.0 / codes_per_8bit;
}

}  // namespace

double noise_codes(const LumaPicture& picture, PixelRect region) {
  const cv::Mat& codes = picture.codes;
  const int x0 = std::max(region.x, 1), y0 = std::max(region.y, 1);
  const int columns = (std::min(region.x + region.width, codes.cols - 1) - x0) / kTile;
  const int rows = (std::min(region.y + region.height, codes.rows - 1) - y0) / kTile;
  if (columns < 1 || rows < 1) return kFloorCodes;

  const long long tiles = static_cast<long long>(columns) * rows;
  const long long step = std::max(1LL, tiles / kMostTiles);
  std::vector<double> medians;
  for (long long i = 0; i < tiles; i += step) {
    const int x = x0 + static_cast<int>(i % columns) * kTile;
    const int y = y0 + static_cast<int>(i / columns) * kTile;
    medians.push_back(codes.depth() == CV_16U ? tile_median<std::uint16_t>(codes, x, y, 257.0)
                                              : tile_median<std::uint8_t>(codes, x, y, 1.0));
  }
  auto at = medians.begin() + static_cast<std::ptrdiff_t>(kQuantile * static_cast<double>(medians.size() - 1));
  std::nth_element(medians.begin(), at, medians.end());
  return std::max({*at / kMedianToSigma, kFloorCodes, kCodingShare * picture.coding_step_codes});
}

}  // namespace focusfall
