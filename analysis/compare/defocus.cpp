// Signed blur in micrometres, in limits of the depth of field, and in metres at the subject.
#include <algorithm>
#include <cmath>
#include <optional>

#include "analysis/compare/compare.h"

namespace focusfall {
namespace {

// Usual acceptable blur and its floor, px of the delivered picture (design.md: judgement).
constexpr double kLeastAcceptableBlurPx = 2;

double half_low(const Interval& i) { return i.value - i.low; }
double half_high(const Interval& i) { return i.high - i.value; }

// Focus distance from the lens of one given from the sensor plane: D = s + s f/(s - f), the far solution of
// s^2 - D s + D f = 0. Nothing is in focus nearer than 4 f to the sensor.
std::optional<double> from_lens_mm(double distance_mm, double focal_length_mm, DistanceOrigin origin) {
  if (origin == DistanceOrigin::lens)
    return distance_mm > focal_length_mm ? std::optional(distance_mm) : std::nullopt;
  const double root = distance_mm * distance_mm - 4 * distance_mm * focal_length_mm;
  if (!(root >= 0)) return std::nullopt;
  return (distance_mm + std::sqrt(root)) / 2;
}

// Focus distance - subject distance, m, of a signed blur on the sensor:
//   1/d = 1/s + l/K,   K = f^2 s / (N (s - f)).
// Nothing where focus stood at infinity, or where the blur puts the subject beyond it.
std::optional<double> offset_m(const OpticalSetup& setup, double focus_distance_m, double signed_blur_mm) {
  if (!std::isfinite(focus_distance_m)) return std::nullopt;
  const double f = setup.focal_length_mm;
  const auto s = from_lens_mm(focus_distance_m * 1000, f, setup.distance_from);
  if (!s) return std::nullopt;
  const double k_mm2 = f * f * *s / (setup.f_number * (*s - f));
  const double inverse_subject = 1 / *s + signed_blur_mm / k_mm2;
  if (!(inverse_subject > 0)) return std::nullopt;
  return (*s - 1 / inverse_subject) / 1000;
}

std::optional<Interval> offset_interval_m(const Interval& blur_px, const OpticalSetup& setup) {
  const Interval& focus = *setup.focus_distance_m;
  const double pitch_mm = setup.pixel_pitch_um->value / 1000;
  const auto value = offset_m(setup, focus.value, blur_px.value * pitch_mm);
  const auto blur_low = offset_m(setup, focus.value, blur_px.low * pitch_mm);
  const auto blur_high = offset_m(setup, focus.value, blur_px.high * pitch_mm);
  const auto focus_low = offset_m(setup, focus.low, blur_px.value * pitch_mm);
  const auto focus_high = offset_m(setup, focus.high, blur_px.value * pitch_mm);
  if (!value || !blur_low || !blur_high || !focus_low || !focus_high) return std::nullopt;

  // The offset grows with l; a farther focus distance stretches it, away from zero on either side. Blur and recorded
  // distance are independent: their deviations add in squares.
  const double down = std::min(*focus_low, *focus_high) - *value, up = std::max(*focus_low, *focus_high) - *value;
  return Interval{*value, *value - std::hypot(*value - *blur_low, std::min(down, 0.0)),
                  *value + std::hypot(*blur_high - *value, std::max(up, 0.0))};
}

}  // namespace

double acceptable_blur_px(const Prediction& prediction) {
  return prediction.acceptable_blur_px.value_or(kLeastAcceptableBlurPx);
}

Defocus defocus(const Interval& blur_px, const std::optional<OpticalSetup>& setup, const Prediction& prediction) {
  Defocus result;
  const double limit_px = acceptable_blur_px(prediction);
  result.limits = Interval{blur_px.value / limit_px, blur_px.low / limit_px, blur_px.high / limit_px};
  if (!setup || !setup->pixel_pitch_um) return result;

  // delta z = c N_working, by the cone of light behind the exit pupil; exact for any focus distance.
  const Interval& pitch_um = *setup->pixel_pitch_um;
  const double scale_um = pitch_um.value * prediction.working_f_number.value_or(setup->f_number);
  const double value_um = blur_px.value * scale_um;
  const double pitch_low = std::abs(value_um) * half_low(pitch_um) / pitch_um.value;
  const double pitch_high = std::abs(value_um) * half_high(pitch_um) / pitch_um.value;
  result.um = Interval{value_um, value_um - std::hypot(half_low(blur_px) * scale_um, pitch_low),
                       value_um + std::hypot(half_high(blur_px) * scale_um, pitch_high)};
  if (setup->focus_distance_m) result.offset_m = offset_interval_m(blur_px, *setup);
  return result;
}

}  // namespace focusfall
