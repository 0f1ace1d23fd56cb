#include "analysis/optics/system_response.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>

#include "analysis/optics/diffraction.h"

namespace focusfall {
namespace {

constexpr double kPi = std::numbers::pi;

// Above this frequency, cycles/px, nothing is added to an edge: only a bare pixel box reaches so far (2e-3).
constexpr double kHighestFrequency = 32;

// A Gaussian passes 1e-8 at f = 6.07 / (2 pi sigma).
constexpr double kGaussianReach = 6.07 / (2 * kPi);

// The edge is drawn as one flank of a square wave; this many times the wanted half width keeps the other flanks away,
// all but the slowly falling wings of the Airy pattern, which are taken off. Judgement; the remaining error is tested.
constexpr double kPeriodPerHalfWidth = 8;
constexpr double kLeastPeriodPx = 64;

// Transfer function of the lens alone, a function of the radial frequency.
double lens_otf(const SystemResponse& response, double radial_frequency) {
  const double disc_argument = kPi * response.disc_px * radial_frequency;
  if (response.airy_lambda_n_over_p_px <= 0) return jinc(disc_argument);
  const double s = radial_frequency * response.airy_lambda_n_over_p_px;
  const double waves = *defocus_waves(response);
  if (waves <= kExactDefocusWaves) return defocused_aperture_otf(s, waves);
  return jinc(disc_argument) * circular_aperture_mtf(s);
}

struct Direction {
  double x = 1, y = 0;
};

Direction direction(double angle_deg) {
  const double angle = angle_deg * kPi / 180;
  return {std::cos(angle), std::sin(angle)};
}

double slice(const SystemResponse& response, Direction normal, double frequency) {
  return otf(response, frequency * normal.x, frequency * normal.y);
}

double highest_frequency(const SystemResponse& response) {
  double highest = kHighestFrequency;
  if (response.airy_lambda_n_over_p_px > 0) highest = std::min(highest, 1 / response.airy_lambda_n_over_p_px);
  if (response.gaussian_sigma_px > 0) highest = std::min(highest, kGaussianReach / response.gaussian_sigma_px);
  return highest;
}

// Half width in which all of the response but the wings of the Airy pattern fits.
double reach_px(const SystemResponse& response) {
  return 0.5 * response.disc_px + 0.5 * response.motion_length_px + response.pixel_aperture_px +
         4 * response.gaussian_sigma_px + 3 * response.airy_lambda_n_over_p_px;
}

// One flank of a square wave of period P seen through the response, as a sum of its odd harmonics:
//   E_P(x) = 1/2 + sum over odd k of 2 / (pi k) H(k / P) sin(2 pi k x / P).
// With an aperture H falls from 1 as 1 - a |f|, a = 4 lambda N / pi, so an edge approaches its ends as a / (2 pi^2 x).
// What the wings of the other flanks, at k P / 2, add to this one is then
//   E_P - E = a / (2 pi^2) (1 / x - (2 pi / P) / sin(2 pi x / P)),
// by the partial fractions of 1 / sin; at an eighth of the period from the edge it is some 1e-4 and more.
class EdgeSeries {
 public:
  EdgeSeries(const SystemResponse& response, Direction normal, double half_width_px)
      : period_px_(std::max(kLeastPeriodPx, kPeriodPerHalfWidth * std::max(half_width_px, reach_px(response)))),
        wing_px_(4 / kPi * response.airy_lambda_n_over_p_px / (2 * kPi * kPi)) {
    const double highest = highest_frequency(response);
    for (int k = 1; k / period_px_ < highest; k += 2) {
      amplitudes_.push_back(2 / (kPi * k) * slice(response, normal, k / period_px_));
    }
  }

  double operator()(double x_px) const {
    // sin((k + 2) a) = 2 cos(2 a) sin(k a) - sin((k - 2) a): two multiplications per harmonic instead of a sine. Its
    // rounding grows with the number of harmonics but stays below 1e-9 for the some thousand there are.
    const double angle = 2 * kPi * x_px / period_px_;
    const double twice_cosine = 2 * std::cos(2 * angle);
    double current = std::sin(angle), previous = -current, sum = 0.5;
    for (const double amplitude : amplitudes_) {
      sum += amplitude * current;
      const double next = twice_cosine * current - previous;
      previous = current;
      current = next;
    }
    return sum - other_wings(angle, x_px);
  }

 private:
  // Odd in x; below 1e-3 of an angle it is wing x angle^2 / 6 / x and more exact as nothing than as a difference.
  double other_wings(double angle, double x_px) const {
    if (std::abs(angle) < 1e-3) return 0;
    return wing_px_ / x_px * (1 - angle / std::sin(angle));
  }

  double period_px_;
  double wing_px_;   // a / (2 pi^2)
  std::vector<double> amplitudes_;
};

// Bisection of a function that is positive at `low` and not at `high`.
template <class Function>
double falling_zero(Function function, double low, double high) {
  for (int i = 0; i < 60; ++i) {
    const double middle = 0.5 * (low + high);
    (function(middle) > 0 ? low : high) = middle;
  }
  return 0.5 * (low + high);
}

// Integral from minus infinity to x of the edge of a uniform disc of diameter c, with t = 2 x / c:
//   x / 2 + (c / 2 pi) (t asin t + sqrt(1 - t^2) - (1 - t^2)^(3/2) / 3)   for |t| <= 1, 0 below, x above.
double disc_edge_integral(double x, double disc_px) {
  if (2 * x <= -disc_px) return 0;
  if (2 * x >= disc_px) return x;
  const double t = 2 * x / disc_px, root = std::sqrt(1 - t * t);
  return 0.5 * x + disc_px / (2 * kPi) * (t * std::asin(t) + root - root * root * root / 3);
}

}  // namespace

std::optional<double> defocus_waves(const SystemResponse& response) {
  if (response.airy_lambda_n_over_p_px <= 0) return std::nullopt;
  return disc_waves(response.disc_px, response.airy_lambda_n_over_p_px, 1);
}

double otf(const SystemResponse& response, double fx_cycles_per_px, double fy_cycles_per_px) {
  const double radial = std::hypot(fx_cycles_per_px, fy_cycles_per_px);
  double value = lens_otf(response, radial);
  if (response.gaussian_sigma_px > 0) {
    const double argument = 2 * kPi * response.gaussian_sigma_px * radial;
    value *= std::exp(-0.5 * argument * argument);
  }
  if (response.motion_length_px > 0) {
    const Direction path = direction(response.motion_angle_deg);
    value *= sinc(response.motion_length_px * (fx_cycles_per_px * path.x + fy_cycles_per_px * path.y));
  }
  const double aperture = response.pixel_aperture_px;
  return value * sinc(aperture * fx_cycles_per_px) * sinc(aperture * fy_cycles_per_px);
}

std::vector<double> edge_spread(const SystemResponse& response, double normal_angle_deg, double step_px,
                                double half_width_px) {
  assert(step_px > 0 && half_width_px > 0);
  const EdgeSeries series(response, direction(normal_angle_deg), half_width_px);
  const long half_count = std::lround(half_width_px / step_px);
  std::vector<double> values(static_cast<std::size_t>(2 * half_count + 1), 0.5);
  for (long i = 1; i <= half_count; ++i) {
    const double value = series(static_cast<double>(i) * step_px);
    values[static_cast<std::size_t>(half_count + i)] = value;
    values[static_cast<std::size_t>(half_count - i)] = 1 - value;
  }
  return values;
}

std::optional<double> edge_rise_px(const SystemResponse& response, double normal_angle_deg) {
  constexpr double kLargestReachPx = 1000;
  const double reach = reach_px(response);
  if (reach > kLargestReachPx) return std::nullopt;
  const EdgeSeries series(response, direction(normal_angle_deg), reach);
  return 2 * falling_zero([&](double x) { return 0.9 - series(x); }, 0, reach);
}

std::optional<double> mtf50_cycles_per_px(const SystemResponse& response, double normal_angle_deg) {
  const Direction normal = direction(normal_angle_deg);
  const double highest = highest_frequency(response);
  // Steps fine against the first lobe of the widest component, so that the first crossing is not stepped over.
  const double step = 0.05 / std::max(reach_px(response), 0.1);
  for (double f = step; f < highest + step; f += step) {
    if (slice(response, normal, f) > 0.5) continue;
    return falling_zero([&](double g) { return slice(response, normal, g) - 0.5; }, f - step, f);
  }
  return std::nullopt;
}

double disc_edge_rise_px(double disc_px) {
  assert(disc_px >= 0);
  const auto edge = [&](double x) {
    return disc_edge_integral(x + 0.5, disc_px) - disc_edge_integral(x - 0.5, disc_px);
  };
  return 2 * falling_zero([&](double x) { return 0.9 - edge(x); }, 0, 0.5 * disc_px + 0.5);
}

double disc_mtf50_cycles_per_px(double disc_px) {
  assert(disc_px >= 0);
  // Both factors fall up to their first zeros, 1.22 / c and 1; the product passes one half before either.
  const double high = std::min(1.0, disc_px > 0 ? 1.2 / disc_px : 1.0);
  return falling_zero([&](double f) { return jinc(std::numbers::pi * disc_px * f) * sinc(f) - 0.5; }, 0, high);
}

}  // namespace focusfall
