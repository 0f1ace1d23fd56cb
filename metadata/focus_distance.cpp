#include "metadata/focus_distance.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace focusfall {

FocusDistance distance_within(double value_m, double relative_bound) {
  return {value_m, value_m * (1 - relative_bound), value_m * (1 + relative_bound), false};
}

FocusDistance distance_between(double a_m, double b_m) {
  const double low = std::min(a_m, b_m), high = std::max(a_m, b_m);
  // Rounding must not put the value outside two ends that are the same.
  return {std::clamp(2 / (1 / low + 1 / high), low, high), low, high, false};
}

FocusDistance distance_at_infinity(double low_m) {
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  return {kInfinity, low_m, kInfinity, false};
}

void allow_for_origin(FocusDistance& distance, std::optional<double> focal_length_mm) {
  constexpr double kCloseUpFocalLengths = 10;
  if (!focal_length_mm || !(distance.value_m < kCloseUpFocalLengths * *focal_length_mm / 1000)) return;
  const double focal_length_m = *focal_length_mm / 1000;
  // A focus distance is never below four focal lengths from the sensor, nor one from the lens.
  distance.low_m = std::max({distance.low_m - focal_length_m, 0.0, std::min(distance.low_m, focal_length_m)});
  distance.high_m += focal_length_m;
}

}  // namespace focusfall
