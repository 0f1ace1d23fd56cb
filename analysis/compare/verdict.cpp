#include "analysis/compare/verdict.h"

namespace focusfall {

const char* focus_verdict_name(FocusVerdict verdict) {
  switch (verdict) {
    case FocusVerdict::on: return "on";
    case FocusVerdict::front: return "front";
    case FocusVerdict::back: return "back";
    case FocusVerdict::off: return "off";
    case FocusVerdict::unsure: return "unsure";
    case FocusVerdict::no_evidence: return "no evidence";
  }
  return "no evidence";
}

const char* cause_name(Cause cause) {
  switch (cause) {
    case Cause::defocus: return "defocus";
    case Cause::subject_motion: return "subject motion";
    case Cause::camera_shake: return "camera shake";
    case Cause::motion: return "motion";
    case Cause::diffraction: return "diffraction";
    case Cause::shallow_depth_of_field: return "shallow depth of field";
    case Cause::missed_aim: return "missed aim";
  }
  return "motion";
}

const char* exposure_verdict_name(ExposureVerdict verdict) {
  switch (verdict) {
    case ExposureVerdict::as_predicted: return "as predicted";
    case ExposureVerdict::over: return "over";
    case ExposureVerdict::under: return "under";
    case ExposureVerdict::unknown: return "unknown";
  }
  return "unknown";
}

}  // namespace focusfall
