#include "analysis/optics/acceptable_blur.h"

#include <algorithm>
#include <cassert>
#include <cmath>

namespace focusfall {

double circle_of_confusion(double width, double height) { return std::hypot(width, height) / 1500; }

double acceptable_blur_px(int width_px, int height_px, int delivered_width_px) {
  assert(width_px > 0 && height_px > 0 && delivered_width_px >= 0);
  const int wanted_px = delivered_width_px > 0 ? delivered_width_px : kLargestDeliveredWidthPx;
  const double reduction = static_cast<double>(width_px) / std::min(wanted_px, width_px);
  const double largest_px = circle_of_confusion(width_px, height_px);
  return std::max(kDeliveredBlurPx, std::min(kDeliveredBlurPx * reduction, largest_px));
}

}  // namespace focusfall
