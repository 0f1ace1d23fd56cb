// Conventions of the analysis, stated once.
//
// Light        linear, 1.0 = the clipping level of the picture.
// Pixels       centres at integers; x to the right, y down; the unrotated sensor frame.
// Regions      PixelRect in whole pixels of the unrotated frame, FractionBox in fractions of it.
// Blur         c = diameter in px of the uniform disc that would blur an edge as much; stored, averaged and combined
//              as S = c^2 ("squared disc", px^2), which adds; S < 0 means sharper than the camera's own baseline.
// Defocus      positive = the plane of focus fell *behind* the subject (back focus), negative = in front of it.
// Distances    from the sensor plane unless said otherwise; infinity is std::numeric_limits<double>::infinity().
// Intervals    low and high are 95 % bounds.
#pragma once

#include <algorithm>
#include <cmath>

namespace focusfall {

struct PixelRect {
  int x = 0;
  int y = 0;
  int width = 0;
  int height = 0;
};

// Fractions of the unrotated frame: top-left corner, width, height.
struct FractionBox {
  double x = 0;
  double y = 0;
  double width = 0;
  double height = 0;
};

// low <= value <= high, one unit.
struct Interval {
  double value = 0;
  double low = 0;
  double high = 0;
};

// Equivalent disc diameter, px, of a squared disc; 0 for one sharper than the baseline.
inline double blur_disc_px(double squared_disc_px2) { return std::sqrt(std::max(squared_disc_px2, 0.0)); }

}  // namespace focusfall
