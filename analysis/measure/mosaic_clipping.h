// Clipping, tone and headroom from the mosaic of a raw file: the photosites themselves, before any development.
//
// A photosite is saturated where its code is at or above the white level of its colour. Fractions per channel are
// those of the photosites of that colour. "At least one channel" and "two or more" are decided per cell: the smallest
// square that holds every colour (2 x 2 for a Bayer mosaic, 3 x 3 for a 6 x 6 one, one pixel of a linear raw); so is
// the largest patch. Black is taken off before anything is called a level.
#pragma once

#include <array>
#include <cstdint>
#include <opencv2/core.hpp>
#include <optional>
#include <vector>

#include "analysis/conventions.h"
#include "analysis/measure/clipping.h"
#include "analysis/measure/measurement.h"

namespace focusfall {

// One place of the repeating pattern.
struct MosaicSite {
  std::uint8_t channel = 1;      // 0 red, 1 green, 2 blue
  float black = 0;               // code without light
  float white = 65535;           // code from which the photosite is saturated
};

struct MosaicFormat {
  int width_px = 0;              // visible photosites, unrotated frame
  int height_px = 0;
  int period_x = 2;              // the site of (x, y) is sites[(y % period_y) * period_x + x % period_x]
  int period_y = 2;
  int cell_px = 2;               // side of the smallest square that holds every colour; 1 for a linear raw
  bool linear_rgb = false;       // true: three codes a pixel (period 1 x 1, sites = red, green, blue)
  std::vector<MosaicSite> sites;
};

// Rows of codes as the sensor gave them: CV_16UC1, or CV_16UC3 for a linear raw. Every strip but the last holds a
// whole number of periods and cells.
struct MosaicStrip {
  int first_row = 0;
  cv::Mat codes;
};

struct MosaicClippingOptions {
  std::optional<FractionBox> aim;   // counted on its own; in fractions of the frame
};

struct MosaicCounts {
  std::array<std::int64_t, 3> photosites{};   // of each colour
  std::array<std::int64_t, 3> saturated{};
  std::int64_t cells = 0;                     // whole cells only
  std::int64_t any = 0;                       // cells with a saturated photosite
  std::int64_t two_or_more = 0;               // cells with two or three colours saturated
  std::int64_t shadows = 0;                   // cells with every photosite at or below black
  std::int64_t aim_cells = 0;
  std::int64_t aim_any = 0;
  std::int64_t aim_two_or_more = 0;
  std::int64_t largest_patch = 0;             // cells, two or more colours, 8-connected
};

// Feed strips from top to bottom. Reused from frame to frame by start().
class MosaicAccumulator {
 public:
  void start(const MosaicFormat& format, const MosaicClippingOptions& options);
  void take(const MosaicStrip& strip);

  const MosaicCounts& counts() const { return counts_; }
  Clipping clipping() const;            // fractions, kind; measured_on = mosaic

  // Of the green photosites, which carry most of the luminance: (code - black) / (white - black), 0..1.
  std::optional<Tone> tone() const;

  // How far the developed picture clips below the sensor, stops: for every channel that clips in `picture`, the level
  // above which the same share of photosites lies is where the picture clips; headroom = -log2(level). The least of
  // the channels. No pixel need be matched with a photosite, so a cropped or corrected preview does no harm.
  // Absent where the picture does not clip. 0: the sensor clips where the picture does.
  std::optional<double> headroom_ev(const Clipping& picture) const;

 private:
  void count_row(int y, const cv::Mat& codes, int row);
  void finish_cells(int cell_row);

  MosaicFormat format_;
  MosaicCounts counts_;
  PatchFinder patches_;
  PixelRect aim_;                                        // in cells
  std::array<std::vector<std::uint32_t>, 3> histograms_; // of code - black, by channel
  std::vector<std::uint32_t> aim_green_;
  std::array<double, 3> span_{};                         // white - black
  std::vector<std::uint8_t> cell_flags_;                 // of the row of cells at hand: saturated colours, any light
  std::vector<std::uint64_t> mask_;
};

}  // namespace focusfall
