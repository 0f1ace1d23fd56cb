// Frames of one scene laid on one another by their level grids.
#pragma once

#include <optional>
#include <vector>

#include "analysis/measure/measurement.h"

namespace focusfall {

// Displacement of a frame's content against the reference, in tiles, and how alike the two are.
struct GridMatch {
  double shift_x = 0, shift_y = 0;
  double correlation = 0;      // of the logarithmic levels, -1..1; 1 for two frames without structure
  int tiles = 0;               // compared
};

// Searched within two tiles either way; std::nullopt where too few tiles are neither clipped nor black in both, or the
// grids differ in size.
std::optional<GridMatch> match_grids(const LevelGrid& reference, const LevelGrid& frame);

// Least correlation at which two frames count as the same scene. Judgement: a changed third of the picture at its
// usual contrast lowers it to about that.
inline constexpr double kSameSceneCorrelation = 0.85;

// One tile of a frame on the grid of the reference.
struct TileLevel {
  double level_ev = 0;         // log2 of the linear level
  double sigma_ev = 0;         // from the coding and the contrast in the tile
};
// A value for each tile of the reference; absent where the frame shows it clipped, too dark, or not at all.
std::vector<std::optional<TileLevel>> registered_levels(const LevelGrid& frame, const GridMatch& match);

}  // namespace focusfall
