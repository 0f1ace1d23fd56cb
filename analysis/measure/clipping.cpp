#include "analysis/measure/clipping.h"

#include <algorithm>
#include <array>
#include <bit>
#include <cassert>
#include <limits>
#include <numeric>
#include <opencv2/core/hal/intrin.hpp>

namespace focusfall {
namespace {

constexpr int kWordPx = 64;
constexpr int kBandRows = 16;   // rows looked at together: a block is 64 x 16
static_assert(kClippingCellPx == kWordPx, "one word of a row belongs to one cell");

// What chroma adds to luma in libjpeg's integer conversion (jdcolor.c, build_ycc_rgb_table), 16 fractional bits:
//   R = Y + 1.402 Cr', B = Y + 1.772 Cb', G = Y - 0.34414 Cb' - 0.71414 Cr', primes = code - 128, each rounded.
struct ChromaTables {
  std::array<int, 256> red{}, blue{}, green_of_cb{}, green_of_cr{};
};

constexpr ChromaTables make_chroma_tables() {
  constexpr auto fixed = [](double x) { return static_cast<int>(x * 65536 + 0.5); };
  ChromaTables tables;
  for (int code = 0; code < 256; ++code) {
    const auto i = static_cast<std::size_t>(code);
    const int x = code - 128;
    tables.red[i] = (fixed(1.40200) * x + 32768) >> 16;
    tables.blue[i] = (fixed(1.77200) * x + 32768) >> 16;
    tables.green_of_cb[i] = -fixed(0.34414) * x + 32768;
    tables.green_of_cr[i] = -fixed(0.71414) * x;
  }
  return tables;
}

constexpr ChromaTables kChroma = make_chroma_tables();

int red_added(int cr) { return kChroma.red[static_cast<std::size_t>(cr)]; }
int blue_added(int cb) { return kChroma.blue[static_cast<std::size_t>(cb)]; }
int green_added(int cb, int cr) {
  return (kChroma.green_of_cb[static_cast<std::size_t>(cb)] + kChroma.green_of_cr[static_cast<std::size_t>(cr)]) >> 16;
}

struct Range {
  int low = 255, high = 0;
};

Range range_of(const std::uint8_t* first, std::size_t step, int width, int rows) {
  cv::v_uint8x16 low = cv::v_setall_u8(255), high = cv::v_setall_u8(0);
  Range range;
  const int whole = width / 16 * 16;
  for (int row = 0; row < rows; ++row) {
    const std::uint8_t* p = first + static_cast<std::size_t>(row) * step;
    for (int x = 0; x < whole; x += 16) {
      const cv::v_uint8x16 v = cv::v_load(p + x);
      low = cv::v_min(low, v);
      high = cv::v_max(high, v);
    }
    for (int x = whole; x < width; ++x) {
      range.low = std::min<int>(range.low, p[x]);
      range.high = std::max<int>(range.high, p[x]);
    }
  }
  if (whole > 0) {
    range.low = std::min<int>(range.low, cv::v_reduce_min(low));
    range.high = std::max<int>(range.high, cv::v_reduce_max(high));
  }
  return range;
}

// Bit i set where flag byte i is 0xFF.
std::uint64_t bits_of(const std::array<cv::v_uint8x16, 4>& flags) {
  std::uint64_t bits = 0;
  for (int i = 0; i < 4; ++i) {
    bits |= static_cast<std::uint64_t>(static_cast<std::uint16_t>(cv::v_signmask(flags[static_cast<std::size_t>(i)])))
            << (16 * i);
  }
  return bits;
}

// For 64 neighbouring pixels under one row of chroma: a channel is clipped where luma > its entry. 255 = never.
struct LumaLimits {
  alignas(16) std::array<std::uint8_t, kWordPx> red, green, blue, black;   // black: 0xFF where Y = 0 is black
};

void set_limits(LumaLimits& limits, std::size_t i, int cb, int cr) {
  const int red = red_added(cr), green = green_added(cb, cr), blue = blue_added(cb);
  const auto limit = [](int added) { return static_cast<std::uint8_t>(std::min(254 - added, 255)); };
  limits.red[i] = limit(red);
  limits.green[i] = limit(green);
  limits.blue[i] = limit(blue);
  limits.black[i] = red <= 0 && green <= 0 && blue <= 0 ? 0xFF : 0;
}

ClippedBits bits_of_luma(const std::uint8_t* y, const LumaLimits& limits) {
  std::array<cv::v_uint8x16, 4> red, green, blue, black;
  for (std::size_t i = 0; i < 4; ++i) {
    const cv::v_uint8x16 v = cv::v_load(y + 16 * i);
    red[i] = v > cv::v_load(limits.red.data() + 16 * i);
    green[i] = v > cv::v_load(limits.green.data() + 16 * i);
    blue[i] = v > cv::v_load(limits.blue.data() + 16 * i);
    black[i] = (v == cv::v_setzero_u8()) & cv::v_load(limits.black.data() + 16 * i);
  }
  return {bits_of(red), bits_of(green), bits_of(blue), bits_of(black)};
}

std::uint64_t lowest_bits(int count) { return count >= 64 ? ~std::uint64_t{0} : (std::uint64_t{1} << count) - 1; }

// The plain count for interleaved codes; other formats cost far more to decode than this takes.
template <class Code, int channels>
ClippedBits bits_of_interleaved(const Code* p, int count) {
  constexpr Code full = std::numeric_limits<Code>::max();
  ClippedBits bits;
  for (int i = 0; i < count; ++i, p += channels) {
    const Code red = p[0], green = p[channels / 2], blue = p[channels - 1];
    bits.red |= static_cast<std::uint64_t>(red == full) << i;
    bits.green |= static_cast<std::uint64_t>(green == full) << i;
    bits.blue |= static_cast<std::uint64_t>(blue == full) << i;
    bits.black |= static_cast<std::uint64_t>((red | green | blue) == 0) << i;
  }
  return bits;
}

}  // namespace

void PatchFinder::start() {
  largest_ = 0;
  take_empty_row();
}

int PatchFinder::root(int component) {
  auto at = [this](int i) -> int& { return parent_[static_cast<std::size_t>(i)]; };
  while (at(component) != component) component = at(component) = at(at(component));
  return component;
}

void PatchFinder::join(int a, int b) {
  a = root(a);
  b = root(b);
  if (a == b) return;
  parent_[static_cast<std::size_t>(b)] = a;
  size_[static_cast<std::size_t>(a)] += size_[static_cast<std::size_t>(b)];
}

void PatchFinder::find_runs(const std::uint64_t* bits, int words) {
  row_.clear();
  for (int word = 0; word < words; ++word) {
    std::uint64_t left = bits[word];
    while (left != 0) {
      const int begin = std::countr_zero(left);
      const int length = std::countr_one(left >> begin);
      const int x = word * kWordPx + begin;
      if (!row_.empty() && row_.back().end == x) {
        row_.back().end = x + length;   // goes on from the word before
      } else {
        row_.push_back({x, x + length, 0});
      }
      left &= ~(lowest_bits(length) << begin);
    }
  }
}

void PatchFinder::take_row(const std::uint64_t* bits, int words) {
  find_runs(bits, words);

  // Components 0..n-1 are those alive in the row above; each run starts one of its own and joins what it touches.
  auto touching = above_.begin();
  for (Run& run : row_) {
    run.component = static_cast<int>(parent_.size());
    parent_.push_back(run.component);
    size_.push_back(run.end - run.begin);
    while (touching != above_.end() && touching->end < run.begin) ++touching;
    for (auto other = touching; other != above_.end() && other->begin <= run.end; ++other) {
      join(other->component, run.component);
    }
  }
  renumber();
  std::swap(above_, row_);
}

// Keeps the components that this row touches, numbered from 0, so that memory follows the row and not the picture.
void PatchFinder::renumber() {
  renumbered_.assign(parent_.size(), -1);
  kept_size_.clear();
  for (Run& run : row_) {
    const auto old = static_cast<std::size_t>(root(run.component));
    if (renumbered_[old] < 0) {
      renumbered_[old] = static_cast<int>(kept_size_.size());
      kept_size_.push_back(size_[old]);
      largest_ = std::max(largest_, size_[old]);
    }
    run.component = renumbered_[old];
  }
  std::swap(size_, kept_size_);
  parent_.resize(size_.size());
  std::iota(parent_.begin(), parent_.end(), 0);
}

void PatchFinder::take_empty_row() {
  above_.clear();
  parent_.clear();
  size_.clear();
}

void ClippingAccumulator::start(int width_px, int height_px, PixelRect aim) {
  assert(width_px > 0 && height_px > 0);
  counts_ = {};
  patches_.start();
  width_px_ = width_px;
  height_px_ = height_px;
  words_ = (width_px + kWordPx - 1) / kWordPx;
  cell_any_.assign(static_cast<std::size_t>(words_) * static_cast<std::size_t>((height_px + kWordPx - 1) / kWordPx), 0);

  // The aim inside the frame.
  const int right = std::min(aim.x + aim.width, width_px), bottom = std::min(aim.y + aim.height, height_px);
  aim_.x = std::max(aim.x, 0);
  aim_.y = std::max(aim.y, 0);
  aim_.width = std::max(right - aim_.x, 0);
  aim_.height = std::max(bottom - aim_.y, 0);
  aim_bits_.assign(static_cast<std::size_t>(words_), 0);
  for (int word = 0; word < words_; ++word) {
    const int begin = std::clamp(aim_.x - word * kWordPx, 0, kWordPx);
    const int end = std::clamp(aim_.x + aim_.width - word * kWordPx, begin, kWordPx);
    aim_bits_[static_cast<std::size_t>(word)] = lowest_bits(end) & ~lowest_bits(begin);
  }
}

void ClippingAccumulator::start_band(int rows) {
  two_.assign(static_cast<std::size_t>(words_) * static_cast<std::size_t>(rows), 0);
  row_touched_.assign(static_cast<std::size_t>(rows), 0);
}

void ClippingAccumulator::count(int first_row, int row, int word, const ClippedBits& bits) {
  const std::uint64_t any = bits.red | bits.green | bits.blue;
  counts_.shadows += std::popcount(bits.black);
  if (any == 0) return;
  const std::uint64_t two = (bits.red & bits.green) | (bits.blue & (bits.red | bits.green));
  const int y = first_row + row;
  const int any_count = std::popcount(any), two_count = std::popcount(two);
  counts_.red += std::popcount(bits.red);
  counts_.green += std::popcount(bits.green);
  counts_.blue += std::popcount(bits.blue);
  counts_.any += any_count;
  counts_.two_or_more += two_count;
  cell_any_[static_cast<std::size_t>(y / kWordPx * words_ + word)] += any_count;
  if (y >= aim_.y && y < aim_.y + aim_.height) {
    const std::uint64_t aim = aim_bits_[static_cast<std::size_t>(word)];
    counts_.aim_any += std::popcount(any & aim);
    counts_.aim_two_or_more += std::popcount(two & aim);
  }
  if (two == 0) return;
  two_[static_cast<std::size_t>(row * words_ + word)] = two;
  row_touched_[static_cast<std::size_t>(row)] = 1;
}

void ClippingAccumulator::finish_band(int rows) {
  for (int row = 0; row < rows; ++row) {
    if (row_touched_[static_cast<std::size_t>(row)] != 0) {
      patches_.take_row(two_.data() + static_cast<std::size_t>(row * words_), words_);
    } else {
      patches_.take_empty_row();
    }
  }
  counts_.largest_patch = patches_.largest();
}

void ClippingAccumulator::take(const YccStrip& strip) {
  // A band holds whole steps of chroma rows.
  const int band_rows = std::max(kBandRows / strip.chroma_step_y, 1) * strip.chroma_step_y;
  for (int band_row = 0; band_row < strip.y.rows; band_row += band_rows) {
    take_ycc_band(strip, band_row, std::min(band_rows, strip.y.rows - band_row));
  }
}

void ClippingAccumulator::take_ycc_band(const YccStrip& strip, int band_row, int rows) {
  const bool grey = strip.cb.empty();
  const int step_x = strip.chroma_step_x, step_y = strip.chroma_step_y;
  const int chroma_row = band_row / step_y, chroma_rows = (rows + step_y - 1) / step_y;
  start_band(rows);
  for (int word = 0; word < words_; ++word) {
    const int x = word * kWordPx, width = std::min(kWordPx, width_px_ - x);
    const int chroma_x = x / step_x, chroma_width = (x + width - 1) / step_x - chroma_x + 1;

    // Can any pixel of this block be clipped, or black? R and B grow with Cr and Cb, G falls with both. Black needs
    // Y = 0: with Y > 0 red and blue are 0 only if Cr and Cb are below 128, and then green is above 0.
    const Range luma = range_of(strip.y.ptr(band_row) + x, strip.y.step, width, rows);
    Range cb{128, 128}, cr{128, 128};
    if (!grey) {
      cb = range_of(strip.cb.ptr(chroma_row) + chroma_x, strip.cb.step, chroma_width, chroma_rows);
      cr = range_of(strip.cr.ptr(chroma_row) + chroma_x, strip.cr.step, chroma_width, chroma_rows);
    }
    const int most_added = std::max({red_added(cr.high), blue_added(cb.high), green_added(cb.low, cr.low)});
    if (luma.high + most_added < 255 && luma.low > 0) continue;

    LumaLimits limits{};
    if (grey) {
      for (std::size_t i = 0; i < kWordPx; ++i) set_limits(limits, i, 128, 128);
    }
    alignas(16) std::array<std::uint8_t, kWordPx> cut;   // the last block may be narrower than a word
    for (int row = 0; row < rows; ++row) {
      if (!grey && row % step_y == 0) {
        const std::uint8_t* cb_row = strip.cb.ptr(chroma_row + row / step_y);
        const std::uint8_t* cr_row = strip.cr.ptr(chroma_row + row / step_y);
        for (int i = 0; i < width; ++i) {
          set_limits(limits, static_cast<std::size_t>(i), cb_row[(x + i) / step_x], cr_row[(x + i) / step_x]);
        }
      }
      const std::uint8_t* y = strip.y.ptr(band_row + row) + x;
      if (width < kWordPx) {
        std::copy_n(y, width, cut.data());
        y = cut.data();
      }
      ClippedBits bits = bits_of_luma(y, limits);
      if (width < kWordPx) {
        const std::uint64_t valid = lowest_bits(width);
        bits = {bits.red & valid, bits.green & valid, bits.blue & valid, bits.black & valid};
      }
      count(strip.first_row + band_row, row, word, bits);
    }
  }
  finish_band(rows);
}

template <class Code, int channels>
void ClippingAccumulator::take_rgb(const RgbStrip& strip) {
  for (int row = 0; row < strip.rgb.rows; ++row) {
    start_band(1);
    const Code* codes = strip.rgb.ptr<Code>(row);
    for (int word = 0; word < words_; ++word) {
      const int x = word * kWordPx;
      count(strip.first_row + row, 0, word,
            bits_of_interleaved<Code, channels>(codes + x * channels, std::min(kWordPx, width_px_ - x)));
    }
    finish_band(1);
  }
}

void ClippingAccumulator::take(const RgbStrip& strip) {
  switch (strip.rgb.type()) {
    case CV_8UC1: return take_rgb<std::uint8_t, 1>(strip);
    case CV_8UC3: return take_rgb<std::uint8_t, 3>(strip);
    case CV_16UC1: return take_rgb<std::uint16_t, 1>(strip);
    case CV_16UC3: return take_rgb<std::uint16_t, 3>(strip);
    default: assert(false && "strips hold 8 or 16 bits in 1 or 3 channels");
  }
}

Clipping ClippingAccumulator::clipping() const {
  const double pixels = static_cast<double>(width_px_) * height_px_;
  const double aim_pixels = std::max(static_cast<double>(aim_.width) * aim_.height, 1.0);
  const auto of_frame = [&](std::int64_t count) { return static_cast<double>(count) / pixels; };
  Clipping clipping;
  clipping.red = of_frame(counts_.red);
  clipping.green = of_frame(counts_.green);
  clipping.blue = of_frame(counts_.blue);
  clipping.any = of_frame(counts_.any);
  clipping.two_or_more = of_frame(counts_.two_or_more);
  clipping.aim_any = static_cast<double>(counts_.aim_any) / aim_pixels;
  clipping.aim_two_or_more = static_cast<double>(counts_.aim_two_or_more) / aim_pixels;
  clipping.largest_patch = of_frame(counts_.largest_patch);
  clipping.shadows_any = of_frame(counts_.shadows);
  clipping.kind = clipped_kind(clipping);
  return clipping;
}

std::vector<float> ClippingAccumulator::clipped_tiles(int tile_px) const {
  assert(tile_px > 0 && tile_px % kClippingCellPx == 0);
  const int rows = (height_px_ + tile_px - 1) / tile_px, columns = (width_px_ + tile_px - 1) / tile_px;
  std::vector<std::int64_t> counts(static_cast<std::size_t>(rows * columns), 0);
  const int cells_a_tile = tile_px / kClippingCellPx;
  for (std::size_t cell = 0; cell < cell_any_.size(); ++cell) {
    const int row = static_cast<int>(cell) / words_ / cells_a_tile, column = static_cast<int>(cell) % words_ / cells_a_tile;
    counts[static_cast<std::size_t>(row * columns + column)] += cell_any_[cell];
  }
  std::vector<float> fractions(counts.size());
  for (std::size_t tile = 0; tile < counts.size(); ++tile) {
    const int y = static_cast<int>(tile) / columns * tile_px, x = static_cast<int>(tile) % columns * tile_px;
    const double pixels = static_cast<double>(std::min(tile_px, width_px_ - x)) * std::min(tile_px, height_px_ - y);
    fractions[tile] = static_cast<float>(static_cast<double>(counts[tile]) / pixels);
  }
  return fractions;
}

ClippedKind clipped_kind(const Clipping& clipping) {
  if (clipping.largest_patch >= kClippedAreaFraction) return ClippedKind::area;
  if (clipping.two_or_more >= kClippedPointsFraction) return ClippedKind::points;
  if (clipping.any - clipping.two_or_more >= kClippedColourFraction) return ClippedKind::colour;
  return ClippedKind::none;
}

}  // namespace focusfall
