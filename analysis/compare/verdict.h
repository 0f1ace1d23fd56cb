// The verdict on one frame: prediction against measurement. The `verdict` object of the JSON record.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "analysis/conventions.h"

namespace focusfall {

enum class FocusVerdict { on, front, back, off, unsure, no_evidence };
enum class Cause { defocus, subject_motion, camera_shake, motion, diffraction, shallow_depth_of_field, missed_aim };
enum class ExposureVerdict { as_predicted, over, under, unknown };
enum class ClippedVerdict { none, points, area, colour };

const char* focus_verdict_name(FocusVerdict verdict);       // "on" ... "no evidence"
const char* cause_name(Cause cause);                        // "subject motion" ...
const char* exposure_verdict_name(ExposureVerdict verdict); // "as predicted" ...

struct Verdict {
  FocusVerdict focus = FocusVerdict::no_evidence;
  std::vector<Cause> causes;
  bool panned = false;                               // subject motion seen by a following camera
  std::optional<Interval> defocus_um;                // signed, + = focus fell behind the subject
  std::optional<Interval> defocus_limits;            // in limits of the depth of field
  std::optional<Interval> focus_offset_m;            // focus distance - subject distance
  ExposureVerdict exposure = ExposureVerdict::unknown;
  std::optional<Interval> exposure_error_ev;
  bool clipped = false;
  std::optional<double> pull_back_ev;
  std::string summary;                               // one or two plain sentences
};

}  // namespace focusfall
