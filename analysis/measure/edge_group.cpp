#include "analysis/measure/edge_group.h"

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <numeric>

namespace focusfall {
namespace {

constexpr int kLevels = 5;                 // pyramid levels 0..4 of the edge estimator
constexpr double kResidualScale = 0.03;    // relative residual that halves the weight: measured, rendered tiles
// What widens an edge on every level beside the disc: pixel box and pyramid prefilter, level px^2 (.08 to .58).
constexpr double kSharpVarianceLevelPx2 = 0.33;
// Edges along one contour repeat each other: about three of them are one independent value. Measured on tiles.
constexpr double kEdgesPerIndependentValue = 3;

// Width of the fitted edge on its own level, from S: variance of a disc is c^2/16.
double sigma_level_px(const EdgeSample& edge) {
  const double scale = std::ldexp(1.0, 2 * edge.level);
  return std::sqrt(std::max(double(edge.squared_disc_px2), 0.0) / (16 * scale) + kSharpVarianceLevelPx2);
}

bool too_wide(const EdgeSample& edge, double widest_sigma_level_px) {
  return edge.saturated || sigma_level_px(edge) > widest_sigma_level_px;
}

double amplitude_limit_of(std::span<const EdgeSample> edges, const std::vector<int>& members) {
  std::vector<float> amplitudes;
  amplitudes.reserve(members.size());
  for (int i : members) amplitudes.push_back(std::abs(edges[size_t(i)].amplitude));
  const auto rank = amplitudes.begin() + std::ptrdiff_t(0.9 * double(amplitudes.size() - 1));
  std::nth_element(amplitudes.begin(), rank, amplitudes.end());
  return *rank;
}

// The group's value on one level, or nothing where that level does not qualify.
std::optional<EdgeGroup> on_level(std::span<const EdgeSample> edges, std::vector<int> members, int level,
                                  const EdgeGroupOptions& options) {
  if (int(members.size()) < options.least_edges) return std::nullopt;
  const double limit = amplitude_limit_of(edges, members);

  double sum = 0, wide = 0, sum_x = 0, sum_y = 0;
  std::vector<double> values, weights;
  for (int i : members) {
    const EdgeSample& edge = edges[size_t(i)];
    const double weight = edge_weight(edge, limit);
    values.push_back(edge.squared_disc_px2);
    weights.push_back(weight);
    sum += weight;
    sum_x += weight * edge.x;
    sum_y += weight * edge.y;
    if (too_wide(edge, options.widest_sigma_level_px)) wide += weight;
  }
  if (!(sum > 0)) return std::nullopt;

  // Counting the edges that are too wide for this level: without them 20 px would read 17 here.
  if (wide > 0.5 * sum) return std::nullopt;
  const WeightedMedian median = weighted_median(values, weights);
  if (median.effective_count < options.least_effective_edges) return std::nullopt;
  return EdgeGroup{sum_x / sum,  sum_y / sum, median.value,      median.sigma, median.effective_count,
                   level,        std::move(members)};
}

}  // namespace

double edge_weight(const EdgeSample& edge, double amplitude_limit) {
  const double amplitude = std::min(double(std::abs(edge.amplitude)), amplitude_limit);
  const double relative = edge.residual / kResidualScale;
  return amplitude * amplitude / (1 + relative * relative);
}

WeightedMedian weighted_median(std::span<const double> values, std::span<const double> weights) {
  std::vector<size_t> order(values.size());
  std::iota(order.begin(), order.end(), size_t{0});
  std::sort(order.begin(), order.end(),
            [&](size_t a, size_t b) { return values[a] != values[b] ? values[a] < values[b] : a < b; });
  double sum = 0, sum2 = 0;
  for (double w : weights) sum += w, sum2 += w * w;

  // Quantiles between the centres of the weights, so that equal weights give the ordinary median.
  const auto quantile = [&](double fraction) {
    double below = 0, previous = 0;
    for (size_t k = 0; k < order.size(); ++k) {
      const double centre = below + 0.5 * weights[order[k]];
      if (centre >= fraction * sum) {
        if (k == 0 || centre <= previous) return values[order[k]];
        const double t = (fraction * sum - previous) / (centre - previous);
        return values[order[k - 1]] + t * (values[order[k]] - values[order[k - 1]]);
      }
      previous = centre;
      below += weights[order[k]];
    }
    return values[order.back()];
  };
  WeightedMedian result;
  result.value = quantile(0.5);
  result.effective_count = sum2 > 0 ? sum * sum / sum2 : 0;
  // 1.25 sigma / sqrt(n) is the standard error of the median of a normal sample, sigma = interquartile range / 1.35.
  result.sigma = 1.25 * (quantile(0.75) - quantile(0.25)) / 1.35 /
                 std::sqrt(std::max(result.effective_count / kEdgesPerIndependentValue, 1.0));
  return result;
}

std::optional<EdgeGroup> edge_group(std::span<const EdgeSample> edges, std::span<const int> indices,
                                    const EdgeGroupOptions& options) {
  std::vector<int> levels[kLevels];
  for (int i : indices) {
    const int level = edges[size_t(i)].level;
    if (level < kLevels) levels[level].push_back(i);
  }
  for (int level = 0; level < kLevels; ++level)
    if (auto group = on_level(edges, std::move(levels[level]), level, options)) return group;
  return std::nullopt;
}

}  // namespace focusfall
