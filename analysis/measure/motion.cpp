#include "analysis/measure/motion.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <opencv2/core.hpp>
#include <vector>

#include "analysis/measure/edge_group.h"

namespace focusfall {
namespace {

constexpr double kPi = std::numbers::pi;
// An error function fitted to a box reads 5 % more than its variance (forward model), to a box and a small disc together
// 4 to 23 % less; on rendered content of many shapes together 3 % less: measured.
constexpr double kSquaredDiscPerSquaredLength = 0.97 * 16 / 12;
// Scatter between sectors that the spread inside them does not show (tone curve, content): measured, 10 % and .25 px^2.
constexpr double kRelativeScatter = 0.10;
constexpr double kScatterPx2 = 0.25;
// Across a long movement the edges that pass the gates of a fine level are the narrow ones: the level must suit the blur
// with room to spare. Measured.
constexpr double kWidestSigmaLevelPx = 1.3;
constexpr int kFitSteps = 12;        // of the reweighted fit; it settles in 4 to 6
constexpr int kDetrendSteps = 3;     // the model inside a sector follows the fit: settles in 2
constexpr double kCauchyScale = 2.385;  // 95 % efficiency on normal errors (Holland & Welsch 1977)
constexpr double kSignificance = 3.5;   // measured, held-out frames
constexpr double kLeastLengthPx = 2;    // judgement: below it no eye sees a direction
constexpr double kLeastRatio = 1.2;     // m against the isotropic part: measured, held-out frames
constexpr double k95 = 1.96;

struct Sector {
  double angle_rad = 0;
  EdgeGroup group;
  double squared_disc_px2 = 0;
  double sigma_px2 = 0;
};

struct Harmonic {
  cv::Vec3d abd{0, 0, 0};   // S(theta) = a + b cos 2 theta + d sin 2 theta
  cv::Matx33d covariance;
};

double at(const cv::Vec3d& abd, double angle_rad) {
  return abd[0] + abd[1] * std::cos(2 * angle_rad) + abd[2] * std::sin(2 * angle_rad);
}

double normal_angle_rad(const EdgeSample& edge) { return std::atan2(edge.normal_y, edge.normal_x); }

std::vector<Sector> sectors_of(std::span<const EdgeSample> edges, const MotionOptions& options) {
  const double spacing = kPi / options.sectors;
  std::vector<Sector> sectors;
  for (int s = 0; s < options.sectors; ++s) {
    const double centre = (s + 0.5) * spacing;
    std::vector<int> indices;
    for (size_t i = 0; i < edges.size(); ++i)
      // Normals are lines, not arrows: the difference is folded into -90..90 degrees.
      if (std::abs(std::remainder(normal_angle_rad(edges[i]) - centre, kPi)) < spacing * options.sector_overlap / 2)
        indices.push_back(int(i));
    EdgeGroupOptions group_options;
    group_options.least_edges = options.least_edges_in_sector;
    group_options.widest_sigma_level_px = kWidestSigmaLevelPx;
    auto group = edge_group(edges, indices, group_options);
    if (!group) {
      group_options.widest_sigma_level_px = EdgeGroupOptions{}.widest_sigma_level_px;
      group = edge_group(edges, indices, group_options);
    }
    if (group)
      sectors.push_back({centre, std::move(*group), 0, 0});
  }
  return sectors;
}

// Value of each sector at its centre: the model there plus the median of what its edges deviate from the model at
// their own angle. Without it the peak of the cosine would be averaged over the width of a sector (4 % of m).
void take_sector_values(std::span<const EdgeSample> edges, const cv::Vec3d& abd, std::vector<Sector>& sectors) {
  for (Sector& sector : sectors) {
    double limit = 0;
    for (int i : sector.group.members) limit = std::max(limit, double(std::abs(edges[size_t(i)].amplitude)));
    std::vector<double> deviations, weights;
    for (int i : sector.group.members) {
      const EdgeSample& edge = edges[size_t(i)];
      deviations.push_back(edge.squared_disc_px2 - at(abd, normal_angle_rad(edge)));
      weights.push_back(edge_weight(edge, limit));
    }
    const WeightedMedian deviation = weighted_median(deviations, weights);
    sector.squared_disc_px2 = at(abd, sector.angle_rad) + deviation.value;
    sector.sigma_px2 = std::hypot(deviation.sigma, kRelativeScatter * sector.squared_disc_px2, kScatterPx2);
  }
}

// Reweighted least squares with Cauchy weights 1/(1 + (r/(2.385 sigma))^2).
Harmonic fit(const std::vector<Sector>& sectors, const MotionOptions& options) {
  Harmonic result;
  std::vector<double> robust(sectors.size(), 1.0);
  double chi2 = 0, weight_sum = 0;
  for (int step = 0; step < kFitSteps; ++step) {
    cv::Matx33d normal = cv::Matx33d::zeros();
    cv::Vec3d right{0, 0, 0};
    for (size_t i = 0; i < sectors.size(); ++i) {
      const Sector& s = sectors[i];
      const cv::Vec3d row{1, std::cos(2 * s.angle_rad), std::sin(2 * s.angle_rad)};
      const double weight = robust[i] / (s.sigma_px2 * s.sigma_px2);
      normal += weight * (row * row.t());
      right += weight * s.squared_disc_px2 * row;
    }
    result.covariance = normal.inv(cv::DECOMP_CHOLESKY);
    result.abd = result.covariance * right;
    chi2 = weight_sum = 0;
    for (size_t i = 0; i < sectors.size(); ++i) {
      const double r = (sectors[i].squared_disc_px2 - at(result.abd, sectors[i].angle_rad)) / sectors[i].sigma_px2;
      robust[i] = 1 / (1 + r * r / (kCauchyScale * kCauchyScale));
      chi2 += robust[i] * r * r;
      weight_sum += robust[i];
    }
  }
  // Overlapping sectors share edges, and what scatters more than expected is believed.
  const double freedom = std::max(weight_sum - 3, 1.0);
  result.covariance *= options.sector_overlap * std::max(1.0, chi2 / freedom);
  return result;
}

double length_px(double anisotropy_px2) {
  return std::sqrt(std::max(anisotropy_px2, 0.0) / kSquaredDiscPerSquaredLength);
}

MotionReading reading_of(const Harmonic& h) {
  const double b = h.abd[1], d = h.abd[2], amplitude = std::hypot(b, d);
  MotionReading reading;
  reading.anisotropy_px2 = 2 * amplitude;
  // Standard error along the fitted direction; without an amplitude the larger of the two.
  const double variance =
      amplitude > 0 ? (b * b * h.covariance(1, 1) + 2 * b * d * h.covariance(1, 2) + d * d * h.covariance(2, 2)) /
                          (amplitude * amplitude)
                    : std::max(h.covariance(1, 1), h.covariance(2, 2));
  reading.anisotropy_sigma_px2 = 2 * std::sqrt(variance);
  reading.isotropic_squared_disc_px2 = h.abd[0] - amplitude;
  reading.length_px = length_px(reading.anisotropy_px2);
  reading.length_low_px = length_px(reading.anisotropy_px2 - k95 * reading.anisotropy_sigma_px2);
  reading.length_high_px = length_px(reading.anisotropy_px2 + k95 * reading.anisotropy_sigma_px2);
  const double angle_deg = std::atan2(d, b) / 2 * 180 / kPi;
  reading.angle_deg = angle_deg < 0 ? angle_deg + 180 : angle_deg;
  return reading;
}

}  // namespace

std::optional<MotionReading> motion(std::span<const EdgeSample> edges, const MotionOptions& options) {
  std::vector<Sector> sectors = sectors_of(edges, options);
  if (int(sectors.size()) < options.least_sectors) return std::nullopt;
  Harmonic harmonic;
  for (int step = 0; step < kDetrendSteps; ++step) {
    take_sector_values(edges, harmonic.abd, sectors);
    harmonic = fit(sectors, options);
  }
  return reading_of(harmonic);
}

bool motion_is_significant(const MotionReading& reading, double baseline_px2) {
  const double isotropic_px2 = std::max(reading.isotropic_squared_disc_px2 - baseline_px2, 0.0);
  return reading.anisotropy_px2 > kSignificance * reading.anisotropy_sigma_px2 &&
         reading.length_px > kLeastLengthPx && reading.anisotropy_px2 > kLeastRatio * isotropic_px2;
}

double motion_length_bound_px(const MotionReading& reading, double angle_deg) {
  // S along the direction above the least S of any direction: m cos^2 of the angle between.
  const double cosine = std::cos((angle_deg - reading.angle_deg) * kPi / 180);
  return length_px(reading.anisotropy_px2 * cosine * cosine + k95 * reading.anisotropy_sigma_px2);
}

}  // namespace focusfall
