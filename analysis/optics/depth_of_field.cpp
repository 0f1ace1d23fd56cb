#include "analysis/optics/depth_of_field.h"

#include <cassert>
#include <cmath>
#include <limits>

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

// q within this of 1 is the hyperfocal setting itself, whose limit is infinite however its rounding fell.
constexpr double kHyperfocalRounding = 1e-12;

}  // namespace

bool DepthLimits::far_infinite() const { return std::isinf(far_mm); }

DepthLimits limits_about(double focus_from_pupil_mm, double q) {
  assert(q >= 0);
  const bool infinite = q >= 1 - kHyperfocalRounding;
  return {.near_mm = focus_from_pupil_mm / (1 + q), .far_mm = infinite ? kInfinity : focus_from_pupil_mm / (1 - q)};
}

DepthLimits depth_limits(const Lens& lens, double focus_mm, double blur_mm) {
  assert(focus_mm > lens.focal_length_mm && blur_mm > 0);
  const double f = lens.focal_length_mm;
  const double pupil_mm = f - f / lens.pupil_magnification;   // behind the principal plane
  if (std::isinf(focus_mm)) return {.near_mm = f * f / (lens.f_number * blur_mm) + pupil_mm, .far_mm = kInfinity};
  const double q = lens.f_number * blur_mm / (f * magnification(f, focus_mm));
  const DepthLimits from_pupil = limits_about(distance_from_pupil_mm(lens, focus_mm), q);
  return {.near_mm = from_pupil.near_mm + pupil_mm, .far_mm = from_pupil.far_mm + pupil_mm};
}

double hyperfocal_mm(const Lens& lens, double blur_mm) {
  assert(lens.f_number > 0 && blur_mm > 0);
  return lens.focal_length_mm * lens.focal_length_mm / (lens.f_number * blur_mm) + lens.focal_length_mm;
}

double depth_of_focus_mm(const Lens& lens, double magnification, double blur_mm) {
  return 2 * blur_mm * working_f_number(lens, magnification);
}

}  // namespace focusfall
