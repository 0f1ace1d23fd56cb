#include "analysis/measure/edge_tables.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "analysis/measure/edge_fit.h"
#include "analysis/measure/pyramid.h"

namespace focusfall {
namespace {

constexpr double kFineStep = 1.0 / 32;       // level px between the samples of a drawn spread
constexpr double kReach = 13.5;              // level px: the corner of the fitted neighbourhood
constexpr double kLastDisc = 13.0;           // level px: the widest disc of the tables
constexpr std::array<double, 6> kAngles = {0.05, 0.31, 0.57, 0.83, 1.09, 1.35};   // rad, no lattice direction

// One-dimensional response of level 0's pixel box and the halvings down to `level`, in level-0 px.
struct Taps {
  std::vector<double> weights;   // centred on their middle
};

Taps prefilter_taps(int level) {
  Taps taps{{1.0}};
  for (int k = 0; k < level; ++k) {
    // Each halving convolves with [1 3 3 1]/8 at the spacing of the level above it.
    const int spacing = 1 << k;
    std::vector<double> next(taps.weights.size() + static_cast<std::size_t>(3 * spacing), 0.0);
    const std::array<double, 4> kernel = {0.125, 0.375, 0.375, 0.125};
    for (std::size_t i = 0; i < taps.weights.size(); ++i) {
      for (std::size_t j = 0; j < 4; ++j) next[i + j * static_cast<std::size_t>(spacing)] += taps.weights[i] * kernel[j];
    }
    taps.weights = std::move(next);
  }
  return taps;
}

// Density along the normal of the two-dimensional kernel taps x taps x pixel box, sampled at kFineStep level px.
std::vector<double> projected_kernel(int level, double angle_rad) {
  const Taps taps = prefilter_taps(level);
  const double step = kFineStep * (1 << level);
  const double c = std::cos(angle_rad), s = std::sin(angle_rad);
  const double half_taps = 0.5 * (static_cast<double>(taps.weights.size()) - 1);
  const double reach = (half_taps + 0.5) * (std::abs(c) + std::abs(s));
  const int half = static_cast<int>(std::ceil(reach / step)) + 1;
  std::vector<double> density(static_cast<std::size_t>(2 * half + 1), 0.0);
  const int sub = level == 0 ? 32 : level == 1 ? 12 : 4;   // points of the pixel box, each way
  for (std::size_t i = 0; i < taps.weights.size(); ++i) {
    for (std::size_t j = 0; j < taps.weights.size(); ++j) {
      const double w = taps.weights[i] * taps.weights[j] / (sub * sub);
      for (int a = 0; a < sub; ++a) {
        for (int b = 0; b < sub; ++b) {
          const double x = static_cast<double>(i) - half_taps + (a + 0.5) / sub - 0.5;
          const double y = static_cast<double>(j) - half_taps + (b + 0.5) / sub - 0.5;
          // Shared between two samples, so that the mean stays where it was.
          const double at = (x * c + y * s) / step + half;
          const auto k = static_cast<std::size_t>(at);
          density[k] += w * (1 - (at - static_cast<double>(k)));
          density[k + 1] += w * (at - static_cast<double>(k));
        }
      }
    }
  }
  return density;
}

// A spread sampled along the normal, u in level px.
class SampledSpread {
 public:
  SampledSpread(int level, const std::vector<double>& kernel, const std::function<double(double)>& edge) {
    const int half = static_cast<int>(kernel.size() / 2);
    const int n = static_cast<int>(kReach / kFineStep);
    const double step0 = kFineStep * (1 << level);
    std::vector<double> ideal(static_cast<std::size_t>(2 * (n + half) + 1));
    for (int i = -(n + half); i <= n + half; ++i) ideal[static_cast<std::size_t>(i + n + half)] = edge(i * step0);
    values_.resize(static_cast<std::size_t>(2 * n + 1));
    for (std::size_t i = 0; i < values_.size(); ++i) {
      double sum = 0;
      for (std::size_t k = 0; k < kernel.size(); ++k) sum += kernel[k] * ideal[i + k];
      values_[i] = static_cast<float>(sum);
    }
    first_ = -n * kFineStep;
  }
  float at(double u) const {
    const double s = std::clamp((u - first_) / kFineStep, 0.0, static_cast<double>(values_.size()) - 1.001);
    const auto i = static_cast<std::size_t>(s);
    const float f = static_cast<float>(s - static_cast<double>(i));
    return values_[i] + f * (values_[i + 1] - values_[i]);
  }

 private:
  std::vector<float> values_;
  double first_ = 0;
};

// Draws the pixels of a level around an edge through the patch's middle and fits them; mean width over sub-pixel
// phases, since half-pixel bins fill unevenly.
std::optional<float> fitted_width(const SampledSpread& spread, double angle_rad) {
  constexpr int kSide = 2 * kProfileReach + 3;
  const double nx = std::cos(angle_rad), ny = std::sin(angle_rad);
  double sum = 0;
  int count = 0;
  for (const double phase : {-0.37, -0.12, 0.13, 0.38}) {
    std::array<float, kSide * kSide> patch{};
    const double cx = kProfileReach + 1 + phase, cy = kProfileReach + 1 - 0.7 * phase;
    for (int y = 0; y < kSide; ++y) {
      for (int x = 0; x < kSide; ++x) {
        patch[static_cast<std::size_t>(y * kSide + x)] = spread.at((x - cx) * nx + (y - cy) * ny);
      }
    }
    EdgeProfile profile;
    gather_profile([&](int x, int y) { return patch[static_cast<std::size_t>(y * kSide + x)]; },
                   static_cast<float>(cx), static_cast<float>(cy), static_cast<float>(nx), static_cast<float>(ny),
                   profile);
    if (const auto fit = fit_profile(profile)) {
      sum += fit->sigma_px;
      ++count;
    }
  }
  if (count == 0) return std::nullopt;
  return static_cast<float>(sum / count);
}

// Fitted variance against squared disc, both of level px.
struct WidthTable {
  std::vector<double> variance;
  std::vector<double> squared_disc;
};

WidthTable make_table(int level) {
  WidthTable table;
  std::array<std::vector<double>, kAngles.size()> kernels;
  for (std::size_t a = 0; a < kAngles.size(); ++a) kernels[a] = projected_kernel(level, kAngles[a]);
  const double scale = 1 << level;
  for (double c = 0; c <= kLastDisc; c += c < 3 ? 0.5 : 1.0) {
    double sum = 0;
    for (std::size_t a = 0; a < kAngles.size(); ++a) {
      const SampledSpread spread(level, kernels[a], [&](double u) { return disc_edge_spread(c * scale, u); });
      const auto width = fitted_width(spread, kAngles[a]);
      sum += width ? *width * *width : 0;
    }
    const double variance = sum / kAngles.size();
    // The fit's ceiling flattens the end of the curve; only the rising part can be inverted.
    if (!table.variance.empty() && variance < table.variance.back() + 0.004) break;
    table.variance.push_back(variance);
    table.squared_disc.push_back(c * c);
  }
  return table;
}

const WidthTable& table_of(int level) {
  static const std::array<WidthTable, Pyramid::kLevels> tables = [] {
    std::array<WidthTable, Pyramid::kLevels> made;
    for (int k = 0; k < Pyramid::kLevels; ++k) made[static_cast<std::size_t>(k)] = make_table(k);
    return made;
  }();
  return tables[static_cast<std::size_t>(level)];
}

}  // namespace

double disc_edge_spread(double disc_px, double u_px) {
  if (disc_px <= 0) return u_px < 0 ? 0.0 : u_px > 0 ? 1.0 : 0.5;
  const double t = 2 * u_px / disc_px;
  if (t <= -1) return 0;
  if (t >= 1) return 1;
  return 0.5 + (std::asin(t) + t * std::sqrt(1 - t * t)) / M_PI;
}

float squared_disc_of_width(int level, float sigma_level_px) {
  const WidthTable& table = table_of(level);
  const double variance = static_cast<double>(sigma_level_px) * sigma_level_px;
  const auto above = std::upper_bound(table.variance.begin() + 1, table.variance.end() - 1, variance);
  const auto i = static_cast<std::size_t>(above - table.variance.begin());
  const double f = (variance - table.variance[i - 1]) / (table.variance[i] - table.variance[i - 1]);
  const double squared = table.squared_disc[i - 1] + f * (table.squared_disc[i] - table.squared_disc[i - 1]);
  return static_cast<float>(squared * (1 << (2 * level)));
}

std::optional<float> width_of_drawn_edge(int level, double angle_rad, const std::function<double(double)>& edge) {
  return fitted_width(SampledSpread(level, projected_kernel(level, angle_rad), edge), angle_rad);
}

}  // namespace focusfall
