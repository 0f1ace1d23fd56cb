// The model turned round: which setting holds a depth, a blur or a brightness.
//
// Every function takes the setup of the shot and ignores the one value that it solves for, so that may be left at its
// default. Distances in metres from setup.distance_from. Instead of a value there may be one sentence that says why
// there is none.
#pragma once

#include <string>
#include <tl/expected.hpp>

#include "analysis/optics/prediction.h"

namespace focusfall {

struct NoSolution {
  std::string reason;   // one plain sentence with numbers and units
};
template <class T>
using Solved = tl::expected<T, NoSolution>;

// An f-number, exact (round with f_number_mark_at_least for the ring), the focus distance that goes with it, what
// depth that covers and what it costs in diffraction.
struct SolvedFNumber {
  double f_number = 0;
  double focus_distance_m = 0;
  double near_limit_m = 0;
  double far_limit_m = 0;              // may be infinite
  double airy_diameter_um = 0;         // at the working f-number
  bool diffraction_exceeds_blur = false;   // the Airy disc alone is larger than the acceptable blur
};

// What lenses can do; a result outside is no solution. Judgement: no photographic lens opens or closes further.
inline constexpr double kWidestFNumber = 0.7;
inline constexpr double kNarrowestFNumber = 128;

// Smallest f-number, and the best focus distance with it, that keeps all from near to far (which may be infinite)
// inside the acceptable blur. Any setup.focus_distance_m is ignored. Never below kWidestFNumber.
Solved<SolvedFNumber> f_number_for_limits(const OpticalSetup& setup, double near_m, double far_m);

// The same with the focus distance of the setup kept.
Solved<SolvedFNumber> f_number_for_limits_at_focus(const OpticalSetup& setup, double near_m, double far_m);

// f-number whose limits lie `depth_m` apart (may be infinite: the hyperfocal setting) at the setup's focus distance.
Solved<SolvedFNumber> f_number_for_depth(const OpticalSetup& setup, double depth_m);

// Smallest f-number that keeps the blur disc of a point at `distance_m` within `blur_um`.
Solved<SolvedFNumber> f_number_for_blur(const OpticalSetup& setup, double distance_m, double blur_um);

// f-number that renders the scene luminance at a linear level of the picture (kMidToneLevel for a mid-tone).
Solved<double> f_number_for_level(const OpticalSetup& setup, double level);
// f-number for an exposure value EV at the setup's exposure time.
Solved<double> f_number_for_exposure_value(const OpticalSetup& setup, double ev);

// Focus distance from which on the depth of field reaches `depth_m` at the setup's f-number, 1:1 or farther.
Solved<double> distance_for_depth_m(const OpticalSetup& setup, double depth_m);

// Nearest and farthest point whose blur disc stays within `blur_um` at the setup's focus distance and f-number.
struct SolvedRange {
  double near_m = 0;
  double far_m = 0;   // may be infinite
};
Solved<SolvedRange> range_for_blur_m(const OpticalSetup& setup, double blur_um);

// Longest exposure during which the image moves by at most `blur_um`, from setup.angular_rate_rad_s and
// setup.subject_speed_m_s (added: worst case). Flash is left out of account: this is for the light that stays on.
Solved<double> exposure_time_for_motion_s(const OpticalSetup& setup, double blur_um);

// Exposure time that renders the scene luminance at a linear level of the picture.
Solved<double> exposure_time_for_level_s(const OpticalSetup& setup, double level);
// Exposure time for an exposure value EV at the setup's f-number.
Solved<double> exposure_time_for_exposure_value_s(const OpticalSetup& setup, double ev);

}  // namespace focusfall
