// The verdict as a photographer would say it: one sentence on focus, one on exposure where there is something to say.
#pragma once

#include <optional>
#include <string>

#include "analysis/compare/compare.h"
#include "analysis/compare/verdict.h"
#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"

namespace focusfall {

// What the sentences need beside the finished verdict.
struct SummaryFacts {
  double acceptable_blur_px = 0;
  std::optional<Interval> aim_blur_px2;        // baseline taken off; along the movement where there is one
  bool lower_bound_only = false;               // the aim is blurred at least this much
  bool aim_assumed = false;                    // and not trusted
  double diffraction_px2 = 0;
  std::optional<double> f_number;
  std::optional<double> motion_length_px;      // significant motion only
  std::optional<double> best_blur_px2;         // of the sharpest region, where the aim was missed
  std::optional<double> softer_blur_px2;       // of the part of the subject that is outside the depth of field
  std::optional<Clipping> clipping;
};

std::string summary(const Verdict& verdict, const SummaryFacts& facts);

}  // namespace focusfall
