// Edges of a whole frame for the tile map, the background and the plane, at a cost that a day's shoot can bear.
//
// Coarse to fine: level 2 is searched everywhere. A tile that turns out sharp has its edges fitted again one level finer,
// and again down to level 0; a tile in which level 2 finds too little is searched on level 1, and where fine detail crowds
// that, on level 0; levels 3 and 4 are searched in tiles too blurred for level 2. All edges of a tile go one way, so that
// the scatter of single edges selects nothing.
#pragma once

#include <opencv2/core.hpp>
#include <vector>

#include "analysis/measure/edges.h"

namespace focusfall {

struct FrameEdges {
  int tile_px = 64;
  int rows = 0, columns = 0;
  std::vector<EdgeSample> edges;                   // all
  std::vector<std::vector<EdgeSample>> by_tile;    // the same, row by row; at least rows * columns entries
};

// `pyramid` must cover the whole picture down to level 4. Fills `out`, reusing its memory. Deterministic.
void search_frame(const Pyramid& pyramid, double noise_codes, int tile_px, EdgeSearchBuffers& buffers, FrameEdges& out);

}  // namespace focusfall
