// Fits one edge: the pixels around it gathered into an edge-spread profile, and a Gaussian step fitted to that.
#pragma once

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <optional>

namespace focusfall {

// Half widths of the neighbourhood that a fit looks at, level px.
inline constexpr float kProfileHalfWidth = 8.0f;      // across the edge
inline constexpr float kProfileHalfLength2 = 14.0f;   // squared, along the edge
inline constexpr int kProfileReach = 9;               // whole pixels needed on every side

// Mean value and mean position in bins half a pixel wide across the edge.
struct EdgeProfile {
  static constexpr int kBins = 32;
  std::array<float, kBins> weight{};
  std::array<float, kBins> position{};   // mean u, px
  std::array<float, kBins> value{};      // mean linear value
  float lowest = 0, highest = 0;         // within |u| < 3
};

// Gathers the pixels around (x, y) along the unit normal (nx, ny). Pixels are never interpolated: that would add
// blur of its own (+27 % variance, measured). `pixel(x, y)` returns the linear value at whole coordinates; the
// caller guarantees kProfileReach pixels on every side.
template <class Pixel>
void gather_profile(const Pixel& pixel, float x, float y, float nx, float ny, EdgeProfile& profile);

struct EdgeFit {
  float base = 0;            // linear value of the dark side
  float amplitude = 0;       // step, linear; may come out negative where the normal was wrong
  float offset_px = 0;       // of the edge from (x, y) along the normal
  float sigma_px = 0;        // of the Gaussian edge spread
  float residual = 0;        // rms / |amplitude|
};

// B + A * Phi((u - u0) / sigma) by Gauss-Newton on a window that follows the width; nullopt if the normal equations
// break down (a flat or lopsided profile).
// The steps begin at `start_sigma_px`; where they end does not depend on it.
inline constexpr float kStartSigma = 1.2f;
std::optional<EdgeFit> fit_profile(const EdgeProfile& profile, float start_sigma_px = kStartSigma);

// ---- implementation of the template ----

// The pixels of a strip as they are met, places relative to its middle.
struct StripPixels {
  static constexpr int kMost = (2 * kProfileReach + 1) * (2 * kProfileReach + 1);
  std::array<float, kMost> dx, dy, value;
  int count = 0;
};

// Bins the pixels that lie in |u| < half width, |t| < half length of the strip along (nx, ny).
void bin_pixels(const StripPixels& pixels, float nx, float ny, EdgeProfile& profile);

template <class Pixel>
void gather_profile(const Pixel& pixel, float x, float y, float nx, float ny, EdgeProfile& profile) {
  const int cx = static_cast<int>(x + 0.5f), cy = static_cast<int>(y + 0.5f);
  // Pixels of a row in the strip: the overlap of two intervals of dx. A normal along a lattice direction makes one of
  // them endless.
  constexpr float kLeast = 1e-4f;
  const float across = 1.0f / std::max(std::abs(nx), kLeast), along = 1.0f / std::max(std::abs(ny), kLeast);
  const float half_u = kProfileHalfWidth * across, half_t = std::sqrt(kProfileHalfLength2) * along;
  const float middle_u = (nx < 0 ? ny : -ny) * across, middle_t = (ny < 0 ? -nx : nx) * along;   // per dy
  StripPixels strip;
  for (int py = cy - kProfileReach; py <= cy + kProfileReach; ++py) {
    const float dy = static_cast<float>(py) - y;
    const float low = std::max({dy * middle_u - half_u, dy * middle_t - half_t, -float{kProfileReach} - 0.5f});
    const float high = std::min({dy * middle_u + half_u, dy * middle_t + half_t, float{kProfileReach} + 0.5f});
    const int begin = std::max(static_cast<int>(x + low + kProfileReach + 1) - kProfileReach, cx - kProfileReach);
    const int end = std::min(static_cast<int>(x + high + kProfileReach + 1) - kProfileReach, cx + kProfileReach + 1);
    for (int px = begin; px < end; ++px) {
      const auto i = static_cast<std::size_t>(strip.count++);
      strip.dx[i] = static_cast<float>(px) - x;
      strip.dy[i] = dy;
      strip.value[i] = pixel(px, py);
    }
  }
  bin_pixels(strip, nx, ny, profile);
}

}  // namespace focusfall
