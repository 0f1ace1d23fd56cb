#include "analysis/optics/diffraction.h"

#include <math.h>  // j1: POSIX, not in <cmath>

#include <cassert>
#include <cmath>
#include <numbers>

#include "analysis/optics/quadrature.h"

namespace focusfall {
namespace {

constexpr double kPi = std::numbers::pi;

// First zero of J1 over pi: radius of the first dark ring in units of lambda N.
constexpr double kAiryFirstZero = 1.2196698912665045;

// Integral of Hopkins with x = (1 - s)(1 - u^2): the root at the upper end becomes a smooth factor u.
template <int Points>
double hopkins_integral(double s, double phase_rate) {
  static const GaussLegendre<Points> quadrature;
  const double range = 1 - s;
  return quadrature(
      [&](double u) {
        const double x = range * (1 - u * u);
        return 2 * u * u * range * std::sqrt(range * (1 + x + s)) * std::cos(phase_rate * x);
      },
      0, 1);
}

}  // namespace

double jinc(double x) {
  // Below 1e-4 the next term of the series, x^4 / 192, is lost in rounding.
  if (std::abs(x) < 1e-4) return 1 - x * x / 8;
  return 2 * ::j1(x) / x;
}

double sinc(double x) {
  const double y = kPi * x;
  if (std::abs(y) < 1e-4) return 1 - y * y / 6;
  return std::sin(y) / y;
}

double circular_aperture_mtf(double s) {
  s = std::abs(s);
  if (s >= 1) return 0;
  return 2 / kPi * (std::acos(s) - s * std::sqrt(1 - s * s));
}

double defocused_aperture_otf(double s, double waves) {
  s = std::abs(s);
  if (s >= 1) return 0;
  if (waves == 0) return circular_aperture_mtf(s);
  const double phase_rate = 8 * kPi * std::abs(waves) * s;
  // The phase at the lower end decides how many points follow the oscillation: about one per radian with u^2 inside.
  const double phase = phase_rate * (1 - s);
  double integral = 0;
  if (phase < 8) {
    integral = hopkins_integral<20>(s, phase_rate);
  } else if (phase < 32) {
    integral = hopkins_integral<48>(s, phase_rate);
  } else {
    integral = hopkins_integral<128>(s, phase_rate);
  }
  return 4 / kPi * integral;
}

double airy_diameter(double wavelength, double f_number) { return 2 * kAiryFirstZero * wavelength * f_number; }

double cutoff_cycles_per_mm(double wavelength_um, double f_number) {
  assert(wavelength_um > 0 && f_number > 0);
  return 1000 / (wavelength_um * f_number);
}

double disc_waves(double disc, double wavelength, double f_number) {
  assert(wavelength > 0 && f_number > 0);
  return disc / (8 * wavelength * f_number);
}

}  // namespace focusfall
