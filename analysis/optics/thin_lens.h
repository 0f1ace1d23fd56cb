// The thin lens: image distance, magnification and blur disc.
#pragma once

namespace focusfall {

// Diameter, mm on the sensor, of the blur disc of a point at `subject_mm` when a lens of focal length
// `focal_length_mm` at `f_number` is focused at `focus_mm`, both distances from the lens (principal plane), > f.
//   c = f^2 / (N (s - f)) * |d - s| / d
double blur_disc_mm(double focal_length_mm, double f_number, double focus_mm, double subject_mm);

}  // namespace focusfall
