#include "analysis/compare/lens_bench.h"

#include <algorithm>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <vector>

#include "analysis/compare/lens_fit.h"

namespace focusfall {
namespace {

constexpr Eigen::Index kLeastPositions = 5;     // three coefficients and two degrees of freedom
constexpr double kModelSigmaPx2 = 0.8;          // what the parabola leaves over of S (measurement of rendered frames)

// Bounds of -b / (2 c) by Fieller: all x0 at which b + 2 c x0 is not significantly different from 0. Finite where c is
// significant.
std::optional<Interval> fieller(double b, double c, const Eigen::MatrixXd& covariance, double student) {
  const double q = student * student;
  const double square = 4 * (c * c - q * covariance(2, 2));
  const double linear = 4 * (b * c - q * covariance(1, 2));
  const double rest = b * b - q * covariance(1, 1);
  const double root = linear * linear - 4 * square * rest;
  if (!(square > 0) || !(root >= 0)) return std::nullopt;
  return Interval{-b / (2 * c), (-linear - std::sqrt(root)) / (2 * square), (-linear + std::sqrt(root)) / (2 * square)};
}

}  // namespace

std::optional<BestFocus> best_focus(std::span<const FocusStep> steps) {
  const auto n = static_cast<Eigen::Index>(steps.size());
  if (n < kLeastPositions) return std::nullopt;
  const auto [first, last] = std::ranges::minmax_element(steps, {}, &FocusStep::position_um);
  const double middle = (first->position_um + last->position_um) / 2;
  const double half = (last->position_um - first->position_um) / 2;
  if (!(half > 0)) return std::nullopt;

  // Positions scaled to -1..1, so that the columns are of one size.
  Eigen::MatrixXd design(n, 3);
  Eigen::VectorXd y(n), sigma(n);
  for (Eigen::Index i = 0; i < n; ++i) {
    const FocusStep& step = steps[static_cast<std::size_t>(i)];
    const double x = (step.position_um - middle) / half;
    design.row(i) << 1, x, x * x;
    y[i] = step.squared_disc_px2;
    sigma[i] = std::hypot(step.sigma_px2, kModelSigmaPx2);
  }
  const auto fit = robust_fit(design, y, sigma);
  if (!fit || !(fit->coefficients[2] > 0)) return std::nullopt;
  const boost::math::students_t student(fit->freedom);
  const double b = fit->coefficients[1], c = fit->coefficients[2];
  const auto x0 = fieller(b, c, fit->covariance, quantile(student, 0.975));
  if (!x0) return std::nullopt;

  BestFocus best;
  best.position_um = {middle + half * x0->value, middle + half * x0->low, middle + half * x0->high};
  best.slope_px_per_um = std::sqrt(c) / half;
  best.least_squared_disc_px2 = fit->coefficients[0] - b * b / (4 * c);
  best.freedom = fit->freedom;
  best.inside = std::abs(x0->value) <= 1;
  return best;
}

std::optional<double> f_number_from_slope(const SlopeReading& reading, const SurfaceAttitude& attitude) {
  const double f = reading.focal_length_mm, s = reading.focus_distance_mm;
  if (!(reading.slope > 0) || !std::isfinite(s) || !(s > f)) return std::nullopt;
  // Where the axis meets the surface: 1/d = 1/s - l/K. The marked f-number in K is enough: l/K is small beside 1/s.
  const double k_mm2 = f * f * s / (reading.marked_f_number * (s - f));
  const double inverse = 1 / s - reading.blur_at_centre_mm / k_mm2;
  if (!(inverse > 0)) return std::nullopt;
  if (attitude.tilt_rad) return f * std::tan(*attitude.tilt_rad) * inverse / reading.slope;
  if (!attitude.camera_height_m) return std::nullopt;
  const double height_mm = *attitude.camera_height_m * 1000, sine = height_mm * inverse;
  if (!(sine < 1)) return std::nullopt;
  return f * std::sqrt(1 - sine * sine) / (reading.slope * height_mm);
}

std::optional<DiaphragmReading> diaphragm(std::span<const double> f_numbers, double marked_f_number) {
  const auto n = static_cast<Eigen::Index>(f_numbers.size());
  Eigen::VectorXd stops(n);
  for (Eigen::Index i = 0; i < n; ++i) stops[i] = 2 * std::log2(f_numbers[static_cast<std::size_t>(i)]);
  const auto fit = robust_fit(Eigen::MatrixXd::Ones(n, 1), stops, Eigen::VectorXd::Zero(n));
  if (!fit) return std::nullopt;
  const Interval interval = interval_95({.value = fit->coefficients[0],
                                         .standard_error = std::sqrt(fit->covariance(0, 0)),
                                         .freedom = fit->freedom,
                                         .floor = kSlopeFloorStops});
  const auto n_of = [](double one) { return std::exp2(one / 2); };
  const double marked = 2 * std::log2(marked_f_number);
  return DiaphragmReading{{n_of(interval.value), n_of(interval.low), n_of(interval.high)},
                          marked - interval.value, marked - interval.high, marked - interval.low};
}

}  // namespace focusfall
