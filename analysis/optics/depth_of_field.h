// Limits of the depth of field, hyperfocal distance and depth of focus, from the exact formula of the thin lens.
//
// `blur_mm` is the largest disc that still counts as sharp. Distances from the lens, as in thin_lens.h.
#pragma once

#include "analysis/optics/thin_lens.h"

namespace focusfall {

// An unbounded far limit is infinity, and far_infinite() says so; it is never a large number.
struct DepthLimits {
  double near_mm = 0;
  double far_mm = 0;

  bool far_infinite() const;
  double depth_mm() const { return far_mm - near_mm; }   // infinite with the far limit
};

// Nearest and farthest point whose blur disc is at most `blur_mm` with the lens focused at `focus_mm` > f or infinity.
// From the entrance pupil the limits are u / (1 + q) and u / (1 - q) with q = N c / (f m); for a symmetric lens that is
//   s H0 / (H0 + (s - f)), s H0 / (H0 - (s - f)), H0 = f^2 / (N c).
// The far limit is infinite from q = 1 on, the hyperfocal setting; focused at infinity the near limit is H0.
DepthLimits depth_limits(const Lens& lens, double focus_mm, double blur_mm);

// The two limits about a focus distance measured from the entrance pupil, for a given q >= 0.
DepthLimits limits_about(double focus_from_pupil_mm, double q);

// Nearest focus setting whose far limit is infinite: H = f^2 / (N c) + f.
double hyperfocal_mm(const Lens& lens, double blur_mm);

// Play of the sensor along the axis within which a point in focus blurs to at most `blur_mm`, both sides together:
// 2 c N (1 + m / P).
double depth_of_focus_mm(const Lens& lens, double magnification, double blur_mm);

}  // namespace focusfall
