#include "analysis/measure/level_grid.h"

#include <algorithm>
#include <cmath>
#include <cstdint>

namespace focusfall {
namespace {

constexpr int kCellPx = 64;
constexpr int kMostColumns = 48;   // judgement: tiles of 128 px at 24 MP, a few hundred samples each
constexpr int kStride = 4;

struct Sums {
  double sum = 0, squares = 0;
};

template <class Code>
void add_row(const Code* codes, int tile_px, const std::vector<float>& linear_of_code, std::vector<Sums>& sums) {
  for (Sums& tile : sums) {
    float sum = 0, squares = 0;
    for (int x = 0; x < tile_px; x += kStride) {
      const float linear = linear_of_code[codes[x]];
      sum += linear;
      squares += linear * linear;
    }
    tile.sum += static_cast<double>(sum);
    tile.squares += static_cast<double>(squares);
    codes += tile_px;
  }
}

}  // namespace

int level_tile_px(int width_px) {
  const int cells = (width_px + kCellPx * kMostColumns - 1) / (kCellPx * kMostColumns);
  return kCellPx * std::max(1, cells);
}

LevelGrid level_grid(const LumaPicture& picture) {
  LevelGrid grid;
  grid.tile_px = level_tile_px(picture.codes.cols);
  grid.rows = picture.codes.rows / grid.tile_px;
  grid.columns = picture.codes.cols / grid.tile_px;
  const auto tiles = static_cast<std::size_t>(grid.rows) * static_cast<std::size_t>(grid.columns);
  grid.mean_linear.reserve(tiles);
  grid.contrast.reserve(tiles);

  const int samples = grid.tile_px / kStride * (grid.tile_px / kStride);
  std::vector<Sums> sums(static_cast<std::size_t>(grid.columns));
  for (int row = 0; row < grid.rows; ++row) {
    std::fill(sums.begin(), sums.end(), Sums{});
    for (int y = 0; y < grid.tile_px; y += kStride) {
      const int picture_row = row * grid.tile_px + y;
      if (picture.codes.depth() == CV_8U) {
        add_row(picture.codes.ptr<std::uint8_t>(picture_row), grid.tile_px, picture.linear_of_code, sums);
      } else {
        add_row(picture.codes.ptr<std::uint16_t>(picture_row), grid.tile_px, picture.linear_of_code, sums);
      }
    }
    for (const Sums& tile : sums) {
      const double mean = tile.sum / samples;
      const double variance = std::max(0.0, tile.squares / samples - mean * mean);
      grid.mean_linear.push_back(static_cast<float>(mean));
      grid.contrast.push_back(mean > 0 ? static_cast<float>(std::sqrt(variance) / mean) : 0);
    }
  }
  return grid;
}

}  // namespace focusfall
