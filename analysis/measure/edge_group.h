// One blur value for a group of edges: the weighted median of S on the finest pyramid level that can tell it.
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "analysis/measure/measurement.h"

namespace focusfall {

struct EdgeGroup {
  double x_px = 0, y_px = 0;        // weighted mean position
  double squared_disc_px2 = 0;      // weighted median of S
  double sigma_px2 = 0;             // standard error of that median, from the spread of the edges alone
  double effective_edges = 0;       // (sum w)^2 / sum w^2
  int level = 0;                    // pyramid level taken
  std::vector<int> members;         // indices of the edges on that level
};

struct EdgeGroupOptions {
  int least_edges = 6;              // below that a median and its spread mean nothing (measured on tiles)
  double least_effective_edges = 3.6;
  double widest_sigma_level_px = 2.5;  // most of the group must be narrower; the window cuts wider ones (measured)
};

// `indices` choose from `edges`. std::nullopt below the least number of edges on every level.
std::optional<EdgeGroup> edge_group(std::span<const EdgeSample> edges, std::span<const int> indices,
                                    const EdgeGroupOptions& options = {});

// Weight of an edge in its group: contrast, limited so that one bold edge does not speak for the region, and quality of
// the fit. `amplitude_limit` is the 90 % quantile of the group's amplitudes.
double edge_weight(const EdgeSample& edge, double amplitude_limit);

// Weighted median and its standard error from the weighted quartiles; values and weights of one length, not empty.
struct WeightedMedian {
  double value = 0;
  double sigma = 0;
  double effective_count = 0;
};
WeightedMedian weighted_median(std::span<const double> values, std::span<const double> weights);

}  // namespace focusfall
