// Lines of equal blur through the tile map, for drawing.
#pragma once

#include <span>
#include <vector>

#include "analysis/measure/measurement.h"
#include "src/pipeline/resolve.h"

namespace focusfall {

// One line of equal blur, in fractions of the unrotated frame.
struct Contour {
  double blur_disc_px = 0;
  std::vector<FramePoint> points;   // a closed line repeats its first point at the end
};

struct ContourRequest {
  DecodedSize frame;                // the frame that the tiles cover, px
  double baseline_px2 = 0;          // taken off S before the square root
  std::span<const double> levels_px;
};

// Lone tiles are noisy: each takes the median of itself and its measured neighbours, and a tile without evidence is
// filled where at least five of its eight neighbours have some. No line passes where nothing was measured. Lines are
// interpolated between tile centres in the logarithm of the disc, since blur grows by factors across a frame.
std::vector<Contour> blur_contours(const TileMap& tiles, const ContourRequest& request);

}  // namespace focusfall
