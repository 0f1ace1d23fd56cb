// Focus distances with what is known of their uncertainty.
#pragma once

#include <optional>

#include "metadata/capture.h"

namespace focusfall {

// A distance with a relative 95 % half width.
FocusDistance distance_within(double value_m, double relative_bound);

// A distance that is only known to lie between two others, in either order; the ends may be infinite. The value is the
// middle of the two in 1/distance, in which blur is linear.
FocusDistance distance_between(double a_m, double b_m);

// What a lens or a writer calls infinity where nothing says from where on (judgement: short lenses give their last
// distance before it at some ten metres).
inline constexpr double kInfinityFromM = 15;

// At infinity, from `low_m` on.
FocusDistance distance_at_infinity(double low_m);

// No file says whether distances count from the sensor or from the lens. Close up, below ten focal lengths, where that
// matters, one focal length either way belongs to the uncertainty.
void allow_for_origin(FocusDistance& distance, std::optional<double> focal_length_mm);

}  // namespace focusfall
