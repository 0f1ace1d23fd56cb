// Tilt and curvature of the field of focus from frames of a flat wall, square-on.
//
// The signed blur disc over the frame is l = g + a x + b y + h (x^2 + y^2), with x to the right and y down from the
// centre in half diagonals of the frame; measured is S = l^2 + S0. One frame leaves the sign open: l and -l blur alike.
// Over a series with focus moved in a known direction g moves with it, and a, b, h, which stay, get their sign.
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "analysis/conventions.h"

namespace focusfall {

struct FieldTile {
  double x = 0, y = 0;              // half diagonals from the centre; unrotated frame
  double squared_disc_px2 = 0;
  double sigma_px2 = 0;             // > 0
};

enum class FocusTravel { near_to_far, far_to_near, unknown };

// px of signed blur disc; positive where focus fell behind the wall.
struct FieldFit {
  double x_tilt_px = 0, y_tilt_px = 0;   // a, b: from the centre to one half diagonal
  double x_sigma_px = 0, y_sigma_px = 0;
  Interval tilt_px;                 // sqrt(a^2 + b^2), low >= 0
  double axis_deg = 0;              // along which focus changes most, 0..180 from +x towards +y
  Interval curvature_px;            // h; its size where the sign is not known
  bool signed_field = false;        // true: a, b and h carry their sign
  double chi2_per_freedom = 0;
};

// One entry a frame, in the order of the focus travel. Nothing where a frame has fewer than kLeastFieldTiles tiles, or
// where no field fits. The sign is known from three frames on, where the travel shows clearly.
std::optional<FieldFit> field_of_focus(std::span<const std::vector<FieldTile>> frames, FocusTravel travel);

inline constexpr int kLeastFieldTiles = 12;

// Two signed fits, the second with the camera upside down: what stays with the sensor, and what turned with the wall.
struct FieldParts {
  double camera_x_px = 0, camera_y_px = 0, camera_sigma_px = 0;   // lens and body together
  double wall_x_px = 0, wall_y_px = 0, wall_sigma_px = 0;
};
FieldParts field_parts(const FieldFit& upright, const FieldFit& upside_down);

}  // namespace focusfall
