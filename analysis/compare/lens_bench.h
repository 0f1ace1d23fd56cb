// Two questions that a bench series answers beside the bias: where in a series over focus positions the best one lies,
// and with which f-number the lens really worked.
#pragma once

#include <optional>
#include <span>

#include "analysis/conventions.h"

namespace focusfall {

// One frame of a fixed surface with focus moved on: position at the sensor in um (any origin), S of the aim and its
// standard error, px^2.
struct FocusStep {
  double position_um = 0;
  double squared_disc_px2 = 0;
  double sigma_px2 = 0;
};

// The blur disc grows linearly to both sides of the best position, c = k |x - x0|: a V. Its square is a parabola on top
// of what the lens and the camera's processing leave at best, S = S0 + k^2 (x - x0)^2, linear in its coefficients.
struct BestFocus {
  Interval position_um;             // x0; bounds by Fieller (Some problems in interval estimation, 1954)
  double slope_px_per_um = 0;       // k = 1 / (pixel pitch x working f-number)
  double least_squared_disc_px2 = 0;// S0
  double freedom = 0;
  bool inside = false;              // x0 lies between the outermost positions
};

// Nothing from fewer than five positions, or where the series shows no valley (k^2 is not clearly above zero).
std::optional<BestFocus> best_focus(std::span<const FocusStep> steps);

// How a textured plane of known attitude lay before the camera.
struct SurfaceAttitude {
  std::optional<double> tilt_rad{};         // of the surface away from square-on, 0 < tilt < pi/2; or
  std::optional<double> camera_height_m{}; // of the lens above level ground, > 0
};

// What one frame's plane fit says about the diaphragm.
struct SlopeReading {
  double slope = 0;                 // |gradient of the signed blur disc|, px per px
  double focal_length_mm = 0;
  double focus_distance_mm = 0;     // from the lens, finite
  double blur_at_centre_mm = 0;     // signed blur disc on the sensor at the optical axis
  double marked_f_number = 0;
};

// N = f tan(tilt) / (k d) for a tilted surface, N = f cos(pitch) / (k h) for level ground, with d the distance of the
// surface on the axis and sin(pitch) = h / d. Both follow from l = K (1/s - 1/d) with 1/d affine in the image. Nothing
// where the geometry cannot be: a camera higher above ground than the ground is far.
std::optional<double> f_number_from_slope(const SlopeReading& reading, const SurfaceAttitude& attitude);

struct DiaphragmReading {
  Interval f_number;
  double stops_wider = 0;           // than marked: 2 log2(marked / measured)
  double stops_low = 0, stops_high = 0;
};

// Robust mean over frames, in stops; the floor is kSlopeFloorStops. From three frames on.
std::optional<DiaphragmReading> diaphragm(std::span<const double> f_numbers, double marked_f_number);

// What more frames do not take away, 95 %: slopes on bold surfaces were right to 3 % in N, .09 stop (rendered sets);
// fine texture reads too wide an f-number by more, since its edges under-read the blur.
inline constexpr double kSlopeFloorStops = 0.09;

}  // namespace focusfall
