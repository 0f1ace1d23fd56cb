// Mean linear light on a coarse grid, for comparing frames of one scene.
#pragma once

#include "analysis/measure/luma_picture.h"
#include "analysis/measure/measurement.h"

namespace focusfall {

// Side of the tiles for a picture this wide: the least multiple of 64 px that makes at most 48 columns. A multiple of
// 64, so that clipping counted in cells of that size falls into whole tiles.
int level_tile_px(int width_px);

// Reads every fourth pixel of every fourth row, which is plenty for a mean over a tile and costs about a millisecond
// at 24 MP. `clipped` is left empty; it is counted while the picture is decoded. No tiles where the picture is smaller
// than one.
LevelGrid level_grid(const LumaPicture& picture);

}  // namespace focusfall
