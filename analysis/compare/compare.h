// Prediction against measurement: the verdict on one frame.
//
// Words. `on`: the upper 95 % bound of the blur at the aim is inside the acceptable blur. `front`, `back`, `off`: the
// lower bound is outside, whatever the cause (motion and diffraction too); `front` and `back` only where the plane of
// the surface tells the side. `unsure` between. `no evidence`: nothing at the aim can be measured, and no bound helps.
//
// Baseline. S of an edge holds what the camera's processing added (sharpening takes 2.7 to 5.6 px^2 off, demosaicing
// adds 3 to 5). Its uncertainty is carried into the bounds; see blur_after_baseline().
#pragma once

#include <optional>

#include "analysis/compare/verdict.h"
#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"

namespace focusfall {

struct CompareOptions {
  bool aim_assumed = false;                    // the aim is the centre because nothing named one (design.md, Aim)
  bool trust_centre = false;                   // --trust-centre: treat that centre as if it had been named
  std::optional<double> aim_lower_bound_px;    // from like-framed neighbours whose aim shows edges that this one lost
  bool brightness_predicts = false;            // brightness value recorded, manual exposure, no flash: the mid-tone
                                               //   level of the prediction is a statement about this frame
  std::optional<Interval> exposure_error_ev;   // from a set under one light; wins over brightness_predicts
};

// Signed blur and what it means, each with 95 % bounds; absent where what it needs is not known.
struct Defocus {
  std::optional<Interval> um;        // l x pixel pitch x working f-number; + = focus fell behind the subject
  std::optional<Interval> limits;    // l / acceptable blur
  std::optional<Interval> offset_m;  // focus distance - subject distance
};

// `setup` is absent where focal length or f-number is unknown; then neither micrometres nor metres are given.
Verdict compare(const std::optional<OpticalSetup>& setup, const Prediction& prediction,
                const Measurement& measurement, const CompareOptions& options = {});

// S of a region with the baseline taken off and with bounds that hold the baseline's uncertainty: the numbers of the
// record (squared_disc_px2, and blur_disc_px(...) of value, low, high) and of the verdict alike. `reading` is the aim's
// or the best region's estimate out of `measurement`.
Interval blur_after_baseline(const BlurEstimate& estimate, const Prediction& prediction,
                             const Measurement& measurement);

// The three forms of a signed blur of `signed_blur_px` (low, high = its bounds).
Defocus defocus(const Interval& signed_blur_px, const std::optional<OpticalSetup>& setup,
                const Prediction& prediction);

// Acceptable blur: the prediction's, else 2 px (never below: design.md, How much blur is too much).
double acceptable_blur_px(const Prediction& prediction);

}  // namespace focusfall
