// The model of one shot: everything that follows from its settings alone.
#pragma once

#include <optional>
#include <string>

#include "analysis/optics/prediction.h"
#include "analysis/optics/system_response.h"
#include "analysis/optics/thin_lens.h"

namespace focusfall {

// Fills every field that numbers alone decide; a field is absent where something that it needs is absent. Left open
// are blur_disc_px and edge_rise_px, which come from the forward model of the estimator.
//  - Limits, hyperfocal distance and depth of focus are those of the *acceptable* blur of this prediction.
//  - Distances are from `distance_from`, as the setup's are.
//  - near_limit_bounds_m and far_limit_bounds_m carry the interval of the focus distance through.
//  - Without a focus distance airy_diameter_px, mid_tone_level and the motion by a turning camera are those of a lens
//    focused at infinity, a little less than what they are.
//  - motion_blur_px needs an angular rate or a subject speed. Given both, their lengths are added: the directions are
//    not known and this is the worst case. With flash, only its duration counts, and unless it is known there is none.
//  - mid_tone_level is that of the scene luminance, at the exact values of the f-number and time marks, at most 1.
Prediction predict(const OpticalSetup& setup);

// Why the focus distance cannot be used, one sentence; nullopt where it can, or where there is none.
std::optional<std::string> focus_distance_problem(const OpticalSetup& setup);

// Blur of a point at some distance with the lens focused as the setup says.
struct BlurAtDistance {
  double distance_m = 0;                       // as asked, from setup.distance_from; may be infinite
  Interval signed_disc_um;                     // + = focus fell behind the point; bounds from the focus distance
  std::optional<Interval> signed_disc_px;
  std::optional<double> limits;                // signed disc / acceptable blur: -1 and +1 at the limits
  std::optional<double> edge_rise_px;          // 10-90 %, with diffraction and pixel, no camera processing
  std::optional<double> mtf50_cycles_per_px;
};

// nullopt without a usable focus distance, or for a point nearer than the lens can see (within its focal length).
std::optional<BlurAtDistance> blur_at(const OpticalSetup& setup, double distance_m);

// The lens, pixel and diffraction of the setup with a geometric disc of `disc_px` (0 = exactly in focus), for the
// forward model. Motion is left out. nullopt without a pixel pitch.
std::optional<SystemResponse> system_response(const OpticalSetup& setup, double disc_px);

// --- Parts of the above that solve.h and others share -------------------------------------------------------------

Lens lens_of(const OpticalSetup& setup);

// The pixel pitch, or the one that sensor size and picture size imply.
std::optional<double> pixel_pitch_um(const OpticalSetup& setup);

// Focus distance from the lens, mm; nullopt if absent or out of reach.
std::optional<double> focus_from_lens_mm(const OpticalSetup& setup);

// What to add to a distance from the lens, focused at `focus_mm`, to count it from setup.distance_from: the image
// distance for the sensor, else 0.
double origin_offset_mm(const OpticalSetup& setup, double focus_mm);

// What counts as sharp in this shot: the user's value, else by setup.acceptable_blur_rule.
struct AcceptableBlur {
  std::optional<double> px;
  std::optional<double> um;
};
AcceptableBlur acceptable_blur(const OpticalSetup& setup);

// Seconds that count for motion: the exposure time, with flash its duration; nullopt if unknown.
std::optional<double> motion_time_s(const OpticalSetup& setup);

// Speed of the image on the sensor, um/s, by the turning camera and the subject together (worst case); nullopt if
// neither is given, or a subject speed without a focus distance.
std::optional<double> image_speed_um_s(const OpticalSetup& setup);

// Light on the sensor from a surface of this luminance; needs setup.exposure_time_s. The marks of f-number and time
// are taken at their exact values.
double luminous_exposure_lx_s(const OpticalSetup& setup, double luminance_cd_m2);

}  // namespace focusfall
