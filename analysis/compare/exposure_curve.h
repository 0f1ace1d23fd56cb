// Levels of registered frames, relative to one another, and the tone curve of the picture as far as the frames tell it.
#pragma once

#include <optional>
#include <vector>

#include "analysis/compare/exposure_register.h"

namespace focusfall {

// A piecewise linear map from the level of the picture as decoded (log2 of linear light after sRGB or the profile) to
// exposure in stops. With all slopes 1 the decoded level is the exposure.
class ToneShape {
 public:
  ToneShape();                                       // slopes 1
  explicit ToneShape(std::vector<double> slopes);    // by bin, > 0

  double exposure_ev(double level_ev) const;         // 0 at level 0 (clipping)
  double slope(double level_ev) const;
  const std::vector<double>& slopes() const { return slopes_; }
  bool is_identity() const { return identity_; }

  // Lengths of the bins that lie between clipping and a level, by bin: exposure_ev is minus their product with slopes.
  static std::vector<double> lengths(double level_ev);
  static std::size_t bin_count();

 private:
  std::vector<double> slopes_;
  bool identity_ = true;
};

// Relative exposures by tiles seen in common: exposure_ev(level of tile p in frame i) = tile p + frame i.
struct RelativeLevels {
  struct Frame {
    double level_ev = 0;     // against the mean of all frames
    double sigma_ev = 0;     // standard error, from the scatter over the tiles
    int tiles = 0;
  };
  std::vector<std::optional<Frame>> frames;   // absent: too few tiles in common with the others
  ToneShape shape;
  double residual_ev = 0;    // robust standard deviation of a tile
};

// `tiles[i][p]` is tile p in frame i. First with the curve as decoded; where the differences between two frames then
// depend on the brightness of the tile, the curve is bent: its shape is found from these differences alone, with mean
// slope 1, and no recorded exposure is used for it, so that no fault of a diaphragm or a shutter can hide in it. The
// contrast that such a curve has as a whole stays open; see exposure_audit.h.
//
// `quantiles[i][q]`, which may be empty, is the level above which a share q of frame i lies (quantile_levels below): the
// same surfaces in every frame of a static scene, single pixels of them, so that they reach up to clipping where a whole
// tile no longer does. They serve the curve alone, not the levels of the frames.
using TileLevels = std::vector<std::vector<std::optional<TileLevel>>>;
RelativeLevels relative_levels(const TileLevels& tiles, const TileLevels& quantiles = {});

// Levels of some fixed shares of a frame's pixels, by their largest channel; absent where clipped or below the table.
std::vector<std::optional<TileLevel>> quantile_levels(const Highlights& highlights);

}  // namespace focusfall
