// Where focus fell on a surface: the signed blur field l(x, y) = a x + b y + g fitted to local blur S = l^2 + S0.
//
// On any plane in the scene 1/d is affine in image coordinates, and so is the signed blur disc
//   l = K (1/d - 1/s) / pitch,   K = f^2 s / (N (s - f)),   d, s = distance of the surface and of focus from the lens.
//
// SIGN. l > 0 where the surface lies *nearer* than the plane of focus (1/d > 1/s): there focus fell behind it, back
// focus. l < 0 where the surface lies beyond the plane of focus: focus fell in front of it, front focus. l grows
// towards the near side of the picture. This is the sign of Verdict::defocus_um, so that
//   defocus_um = l x pixel_pitch_um x working f-number
// holds without a further sign.
//
// |l| is all that blur tells; the sign comes from knowing which side of the picture is nearer (the lower one as
// displayed, or what the user says), so a wrong near side turns front into back.
#pragma once

#include <optional>
#include <span>

#include "analysis/measure/measurement.h"

namespace focusfall {

// A local blur value from another estimator than edges (the spectral one), used beside the edges.
struct BlurSample {
  float x = 0, y = 0;             // centre, level-0 px of the unrotated frame
  float size_px = 0;              // side of the square it was measured on
  float squared_disc_px2 = 0;     // S, baseline not taken off
  float sigma_px = 0;             // standard error of c
};

struct PlaneOptions {
  int width_px = 0;                        // of the frame that edge positions refer to
  int height_px = 0;
  std::optional<NearSide> near_side;       // in the unrotated frame; absent: all four sides are tried
  FractionBox aim;                         // where the subject is, unrotated frame
  std::optional<double> contact_x;         // where the subject meets the surface, as the user gave it (fractions of
  std::optional<double> contact_y;         //   the unrotated frame); only the one across the near side is needed
  double direction_range_deg = 15;         // how far the horizon may lean
};

// The plane that carries the subject. std::nullopt where no surface is found: no plane, too few inliers, a slope that
// does not stand out. A PlaneReading is an accepted fit; its contact is `none` where the surface is not seen under
// the aim, and then at_contact_px is absent.
std::optional<PlaneReading> plane(std::span<const EdgeSample> edges, const PlaneOptions& options,
                                  std::span<const BlurSample> samples = {});

// Signed blur of the reading at a position (fractions of the frame), px, and its standard error.
struct SignedBlur {
  double value_px = 0;
  double sigma_px = 0;
};
SignedBlur signed_blur(const PlaneReading& reading, double x, double y);

// Disc that a region would show if it were blurred as the reading says, the blur on the line of best focus left out:
// |l| at the feet of a subject, the median of |l| over an aim that lies on the surface itself. px.
double expected_disc_px(const PlaneReading& reading, const FractionBox& aim);

}  // namespace focusfall
