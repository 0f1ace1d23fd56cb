// Exact counts of clipped pixels, from strips of a picture.
//
// A channel of a pixel is clipped where its code is the largest there is: 255 of 8 bits, 65535 of 16. For a YCbCr
// picture the code is that of libjpeg's integer conversion (ITU-T T.871, 16 fractional bits, rounded) with every
// chroma sample replicated over the luma samples it serves: what libjpeg delivers with do_fancy_upsampling = FALSE.
// Smooth ("fancy") chroma interpolation moves the counts by .2 to 4 %; replication is the value the file holds.
// Shadows: every channel is 0 (judgement: the only code below which nothing can be recorded).
// The largest patch is the largest 8-connected set of pixels with two or more clipped channels, found exactly.
#pragma once

#include <cstdint>
#include <vector>

#include "analysis/conventions.h"
#include "analysis/measure/measurement.h"
#include "analysis/measure/pixel_strips.h"

namespace focusfall {

// A connected patch of this fraction of the frame, two or more channels clipped, is an area: 110 px square at 24 MP,
// large enough to be seen as paper white in a print (judgement).
inline constexpr double kClippedAreaFraction = 5e-4;
// Fewer pixels than this, two or more channels clipped, are not worth a word: 22 px square at 24 MP (judgement).
inline constexpr double kClippedPointsFraction = 2e-5;
// From here on a single clipped channel is reported as colour (judgement: as an area, but it need not be connected).
inline constexpr double kClippedColourFraction = 5e-4;

// Side of the square cells in which clipped pixels are counted; tiles are whole multiples of it.
inline constexpr int kClippingCellPx = 64;

// Whole numbers of pixels. Fractions are made of them at the end only.
struct ClippingCounts {
  std::int64_t red = 0, green = 0, blue = 0;
  std::int64_t any = 0;            // at least one channel
  std::int64_t two_or_more = 0;
  std::int64_t shadows = 0;        // every channel 0
  std::int64_t aim_any = 0;
  std::int64_t aim_two_or_more = 0;
  std::int64_t largest_patch = 0;  // two or more channels, 8-connected
};

// Grows 8-connected components row by row from runs of set pixels; memory is that of two rows.
class PatchFinder {
 public:
  void start();
  // One bit a pixel, the leftmost in the lowest bit of the first word; bits past the width are 0.
  void take_row(const std::uint64_t* bits, int words);
  void take_empty_row();
  std::int64_t largest() const { return largest_; }

 private:
  struct Run {
    int begin, end;   // [begin, end)
    int component;
  };
  void find_runs(const std::uint64_t* bits, int words);
  int root(int component);
  void join(int a, int b);
  void renumber();

  std::int64_t largest_ = 0;
  std::vector<Run> above_, row_;
  std::vector<int> parent_, renumbered_;
  std::vector<std::int64_t> size_, kept_size_;
};

// One bit a pixel for 64 pixels of a row, the leftmost in the lowest bit.
struct ClippedBits {
  std::uint64_t red = 0, green = 0, blue = 0;
  std::uint64_t black = 0;                   // every channel 0
};

// Feed strips from top to bottom. Reused from frame to frame by start(); nothing is allocated for a frame of the same
// size as the last.
class ClippingAccumulator {
 public:
  // `aim` is counted on its own; empty = no aim.
  void start(int width_px, int height_px, PixelRect aim);
  void take(const YccStrip& strip);
  void take(const RgbStrip& strip);

  const ClippingCounts& counts() const { return counts_; }
  Clipping clipping() const;                 // fractions and kind
  // Fraction of each square tile with any channel clipped, row by row; the last row and column of tiles may be cut.
  // tile_px is a multiple of kClippingCellPx.
  std::vector<float> clipped_tiles(int tile_px) const;

 private:
  void start_band(int rows);
  void count(int first_row, int row, int word, const ClippedBits& bits);
  void finish_band(int rows);
  void take_ycc_band(const YccStrip& strip, int band_row, int rows);
  template <class Code, int channels>
  void take_rgb(const RgbStrip& strip);

  ClippingCounts counts_;
  PatchFinder patches_;
  PixelRect aim_;
  int width_px_ = 0, height_px_ = 0;
  int words_ = 0;                            // of 64 pixels a row, and columns of cells
  std::vector<std::uint64_t> aim_bits_;      // one row of them
  std::vector<std::int64_t> cell_any_;
  std::vector<std::uint64_t> two_;           // pixels of the band at hand with two or more channels clipped
  std::vector<std::uint8_t> row_touched_;    // rows of the band that hold such a pixel
};

// area, points, colour or none, from the named fractions above.
ClippedKind clipped_kind(const Clipping& clipping);

}  // namespace focusfall
