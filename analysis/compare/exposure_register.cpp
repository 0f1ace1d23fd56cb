#include "analysis/compare/exposure_register.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace focusfall {
namespace {

// Darker than this, linear, an 8-bit code is more than a tenth of a stop wide (code 14 of 255).
constexpr double kDarkestLevel = 0.0045;
// Brighter than this the tile is so close to clipping that its brightest pixels may be held back by it.
constexpr double kBrightestLevel = 0.93;
constexpr int kLeastTiles = 8;          // judgement: fewer say nothing about a displacement
constexpr int kReachTiles = 2;
// Frames whose tiles differ by less than this, stops, have no structure to be registered by: a wall, a light box.
constexpr double kStructureEv = 0.1;
// A displacement under this many tiles is none: what it changes is less than the tile's own uncertainty.
constexpr double kStillTiles = 0.04;
// A displacement by a part of a tile is believed only where it takes this much off the variance that is left: a tone
// curve leaves some that no displacement removes. Judgement.
constexpr double kFinerShift = 0.8;

std::size_t index(const LevelGrid& grid, int column, int row) {
  return static_cast<std::size_t>(row) * static_cast<std::size_t>(grid.columns) + static_cast<std::size_t>(column);
}

bool usable(const LevelGrid& grid, std::size_t i) {
  const double level = static_cast<double>(grid.mean_linear[i]);
  const bool clipped = !grid.clipped.empty() && grid.clipped[i] > 0;
  return !clipped && level >= kDarkestLevel && level <= kBrightestLevel;
}

double level_ev(const LevelGrid& grid, std::size_t i) { return std::log2(static_cast<double>(grid.mean_linear[i])); }

// Width of one 8-bit sRGB code at a level, stops: d(log2 L)/d(code) = 2.4 / ln 2 / (v + .055) / 255 with v the coded
// value, from the curve of IEC 61966-2-1.
double code_width_ev(double linear) {
  const double coded = 1.055 * std::pow(linear, 1 / 2.4) - 0.055;
  return 2.4 / std::log(2.) / (coded + 0.055) / 255;
}

struct Sums {
  int count = 0;
  double a = 0, b = 0, aa = 0, bb = 0, ab = 0;

  void add(double x, double y) {
    ++count;
    a += x, b += y, aa += x * x, bb += y * y, ab += x * y;
  }
  double variance_a() const { return std::max(0.0, aa / count - a / count * (a / count)); }
  double variance_b() const { return std::max(0.0, bb / count - b / count * (b / count)); }
  double covariance() const { return ab / count - a / count * (b / count); }
  // Variance of a - b: what is left between the two frames when the difference in exposure is taken off.
  double difference() const { return std::max(0.0, variance_a() + variance_b() - 2 * covariance()); }
};

Sums compared(const LevelGrid& reference, const LevelGrid& frame, int dx, int dy) {
  Sums sums;
  for (int row = std::max(0, -dy); row < std::min(reference.rows, reference.rows - dy); ++row) {
    for (int column = std::max(0, -dx); column < std::min(reference.columns, reference.columns - dx); ++column) {
      const std::size_t i = index(reference, column, row), j = index(frame, column + dx, row + dy);
      if (usable(reference, i) && usable(frame, j)) sums.add(level_ev(reference, i), level_ev(frame, j));
    }
  }
  return sums;
}

// Vertex of the parabola through three values at -1, 0, 1, the middle one the least.
double vertex(double before, double middle, double after) {
  const double curvature = before - 2 * middle + after;
  return curvature > 0 ? std::clamp(0.5 * (before - after) / curvature, -0.5, 0.5) : 0;
}

// What is left between the reference and the displaced frame, stops^2.
double residual_variance(const LevelGrid& reference, const LevelGrid& frame, const GridMatch& match) {
  const auto levels = registered_levels(frame, match);
  Sums sums;
  for (std::size_t i = 0; i < levels.size(); ++i) {
    if (levels[i] && usable(reference, i)) sums.add(level_ev(reference, i), levels[i]->level_ev);
  }
  return sums.count >= kLeastTiles ? sums.difference() : std::numeric_limits<double>::infinity();
}

}  // namespace

std::optional<GridMatch> match_grids(const LevelGrid& reference, const LevelGrid& frame) {
  if (reference.rows != frame.rows || reference.columns != frame.columns) return std::nullopt;
  const Sums still = compared(reference, frame, 0, 0);
  if (still.count < kLeastTiles) return std::nullopt;
  GridMatch match{.correlation = 1, .tiles = still.count};
  if (std::sqrt(std::max(still.variance_a(), still.variance_b())) < kStructureEv) return match;

  std::array<std::array<double, 2 * kReachTiles + 1>, 2 * kReachTiles + 1> left{};
  int best_x = 0, best_y = 0;
  double least = std::numeric_limits<double>::infinity();
  for (int dy = -kReachTiles; dy <= kReachTiles; ++dy) {
    for (int dx = -kReachTiles; dx <= kReachTiles; ++dx) {
      const Sums sums = compared(reference, frame, dx, dy);
      const double difference = sums.count >= std::max(kLeastTiles, still.count / 2)
                                    ? sums.difference() : std::numeric_limits<double>::infinity();
      left[static_cast<std::size_t>(dy + kReachTiles)][static_cast<std::size_t>(dx + kReachTiles)] = difference;
      if (difference < least) least = difference, best_x = dx, best_y = dy;
    }
  }
  const Sums best = compared(reference, frame, best_x, best_y);
  const double spread = std::sqrt(best.variance_a() * best.variance_b());
  match.correlation = spread > 0 ? best.covariance() / spread : 0;
  match.tiles = best.count;
  const auto at = [&](int dx, int dy) {
    if (std::abs(dx) > kReachTiles || std::abs(dy) > kReachTiles) return std::numeric_limits<double>::infinity();
    return left[static_cast<std::size_t>(dy + kReachTiles)][static_cast<std::size_t>(dx + kReachTiles)];
  };
  const auto refined = [](int whole, double before, double middle, double after) {
    if (!std::isfinite(before) || !std::isfinite(after)) return static_cast<double>(whole);
    const double part = vertex(before, middle, after);
    return std::abs(part) < kStillTiles ? static_cast<double>(whole) : whole + part;
  };
  match.shift_x = best_x, match.shift_y = best_y;
  GridMatch fine = match;
  fine.shift_x = refined(best_x, at(best_x - 1, best_y), least, at(best_x + 1, best_y));
  fine.shift_y = refined(best_y, at(best_x, best_y - 1), least, at(best_x, best_y + 1));
  const bool finer = residual_variance(reference, frame, fine) < kFinerShift * residual_variance(reference, frame, match);
  return finer ? fine : match;
}

std::vector<std::optional<TileLevel>> registered_levels(const LevelGrid& frame, const GridMatch& match) {
  std::vector<std::optional<TileLevel>> levels(frame.mean_linear.size());
  const int whole_x = static_cast<int>(std::floor(match.shift_x)), whole_y = static_cast<int>(std::floor(match.shift_y));
  const double part_x = match.shift_x - whole_x, part_y = match.shift_y - whole_y;
  for (int row = 0; row < frame.rows; ++row) {
    for (int column = 0; column < frame.columns; ++column) {
      // Bilinear between the up to four tiles of the frame that show this one of the reference.
      double level = 0, contrast = 0;
      bool seen = true;
      for (int corner = 0; corner < 4; ++corner) {
        const double weight = (corner & 1 ? part_x : 1 - part_x) * (corner & 2 ? part_y : 1 - part_y);
        if (weight == 0) continue;
        const int x = column + whole_x + (corner & 1), y = row + whole_y + (corner >> 1);
        if (x < 0 || y < 0 || x >= frame.columns || y >= frame.rows || !usable(frame, index(frame, x, y))) {
          seen = false;
          break;
        }
        level += weight * static_cast<double>(frame.mean_linear[index(frame, x, y)]);
        contrast += weight * static_cast<double>(frame.contrast[index(frame, x, y)]);
      }
      if (!seen) continue;
      // A third of a code where rounding is not averaged out; a twentieth of the contrast for the displacement.
      const double sigma = std::hypot(0.01, 0.3 * code_width_ev(level), 0.05 * contrast);
      levels[index(frame, column, row)] = TileLevel{std::log2(level), sigma};
    }
  }
  return levels;
}

}  // namespace focusfall
