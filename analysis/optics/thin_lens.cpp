#include "analysis/optics/thin_lens.h"

#include <cassert>
#include <cmath>

namespace focusfall {

double blur_disc_mm(double focal_length_mm, double f_number, double focus_mm, double subject_mm) {
  assert(focus_mm > focal_length_mm && subject_mm > 0 && f_number > 0);
  const double f = focal_length_mm;
  if (std::isinf(focus_mm)) return f * f / (f_number * subject_mm);
  const double relative = std::isinf(subject_mm) ? 1.0 : std::abs(subject_mm - focus_mm) / subject_mm;
  return f * f / (f_number * (focus_mm - f)) * relative;
}

}  // namespace focusfall
