// Finds edges in a picture and fits the width of each: edge-spread fits on an image pyramid.
//
// An edge is kept with the squared disc S (px^2 of level 0) that would blur an ideal step as much as this one was;
// the fitted Gaussian width is turned into S through edge_tables.h, which runs this very fit on drawn edges.
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "analysis/measure/measurement.h"
#include "analysis/measure/pyramid.h"

namespace focusfall {

// Which tiles of a picture are to be looked at; row by row, tile (0, 0) at the picture's corner.
struct TileMask {
  int tile_px = 64;
  int columns = 0, rows = 0;
  std::vector<std::uint8_t> wanted;

  bool any(PixelRect region) const;   // a wanted tile in `region`, level-0 px
};

struct EdgeSearchOptions {
  int finest_level = 0;          // 0..4
  int coarsest_level = 4;        // finest_level..4
  int edges_per_block = 4;       // at most, in each 32x32 block of a level
  const TileMask* tiles = nullptr;             // only blocks that touch a wanted tile
  std::vector<PixelRect>* crowded = nullptr;   // receives the blocks, in level-0 px, in which most fits fail for want of
                                               // room between narrow edges: a finer level may tell them apart
};

// Reused from call to call; holds no state that a result depends on.
struct EdgeSearchBuffers {
  std::vector<float> linear;                    // of the panel and what its filters reach, where it comes from codes
  std::vector<float> smooth_x, slope_x;         // filtered along the rows
  std::vector<float> gradient_x, gradient_y, square;   // of the panel and one more pixel on each side
};

// Appends to `edges` those whose position lies in `region` (level-0 px). The pyramid must cover the region.
// `noise_codes` is the noise of the picture in 8-bit codes (noise.h). Deterministic: the same picture and region give
// the same edges in the same order.
void find_edges(const Pyramid& pyramid, PixelRect region, double noise_codes, const EdgeSearchOptions& options,
                EdgeSearchBuffers& buffers, std::vector<EdgeSample>& edges);

// Fits edges that a coarser level found again on `level`, at the place and with the normal found there; appends those
// that pass the gates.
void refit_edges(const Pyramid& pyramid, double noise_codes, int level, std::span<const EdgeSample> coarse,
                 std::vector<EdgeSample>& edges);

}  // namespace focusfall
