#include "analysis/measure/highlights.h"

#include <algorithm>
#include <cassert>
#include <cmath>

namespace focusfall {
namespace {

constexpr double kSamples = 200'000;

int sampling_step(const PixelRect& area) {
  const double pixels = static_cast<double>(area.width) * area.height;
  return std::max(1, static_cast<int>(std::sqrt(pixels / kSamples)));
}

// The larger of the three channels of a YCbCr sample by the integer conversion of libjpeg (ITU-T T.871, 16 fractional
// bits), the one that clipping is counted with.
int largest_channel(int y, int cb, int cr) {
  constexpr int kHalf = 1 << 15;
  const int red = (91881 * (cr - 128) + kHalf) >> 16;
  const int green = (-22554 * (cb - 128) - 46802 * (cr - 128) + kHalf) >> 16;
  const int blue = (116130 * (cb - 128) + kHalf) >> 16;
  return std::clamp(y + std::max({red, green, blue}), 0, 255);
}

std::vector<float> shares_above(const std::vector<std::uint32_t>& counts, std::uint64_t total,
                                const std::vector<float>& linear_of_code) {
  std::vector<float> shares;
  std::uint64_t above = 0;
  std::size_t code = counts.size();
  for (int k = 0; k < kHighlightSteps; ++k) {
    // The clipping level is the highest code itself; below it a level counts what lies at or above it.
    const double level = k == 0 ? 1 : std::exp2(-k / kHighlightStepsPerStop);
    while (code > 0 && static_cast<double>(linear_of_code[code - 1]) >= level - 1e-7) above += counts[--code];
    shares.push_back(static_cast<float>(static_cast<double>(above) / static_cast<double>(total)));
  }
  return shares;
}

}  // namespace

void HighlightAccumulator::start(int width_px, int height_px, PixelRect aim, int code_count) {
  grids_[0].area = {0, 0, width_px, height_px};
  grids_[1].area = aim;
  for (Grid& grid : grids_) {
    grid.step = sampling_step(grid.area);
    grid.counts.assign(static_cast<std::size_t>(code_count), 0);
    grid.total = 0;
  }
}

template <class RowReader>
void HighlightAccumulator::take_rows(int first_row, int rows, RowReader largest_code_of_row) {
  for (Grid& grid : grids_) {
    const int bottom = std::min(first_row + rows, grid.area.y + grid.area.height);
    const int top = std::max(first_row, grid.area.y);
    const int first = grid.area.y + (top - grid.area.y + grid.step - 1) / grid.step * grid.step;
    const int right = grid.area.x + grid.area.width;
    for (int y = first; y < bottom; y += grid.step) {
      const auto largest_code = largest_code_of_row(y - first_row);
      for (int x = grid.area.x; x < right; x += grid.step) ++grid.counts[static_cast<std::size_t>(largest_code(x))];
      grid.total += static_cast<std::uint64_t>((right - grid.area.x + grid.step - 1) / grid.step);
    }
  }
}

void HighlightAccumulator::take(const YccStrip& strip) {
  if (strip.cb.empty()) {
    take_rows(strip.first_row, strip.y.rows, [&](int row) {
      return [y = strip.y.ptr<std::uint8_t>(row)](int x) { return static_cast<int>(y[x]); };
    });
    return;
  }
  // The usual steps, 1 and 2, without a division for every sample.
  const auto take_with = [&](auto chroma_x) {
    take_rows(strip.first_row, strip.y.rows, [&](int row) {
      const int chroma_row = row / strip.chroma_step_y;
      return [chroma_x, y = strip.y.ptr<std::uint8_t>(row), cb = strip.cb.ptr<std::uint8_t>(chroma_row),
              cr = strip.cr.ptr<std::uint8_t>(chroma_row)](int x) {
        return largest_channel(y[x], cb[chroma_x(x)], cr[chroma_x(x)]);
      };
    });
  };
  if (strip.chroma_step_x == 1) take_with([](int x) { return x; });
  else if (strip.chroma_step_x == 2) take_with([](int x) { return x / 2; });
  else take_with([step = strip.chroma_step_x](int x) { return x / step; });
}

void HighlightAccumulator::take(const RgbStrip& strip) {
  const int channels = strip.rgb.channels();
  const auto take_codes = [&]<class Code>(Code) {
    take_rows(strip.first_row, strip.rgb.rows, [&](int row) {
      return [channels, codes = strip.rgb.ptr<Code>(row)](int x) {
        const Code* pixel = codes + static_cast<std::ptrdiff_t>(x) * channels;
        return static_cast<int>(channels == 1 ? pixel[0] : std::max({pixel[0], pixel[1], pixel[2]}));
      };
    });
  };
  if (strip.rgb.depth() == CV_8U) take_codes(std::uint8_t{});
  else take_codes(std::uint16_t{});
}

std::optional<Highlights> HighlightAccumulator::highlights(const std::vector<float>& linear_of_code) const {
  if (grids_[0].total == 0) return std::nullopt;
  assert(linear_of_code.size() == grids_[0].counts.size());
  Highlights highlights;
  highlights.frame_share_above = shares_above(grids_[0].counts, grids_[0].total, linear_of_code);
  if (grids_[1].total > 0) {
    highlights.aim_share_above = shares_above(grids_[1].counts, grids_[1].total, linear_of_code);
  }
  return highlights;
}

}  // namespace focusfall
