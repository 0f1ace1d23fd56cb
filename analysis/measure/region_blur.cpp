#include "analysis/measure/region_blur.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "analysis/measure/pyramid.h"

namespace focusfall {
namespace {

constexpr double kLeastEffective = 3.6;      // measured: below, the median scatters beyond its interval
constexpr double kResidualScale = 0.015;     // rms / amplitude at which an edge counts half
constexpr double kEdgesPerSample = 3;      // neighbouring edges share pixels: three count as one
constexpr double kQuartilesToSigma = 1.35;   // of a normal distribution
constexpr double kWiden = 1.25;              // measured: tails heavier than normal
constexpr double kRelative = 0.06;           // of c: curvature of edges, tone curve
constexpr double kAbsolute_px = 0.2;

struct Weighted {
  double value;
  double weight;
};

// Value below which `share` of the weight lies; `items` sorted by value.
double weighted_quantile(const std::vector<Weighted>& items, double total, double share) {
  double sum = 0;
  for (std::size_t i = 0; i < items.size(); ++i) {
    const double next = sum + items[i].weight;
    if (next >= share * total) {
      if (i == 0) return items[0].value;
      // Between the middles of two neighbours' weights.
      const double here = sum + 0.5 * items[i].weight;
      const double before = sum - 0.5 * items[i - 1].weight;
      const double f = std::clamp((share * total - before) / (here - before), 0.0, 1.0);
      return items[i - 1].value + f * (items[i].value - items[i - 1].value);
    }
    sum = next;
  }
  return items.back().value;
}

double total_weight(const std::vector<Weighted>& items) {
  double sum = 0;
  for (const Weighted& item : items) sum += item.weight;
  return sum;
}

// Amplitude that nine tenths of the edges stay below: stronger ones count no more than that.
double amplitude_cap(const std::vector<const EdgeSample*>& edges) {
  std::vector<float> amplitudes;
  for (const EdgeSample* edge : edges) amplitudes.push_back(edge->amplitude);
  auto at = amplitudes.begin() + static_cast<std::ptrdiff_t>(0.9 * static_cast<double>(amplitudes.size() - 1) + 0.5);
  std::nth_element(amplitudes.begin(), at, amplitudes.end());
  return *at;
}

double edge_weight(const EdgeSample& edge, double cap) {
  const double amplitude = std::min<double>(edge.amplitude, cap);
  const double q = edge.residual / kResidualScale;
  return amplitude * amplitude / (1 + q * q);
}

void sort_by_value(std::vector<Weighted>& items) {
  std::sort(items.begin(), items.end(), [](const Weighted& a, const Weighted& b) { return a.value < b.value; });
}

// The blur of one level's edges; nullopt where the level has too few or is too fine for the blur.
std::optional<EdgeBlur> level_blur(const std::vector<const EdgeSample*>& edges, const RegionBlurOptions& options,
                                   bool& saturated) {
  saturated = false;
  if (static_cast<int>(edges.size()) < options.least_edges) return std::nullopt;
  const double cap = amplitude_cap(edges);
  std::vector<Weighted> widths, discs;
  double square = 0;
  for (const EdgeSample* edge : edges) {
    const double w = edge_weight(*edge, cap);
    widths.push_back({edge->width_level_px, w});
    discs.push_back({edge->squared_disc_px2, w});
    square += w * w;
  }
  sort_by_value(widths);
  sort_by_value(discs);
  const double total = total_weight(discs);
  const double effective = total * total / square;
  if (effective < kLeastEffective) return std::nullopt;
  saturated = weighted_quantile(widths, total, 0.5) >= kLevelCeilingPx;

  EdgeBlur blur;
  blur.squared_disc_px2 = weighted_quantile(discs, total, 0.5);
  const double spread =
      (weighted_quantile(discs, total, 0.75) - weighted_quantile(discs, total, 0.25)) / kQuartilesToSigma;
  const double se_s = kWiden * spread / std::sqrt(std::max(effective / kEdgesPerSample, 1.0));
  const double c = blur_disc_px(blur.squared_disc_px2);
  const double se_c = se_s / (2 * std::max(c, 1.0));   // dS = 2 c dc; below 1 px c itself has no meaning
  blur.sigma_px = std::sqrt(se_c * se_c + std::pow(kRelative * c, 2) + std::pow(kAbsolute_px, 2));
  blur.level = edges.front()->level;
  blur.edges = static_cast<int>(edges.size());
  return blur;
}

}  // namespace

std::optional<EdgeBlur> edge_blur(std::span<const EdgeSample> edges, const RegionBlurOptions& options) {
  std::array<std::vector<const EdgeSample*>, Pyramid::kLevels> by_level;
  for (const EdgeSample& edge : edges) by_level[edge.level].push_back(&edge);
  std::optional<EdgeBlur> coarsest_saturated;
  for (const auto& level : by_level) {
    bool saturated = false;
    auto blur = level_blur(level, options, saturated);
    if (blur && !saturated) return blur;
    if (blur) coarsest_saturated = blur;
  }
  if (coarsest_saturated) coarsest_saturated->lower_bound = true;
  return coarsest_saturated;
}

}  // namespace focusfall
