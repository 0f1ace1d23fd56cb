#include "analysis/optics/thin_lens.h"

#include <cassert>
#include <cmath>
#include <limits>

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

}  // namespace

double image_distance_mm(double focal_length_mm, double focus_mm) {
  assert(focus_mm > focal_length_mm);
  if (std::isinf(focus_mm)) return focal_length_mm;
  return focal_length_mm * focus_mm / (focus_mm - focal_length_mm);
}

double focus_distance_mm(double focal_length_mm, double image_distance_mm) {
  assert(image_distance_mm >= focal_length_mm);
  if (image_distance_mm == focal_length_mm) return kInfinity;
  return focal_length_mm * image_distance_mm / (image_distance_mm - focal_length_mm);
}

double magnification(double focal_length_mm, double focus_mm) {
  assert(focus_mm > focal_length_mm);
  return focal_length_mm / (focus_mm - focal_length_mm);
}

double sensor_distance_mm(double focal_length_mm, double focus_mm) {
  return focus_mm + image_distance_mm(focal_length_mm, focus_mm);
}

std::optional<double> lens_distance_mm(double focal_length_mm, double sensor_distance_mm) {
  if (!(sensor_distance_mm >= 4 * focal_length_mm)) return std::nullopt;
  if (std::isinf(sensor_distance_mm)) return kInfinity;
  const double root = std::sqrt(sensor_distance_mm * (sensor_distance_mm - 4 * focal_length_mm));
  return 0.5 * (sensor_distance_mm + root);
}

double working_f_number(const Lens& lens, double magnification) {
  return lens.f_number * (1 + magnification / lens.pupil_magnification);
}

double entrance_pupil_mm(const Lens& lens) { return lens.focal_length_mm / lens.f_number; }

double distance_from_pupil_mm(const Lens& lens, double distance_mm) {
  return distance_mm - lens.focal_length_mm * (1 - 1 / lens.pupil_magnification);
}

double signed_blur_disc_mm(const Lens& lens, double focus_mm, double subject_mm) {
  assert(focus_mm > lens.focal_length_mm && subject_mm > lens.focal_length_mm && lens.f_number > 0);
  // At an infinite distance m (s - d) / d' has a limit: f / d' for the focus, -m for the subject, 0 for both.
  if (std::isinf(focus_mm) && std::isinf(subject_mm)) return 0;
  const double m = magnification(lens.focal_length_mm, focus_mm);
  double relative = -m;
  if (std::isinf(focus_mm)) {
    relative = lens.focal_length_mm / distance_from_pupil_mm(lens, subject_mm);
  } else if (!std::isinf(subject_mm)) {
    relative = m * (focus_mm - subject_mm) / distance_from_pupil_mm(lens, subject_mm);
  }
  return entrance_pupil_mm(lens) * relative;
}

double blur_disc_mm(double focal_length_mm, double f_number, double focus_mm, double subject_mm) {
  const Lens lens{.focal_length_mm = focal_length_mm, .f_number = f_number};
  return std::abs(signed_blur_disc_mm(lens, focus_mm, subject_mm));
}

}  // namespace focusfall
