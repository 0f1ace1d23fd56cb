#include "analysis/measure/plane.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <utility>
#include <vector>

#include "analysis/measure/plane_model.h"

namespace focusfall {
namespace {

using plane_fit::Direction;
using plane_fit::Fit;
using plane_fit::Scene;

constexpr double k95 = 1.959964;
// Accepting a fit: measured on rendered frames (no wrong side among those that pass).
constexpr double kSlopeSignificance = 4;
constexpr double kLeastInliers = 0.6;
constexpr int kLeastClusters = 12;
// A surface shows a change of blur: a field that hardly changes explains any frame of one blur. Judgement.
constexpr double kLeastSpanPx = 2;
constexpr double kLeastSpan = 0.4;           // of the largest signed blur on it
constexpr double kRelativeSigma = 0.08;       // of the signed blur: textures that read a little less, all alike
constexpr double kFloorSigmaPx = 0.1;        // no signed blur is known better: tables and tone curve

struct Candidate {
  Fit fit;
  NearSide side = NearSide::bottom;
  bool side_known = true;
};

double slope_sigma(const Fit& fit) {
  const double a = fit.field.a, b = fit.field.b, k = std::hypot(a, b);
  if (!(k > 0)) return 0;
  return std::sqrt(std::max(a * a * fit.covariance[1][1] + 2 * a * b * fit.covariance[1][2] +
                                b * b * fit.covariance[2][2], 0.0)) / k;
}

bool acceptable(const Fit& fit, const Direction& near, double direction_range_deg) {
  if (!fit.settled || fit.score.cost >= 0 || fit.score.clusters < kLeastClusters) return false;
  const double span_px = fit.most_px - fit.least_px;
  if (span_px < std::max(kLeastSpanPx, kLeastSpan * std::max(std::abs(fit.least_px), std::abs(fit.most_px))))
    return false;
  const double k = std::hypot(fit.field.a, fit.field.b);
  if (!(k > kSlopeSignificance * slope_sigma(fit))) return false;
  // The fit may lean a little more than the search looked.
  const double along = (fit.field.a * near.x + fit.field.b * near.y) / k;
  if (along < std::cos((direction_range_deg + 10) * std::numbers::pi / 180)) return false;
  return fit.inlier_fraction > kLeastInliers;
}

std::optional<Candidate> best_on(const Scene& scene, NearSide side, const PlaneOptions& options) {
  const Direction near = plane_fit::direction_of(side);
  std::optional<Candidate> best;
  for (const plane_fit::Field& start : plane_fit::search(scene, near, options.direction_range_deg)) {
    const Fit fit = plane_fit::refine(scene, start, near);
    if (!fit.settled) continue;
    if (!best || fit.score.cost < best->fit.score.cost) best = Candidate{fit, side, true};
  }
  if (best && !acceptable(best->fit, near, options.direction_range_deg)) return std::nullopt;
  return best;
}

PlaneReading reading_of(const Scene& scene, const Candidate& candidate, const PlaneOptions& options) {
  const plane_fit::Field& f = candidate.fit.field;
  PlaneReading reading;
  // From centred coordinates to fractions of the frame: X = (fx W - cx)/s.
  const double sx = options.width_px / scene.scale_px, sy = options.height_px / scene.scale_px;
  const double ox = scene.centre_x_px / scene.scale_px, oy = scene.centre_y_px / scene.scale_px;
  reading.x_gradient_px = f.a * sx;
  reading.y_gradient_px = f.b * sy;
  reading.offset_px = f.g - f.a * ox - f.b * oy;
  // Rows: (x_gradient, y_gradient, offset) out of (g, a, b).
  const double m[3][3] = {{0, sx, 0}, {0, 0, sy}, {1, -ox, -oy}};
  for (int i = 0; i < 3; ++i)
    for (int j = 0; j < 3; ++j)
      for (int p = 0; p < 3; ++p)
        for (int q = 0; q < 3; ++q) reading.covariance[i][j] += m[i][p] * candidate.fit.covariance[p][q] * m[j][q];

  const double slope = std::hypot(reading.x_gradient_px, reading.y_gradient_px);
  const double nx = reading.x_gradient_px / slope, ny = reading.y_gradient_px / slope;
  reading.gradient_sigma_px =
      std::sqrt(std::max(nx * nx * reading.covariance[0][0] + 2 * nx * ny * reading.covariance[0][1] +
                             ny * ny * reading.covariance[1][1], 0.0));
  reading.inlier_fraction = candidate.fit.inlier_fraction;
  reading.residual_squared_disc_px2 = f.floor_px2;
  reading.near_side = candidate.side;
  return reading;
}

void set_contact(const Scene& scene, const Candidate& candidate, const PlaneOptions& options, PlaneReading& reading) {
  const plane_fit::ContactFinding found = plane_fit::find_contact(scene, candidate.fit, candidate.side, options);
  reading.contact = found.contact;
  if (found.contact == Contact::none) return;
  reading.contact_x = found.x;
  reading.contact_y = found.y;
  const SignedBlur l = signed_blur(reading, found.x, found.y);
  const double sigma = std::hypot(std::hypot(l.sigma_px, found.extra_sigma_px), kFloorSigmaPx, kRelativeSigma * l.value_px);
  reading.at_contact_sigma_px = sigma;
  reading.at_contact_px = Interval{l.value_px, l.value_px - k95 * sigma, l.value_px + k95 * sigma};
}

}  // namespace

SignedBlur signed_blur(const PlaneReading& reading, double x, double y) {
  const double row[3] = {x, y, 1};
  double variance = 0;
  for (int i = 0; i < 3; ++i)
    for (int j = 0; j < 3; ++j) variance += row[i] * reading.covariance[i][j] * row[j];
  return {reading.x_gradient_px * x + reading.y_gradient_px * y + reading.offset_px,
          std::sqrt(std::max(variance, 0.0))};
}

double expected_disc_px(const PlaneReading& reading, const FractionBox& aim) {
  if (reading.contact != Contact::aim) return std::abs(signed_blur(reading, reading.contact_x, reading.contact_y).value_px);
  constexpr int kAcross = 9;   // an odd number of places each way
  std::vector<double> discs;
  for (int i = 0; i < kAcross * kAcross; ++i) {
    const double x = aim.x + aim.width * (i % kAcross + 0.5) / kAcross, y = aim.y + aim.height * (i / kAcross + 0.5) / kAcross;
    discs.push_back(std::abs(signed_blur(reading, x, y).value_px));
  }
  const auto middle = discs.begin() + std::ptrdiff_t(discs.size() / 2);
  std::nth_element(discs.begin(), middle, discs.end());
  return *middle;
}

std::optional<PlaneReading> plane(std::span<const EdgeSample> edges, const PlaneOptions& options,
                                  std::span<const BlurSample> samples) {
  if (options.width_px <= 0 || options.height_px <= 0) return std::nullopt;
  const Scene scene = plane_fit::scene_of(edges, samples, options);
  std::optional<Candidate> best;
  if (options.near_side) {
    best = best_on(scene, *options.near_side, options);
  } else {
    // Blur tells an axis, never a sense along it: l and -l look alike. Of bottom and top the bottom is taken, since
    // hardly a photograph is stored upside down; left and right remain open, and no side is given then.
    best = best_on(scene, NearSide::bottom, options);
    auto sideways = best_on(scene, NearSide::right, options);
    if (sideways && (!best || sideways->fit.score.cost < best->fit.score.cost)) {
      best = std::move(sideways);
      best->side_known = false;
    }
  }
  if (!best) return std::nullopt;
  PlaneReading reading = reading_of(scene, *best, options);
  if (best->side_known) set_contact(scene, *best, options, reading);
  return reading;
}

}  // namespace focusfall
