// From the edges of a region to one blur with its interval.
#pragma once

#include <optional>
#include <span>

#include "analysis/measure/measurement.h"

namespace focusfall {

// Median width, px of its level, above which a level is too fine for the blur: the next coarser one is asked. The fit's
// window ends at 8 px, which holds 2.4 standard deviations of an edge up to 2.9 px.
inline constexpr double kLevelCeilingPx = 2.5;

// Blur of a region from edges alone. sigma_px is the standard error of c = sqrt(max(S, 0)).
struct EdgeBlur {
  double squared_disc_px2 = 0;
  double sigma_px = 0;
  int level = 0;                 // the pyramid level that decided
  int edges = 0;                 // that counted
  bool lower_bound = false;      // every level was saturated: at least this much
};

struct RegionBlurOptions {
  int least_edges = 6;           // below: no evidence (measured: fewer scatter beyond their own interval)
};

// Takes the finest level with enough unsaturated edges and returns the weighted median of S there; nullopt without
// evidence. `edges` are all edges of the region on all levels.
std::optional<EdgeBlur> edge_blur(std::span<const EdgeSample> edges, const RegionBlurOptions& options = {});

}  // namespace focusfall
