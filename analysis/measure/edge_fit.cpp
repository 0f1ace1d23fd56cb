#include "analysis/measure/edge_fit.h"

#include <algorithm>
#include <cmath>
#include <vector>

namespace focusfall {
namespace {

constexpr float kStartSigma = 1.2f;
constexpr float kLeastSigma = 0.25f, kMostSigma = 5.0f;
constexpr int kSteps = 8;
constexpr float kMostShift = 0.5f;       // px a step
constexpr float kMostLogSigma = 0.4f;    // a step
constexpr float kSoftEdge = 0.8f;        // px over which the window's weight falls to zero
constexpr float kConverged = 5e-4f;      // px and log sigma: a hundredth of what noise does

// The normal distribution function and density by linear interpolation; error below 2e-6.
class NormalTable {
 public:
  NormalTable() {
    for (int i = 0; i <= kCount; ++i) {
      const double z = (i - kCount / 2) / static_cast<double>(kPerUnit);
      cumulative_[static_cast<std::size_t>(i)] = static_cast<float>(0.5 * std::erfc(-z * M_SQRT1_2));
      density_[static_cast<std::size_t>(i)] = static_cast<float>(std::exp(-0.5 * z * z) / std::sqrt(2 * M_PI));
    }
  }
  void look_up(float z, float& cumulative, float& density) const {
    const float s = std::clamp(z, -5.99f, 5.99f) * kPerUnit + static_cast<float>(kCount / 2);
    const auto i = static_cast<std::size_t>(s);
    const float f = s - static_cast<float>(i);
    cumulative = cumulative_[i] + f * (cumulative_[i + 1] - cumulative_[i]);
    density = density_[i] + f * (density_[i + 1] - density_[i]);
  }

 private:
  static constexpr int kPerUnit = 128;
  static constexpr int kCount = 12 * kPerUnit;
  std::array<float, kCount + 1> cumulative_{};
  std::array<float, kCount + 1> density_{};
};

const NormalTable& normal_table() {
  static const NormalTable table;
  return table;
}

// Solves the symmetric 4x4 system in place by Cholesky; false if it is not positive definite.
bool solve4(float a[4][4], float b[4]) {
  for (int j = 0; j < 4; ++j) {
    for (int k = 0; k < j; ++k) a[j][j] -= a[j][k] * a[j][k];
    if (!(a[j][j] > 1e-12f)) return false;
    a[j][j] = std::sqrt(a[j][j]);
    for (int i = j + 1; i < 4; ++i) {
      for (int k = 0; k < j; ++k) a[i][j] -= a[i][k] * a[j][k];
      a[i][j] /= a[j][j];
    }
  }
  for (int i = 0; i < 4; ++i) {
    for (int k = 0; k < i; ++k) b[i] -= a[i][k] * b[k];
    b[i] /= a[i][i];
  }
  for (int i = 3; i >= 0; --i) {
    for (int k = i + 1; k < 4; ++k) b[i] -= a[k][i] * b[k];
    b[i] /= a[i][i];
  }
  return true;
}

// Normal equations of the step at the present (u0, sigma, A, B), and the residual's weighted sum of squares.
struct NormalEquations {
  float a[4][4] = {};
  float b[4] = {};
  float sum_weight = 0;
  float sum_square = 0;
};

float window_half_width(float sigma) { return std::min(2.4f * sigma + 1.0f, kProfileHalfWidth); }

NormalEquations equations(const EdgeProfile& profile, const EdgeFit& fit) {
  NormalEquations eq;
  const NormalTable& normal = normal_table();
  const float half = window_half_width(fit.sigma_px);
  const float inverse = 1.0f / fit.sigma_px;
  for (std::size_t i = 0; i < EdgeProfile::kBins; ++i) {
    if (profile.weight[i] <= 0) continue;
    const float u = profile.position[i] - fit.offset_px;
    const float inside = (half - std::abs(u)) / kSoftEdge;
    if (inside <= 0) continue;
    const float w = profile.weight[i] * std::min(inside, 1.0f);
    const float z = u * inverse;
    float cumulative, density;
    normal.look_up(z, cumulative, density);
    const float r = profile.value[i] - fit.base - fit.amplitude * cumulative;
    const float slope = -fit.amplitude * density;
    const float j[4] = {1.0f, cumulative, slope * inverse, slope * z};
    for (int p = 0; p < 4; ++p) {
      for (int q = 0; q <= p; ++q) eq.a[p][q] += w * j[p] * j[q];
      eq.b[p] += w * j[p] * r;
    }
    eq.sum_weight += w;
    eq.sum_square += w * r * r;
  }
  return eq;
}

// Base and amplitude in closed form for a given place and width.
bool fit_levels(const EdgeProfile& profile, EdgeFit& fit) {
  fit.base = 0;
  fit.amplitude = 0;
  const NormalEquations eq = equations(profile, fit);
  const float determinant = eq.a[0][0] * eq.a[1][1] - eq.a[1][0] * eq.a[1][0];
  if (!(determinant > 1e-9f)) return false;
  fit.base = (eq.b[0] * eq.a[1][1] - eq.b[1] * eq.a[1][0]) / determinant;
  fit.amplitude = (eq.b[1] * eq.a[0][0] - eq.b[0] * eq.a[1][0]) / determinant;
  return true;
}

}  // namespace

std::optional<EdgeFit> fit_profile(const EdgeProfile& profile) {
  EdgeFit fit;
  fit.sigma_px = kStartSigma;
  if (!fit_levels(profile, fit) || fit.amplitude == 0) return std::nullopt;

  for (int step = 0; step < kSteps; ++step) {
    // Scale by the amplitude so that the pivots of the solver mean the same for faint and strong edges.
    NormalEquations eq = equations(profile, fit);
    const float scale = 1.0f / std::abs(fit.amplitude);
    for (int p = 2; p < 4; ++p) {
      for (int q = 0; q < 4; ++q) eq.a[p][q] *= scale * (q >= 2 ? scale : 1.0f);
      eq.b[p] *= scale;
    }
    if (!solve4(eq.a, eq.b)) return std::nullopt;
    const float shift = std::clamp(eq.b[2] * scale, -kMostShift, kMostShift);
    const float log_sigma = std::clamp(eq.b[3] * scale, -kMostLogSigma, kMostLogSigma);
    fit.base += eq.b[0];
    fit.amplitude += eq.b[1];
    fit.offset_px += shift;
    fit.sigma_px = std::clamp(fit.sigma_px * std::exp(log_sigma), kLeastSigma, kMostSigma);
    if (std::abs(fit.offset_px) > 4.0f) return std::nullopt;
    if (std::abs(shift) < kConverged && std::abs(log_sigma) < kConverged) break;
  }
  const NormalEquations end = equations(profile, fit);
  if (!(end.sum_weight > 0) || fit.amplitude == 0) return std::nullopt;
  fit.residual = std::sqrt(end.sum_square / end.sum_weight) / std::abs(fit.amplitude);
  return fit;
}

}  // namespace focusfall
