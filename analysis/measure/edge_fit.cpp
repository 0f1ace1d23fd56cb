#include "analysis/measure/edge_fit.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstdint>

#include "analysis/measure/vector_kernel.h"

namespace focusfall {
namespace {

constexpr float kLeastSigma = 0.25f, kMostSigma = 5.0f;
constexpr int kSteps = 8;
constexpr float kMostShift = 0.5f;       // px a step
constexpr float kMostLogSigma = 0.4f;    // a step
constexpr int kHopelessAfter = 3;         // steps after which a residual far beyond the widest gate ends the fit
constexpr float kHopelessResidual = 0.25f;   // rms / amplitude; twice the widest gate (.12)
constexpr float kSoftEdge = 0.8f;        // px over which the window's weight falls to zero
constexpr float kConverged = 4e-3f;      // px and log sigma: the step after it is the square of that, far below noise

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

float square(float v) { return v * v; }
float window_half_width(float sigma) { return std::min(2.4f * sigma + 1.0f, kProfileHalfWidth); }

// What the bins of a profile add up to: the moments of (1, Phi, phi, z phi) and of the residual r with them.
struct BinSums {
  float w = 0, wc = 0, wcc = 0, wd = 0, wcd = 0, wdd = 0, wz = 0, wcz = 0, wdz = 0, wzz = 0;
  float wr = 0, wrc = 0, wrd = 0, wrz = 0, wrr = 0;
};

// One plain loop over the bins, so that the compiler makes vectors of it; a bin without weight adds nothing.
// Phi after Abramowitz & Stegun 26.2.17 (1964), |error| < 7.5e-8; exp by splitting off the power of two and a
// polynomial of degree 6 (Taylor, |error| < 1e-7 on half an octave).
FOCUSFALL_VECTOR BinSums bin_sums(const EdgeProfile& profile, const EdgeFit& fit) {
  const float half = window_half_width(fit.sigma_px);
  const float inverse = 1.0f / fit.sigma_px;
  const float offset = fit.offset_px, base = fit.base, amplitude = fit.amplitude;
  const float* __restrict weight = profile.weight.data();
  const float* __restrict position = profile.position.data();
  const float* __restrict value = profile.value.data();
  // Only the bins inside the window, in whole vectors.
  constexpr int kVector = 8;
  const float bin0 = 2 * (offset - half + kProfileHalfWidth) - 1, bin1 = 2 * (offset + half + kProfileHalfWidth) + 1;
  const int first = std::clamp(static_cast<int>(bin0), 0, EdgeProfile::kBins - kVector) / kVector * kVector;
  const int last = (std::clamp(static_cast<int>(bin1), kVector, EdgeProfile::kBins) + kVector - 1) / kVector * kVector;
  BinSums s;
  for (int i = first; i < last; ++i) {
    const float u = position[i] - offset;
    const float distance = u < 0 ? -u : u;
    const float inside = (half - distance) * (1.0f / kSoftEdge);
    const float low = inside < 0.0f ? 0.0f : inside;
    const float w = weight[i] * (low > 1.0f ? 1.0f : low);
    const float z = u * inverse;
    const float az = distance * inverse;

    // exp(-z^2 / 2) = 2^-k e^r with |r| <= ln 2 / 2. Far out the density is nothing in single precision.
    const float near = az > 12.0f ? 12.0f : az;
    const float t = 0.5f * near * near;
    const int k = static_cast<int>(t * 1.44269504f + 0.5f);
    const float r = static_cast<float>(k) * 0.69314718f - t;
    const float e =
        1 + r * (1 + r * (0.5f + r * (0.16666667f + r * (0.041666667f + r * (0.0083333333f + r * 0.0013888889f)))));
    const float density = 0.39894228f * e * std::bit_cast<float>((127 - k) << 23);
    const float q = 1.0f / (1.0f + 0.2316419f * near);
    const float tail =
        density * q * (0.31938153f + q * (-0.356563782f + q * (1.781477937f + q * (-1.821255978f + q * 1.330274429f))));
    const float c = z < 0 ? tail : 1.0f - tail;

    const float zd = z * density;
    const float residual = value[i] - base - amplitude * c;
    s.w += w;
    s.wc += w * c;
    s.wcc += w * c * c;
    s.wd += w * density;
    s.wcd += w * c * density;
    s.wdd += w * density * density;
    s.wz += w * zd;
    s.wcz += w * c * zd;
    s.wdz += w * density * zd;
    s.wzz += w * zd * zd;
    s.wr += w * residual;
    s.wrc += w * residual * c;
    s.wrd += w * residual * density;
    s.wrz += w * residual * zd;
    s.wrr += w * residual * residual;
  }
  return s;
}

// Derivatives of the step: 1 and Phi for base and amplitude, -A phi / sigma for the place, -A z phi for log sigma.
NormalEquations equations(const EdgeProfile& profile, const EdgeFit& fit) {
  const BinSums s = bin_sums(profile, fit);
  const float place = -fit.amplitude / fit.sigma_px, width = -fit.amplitude;
  NormalEquations eq;
  eq.a[0][0] = s.w;
  eq.a[1][0] = s.wc;
  eq.a[1][1] = s.wcc;
  eq.a[2][0] = place * s.wd;
  eq.a[2][1] = place * s.wcd;
  eq.a[2][2] = place * place * s.wdd;
  eq.a[3][0] = width * s.wz;
  eq.a[3][1] = width * s.wcz;
  eq.a[3][2] = width * place * s.wdz;
  eq.a[3][3] = width * width * s.wzz;
  eq.b[0] = s.wr;
  eq.b[1] = s.wrc;
  eq.b[2] = place * s.wrd;
  eq.b[3] = width * s.wrz;
  eq.sum_weight = s.w;
  eq.sum_square = s.wrr;
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

// Distances across the edge and the weights; outside the strip, by rounding, the weight is none. The weight falls along
// the edge, where a curved edge leaves its tangent.
FOCUSFALL_VECTOR void strip_weights(const StripPixels& pixels, float nx, float ny, float* __restrict across,
                                    float* __restrict weight, std::int32_t* __restrict bin) {
  const float* __restrict dx = pixels.dx.data();
  const float* __restrict dy = pixels.dy.data();
  for (int i = 0; i < pixels.count; ++i) {
    const float u = dx[i] * nx + dy[i] * ny;
    const float t = dy[i] * nx - dx[i] * ny;
    const float q = 0.12f * t * t;
    const float w = 1.0f / (1.0f + q * (1.0f + q));
    const bool inside = (t * t < kProfileHalfLength2) & (u > -kProfileHalfWidth) & (u < kProfileHalfWidth);
    across[i] = u;
    weight[i] = inside ? w : 0.0f;
    const float place = (u + kProfileHalfWidth) * 2.0f;
    bin[i] = inside ? static_cast<std::int32_t>(place) : 0;
  }
}

// Darkest and brightest value within |u| < 3. Linear values are not negative, so that their bits stand in the order of the
// values, and the minimum of whole numbers is one that compilers make vectors of.
FOCUSFALL_VECTOR void near_range(const StripPixels& pixels, const float* __restrict across,
                                 const float* __restrict weight, EdgeProfile& profile) {
  constexpr float kNear = 3.0f;
  constexpr std::int32_t kHuge = std::bit_cast<std::int32_t>(1e9f);
  const float* __restrict value = pixels.value.data();
  std::int32_t lowest = kHuge, highest = 0;
  for (int i = 0; i < pixels.count; ++i) {
    const bool near = (weight[i] > 0) & (across[i] > -kNear) & (across[i] < kNear);
    const auto bits = std::bit_cast<std::int32_t>(value[i]);
    const std::int32_t low = near ? bits : kHuge, high = near ? bits : 0;
    lowest = low < lowest ? low : lowest;
    highest = high > highest ? high : highest;
  }
  profile.lowest = std::bit_cast<float>(lowest);
  profile.highest = std::bit_cast<float>(highest);
}

}  // namespace

void bin_pixels(const StripPixels& pixels, float nx, float ny, EdgeProfile& profile) {
  std::array<float, StripPixels::kMost> across, weight;
  std::array<std::int32_t, StripPixels::kMost> bin;
  strip_weights(pixels, nx, ny, across.data(), weight.data(), bin.data());
  near_range(pixels, across.data(), weight.data(), profile);

  // Weight, weighted place and weighted value of a bin side by side, added in one go.
  struct Sums {
    float weight = 0, position = 0, value = 0, unused = 0;
  };
  std::array<Sums, EdgeProfile::kBins> sums{};
  for (int i = 0; i < pixels.count; ++i) {
    const auto k = static_cast<std::size_t>(i);
    Sums& s = sums[static_cast<std::size_t>(bin[k])];
    s.weight += weight[k];
    s.position += weight[k] * across[k];
    s.value += weight[k] * pixels.value[k];
  }
  for (std::size_t i = 0; i < EdgeProfile::kBins; ++i) {
    const float inverse = sums[i].weight > 0 ? 1.0f / sums[i].weight : 0.0f;
    profile.weight[i] = sums[i].weight;
    profile.position[i] = sums[i].position * inverse;
    profile.value[i] = sums[i].value * inverse;
  }
}

std::optional<EdgeFit> fit_profile(const EdgeProfile& profile, float start_sigma_px) {
  EdgeFit fit;
  fit.sigma_px = std::clamp(start_sigma_px, kLeastSigma, kMostSigma);
  if (!fit_levels(profile, fit) || fit.amplitude == 0) return std::nullopt;

  for (int step = 0; step < kSteps; ++step) {
    // Scale by the amplitude so that the pivots of the solver mean the same for faint and strong edges.
    NormalEquations eq = equations(profile, fit);
    const float sum_square = eq.sum_square, sum_weight = eq.sum_weight;
    const float scale = 1.0f / std::abs(fit.amplitude);
    for (int p = 2; p < 4; ++p) {
      for (int q = 0; q < 4; ++q) eq.a[p][q] *= scale * (q >= 2 ? scale : 1.0f);
      eq.b[p] *= scale;
    }
    if (!solve4(eq.a, eq.b)) return std::nullopt;
    const float shift = std::clamp(eq.b[2] * scale, -kMostShift, kMostShift);
    const float log_sigma = std::clamp(eq.b[3] * scale, -kMostLogSigma, kMostLogSigma);
    const bool at_end = fit.sigma_px >= kMostSigma && log_sigma > 0;   // wider than the window can tell
    fit.base += eq.b[0];
    fit.amplitude += eq.b[1];
    fit.offset_px += shift;
    fit.sigma_px = std::clamp(fit.sigma_px * std::exp(log_sigma), kLeastSigma, kMostSigma);
    if (std::abs(fit.offset_px) > 4.0f) return std::nullopt;
    if (std::abs(shift) < kConverged && (at_end || std::abs(log_sigma) < kConverged)) break;
    if (step == kHopelessAfter && sum_square > square(kHopelessResidual * fit.amplitude) * sum_weight) return std::nullopt;
  }
  const NormalEquations end = equations(profile, fit);
  if (!(end.sum_weight > 0) || fit.amplitude == 0) return std::nullopt;
  fit.residual = std::sqrt(end.sum_square / end.sum_weight) / std::abs(fit.amplitude);
  return fit;
}

}  // namespace focusfall
