#include "analysis/compare/compare.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "analysis/compare/baseline.h"
#include "analysis/compare/summary.h"
#include "analysis/measure/motion.h"
#include "analysis/measure/plane.h"

namespace focusfall {
namespace {

constexpr double k95 = 1.959964;

// A side is called where the signed blur stands out, the slope too, and the aim is as blurred as the surface at the
// contact. Measured on rendered frames without a wrong side.
constexpr double kSideSignificance = 2.5;
constexpr double kSideFloorPx = 0.08;          // no plane fit is truer than that, whatever its residuals say
constexpr double kSlopeSignificance = 3;
constexpr double kBlurAgreement = 2;           // standard deviations between |l| and the blur at the aim
constexpr double kBaselineOfPlanePx2 = 1;      // uncertainty of the blur left on the line of best focus

// Predicted diffraction and measured blur agree to 3 % in c, 6 % in S.
constexpr double kDiffractionScatter = 0.06;

// The same movement in aim and background: lengths within their bounds, directions within 15 degrees (three times the
// error that either may have).
constexpr double kSameDirectionDeg = 15;
constexpr double kPannedRatio = 1.5;           // background longer than the subject's movement
constexpr double kStillRatio = 0.6;            // background shorter

// A part of the aim that is softer than this many acceptable blurs is background rather than the same subject: judgement.
constexpr double kSameSubjectLimits = 4;

// Brightness against prediction: what a recorded brightness value, the meter's constant (10.6 to 13.4 are in use) and
// the tone curve leave open, 95 %; and how far a frame may stray unnoticed. Judgement.
constexpr double kExposureHalfWidthEv = 0.5;
constexpr double kExposureToleranceEv = 0.33;

// The blur at the aim in its parts, S with its bounds, baseline taken off.
struct AimBlur {
  Interval worst_px2;              // across the worst direction: this is judged
  Interval isotropic_px2;          // defocus, diffraction
  double isotropic_raw_px2 = 0;    // baseline left on, as the plane's values are
  double isotropic_sigma_px2 = 0;
  Bound bound = Bound::none;
  bool moved = false;
};

BlurEstimate estimate_of(double squared_disc_px2, double sigma) {
  BlurEstimate estimate;
  estimate.squared_disc_px2 = squared_disc_px2;
  estimate.squared_disc_low_px2 = squared_disc_px2 - k95 * sigma;
  estimate.squared_disc_high_px2 = squared_disc_px2 + k95 * sigma;
  return estimate;
}

std::optional<AimBlur> aim_blur(const Measurement& measurement, const BaselinePosterior& baseline,
                                const CompareOptions& options) {
  AimBlur blur;
  if (!measurement.aim_blur.estimate) {
    if (!options.aim_lower_bound_px) return std::nullopt;
    // No edge is left where neighbouring frames show some: at least that blurred, without an upper end.
    const double bound_px2 = *options.aim_lower_bound_px * *options.aim_lower_bound_px;
    blur.worst_px2 = blur.isotropic_px2 = {bound_px2, bound_px2, std::numeric_limits<double>::infinity()};
    blur.bound = Bound::lower;
    return blur;
  }
  const BlurEstimate& estimate = *measurement.aim_blur.estimate;
  blur.bound = estimate.bound;
  blur.worst_px2 = blur.isotropic_px2 = baseline.corrected(estimate);
  blur.isotropic_raw_px2 = estimate.squared_disc_px2;
  blur.isotropic_sigma_px2 = sigma_px2(estimate);

  const auto& motion = measurement.motion;
  if (motion && motion_is_significant(*motion, baseline.expected_px2())) {
    blur.moved = true;
    blur.isotropic_raw_px2 = motion->isotropic_squared_disc_px2;
    blur.isotropic_sigma_px2 = motion->anisotropy_sigma_px2;
    blur.isotropic_px2 = baseline.corrected(estimate_of(blur.isotropic_raw_px2, blur.isotropic_sigma_px2));
    blur.worst_px2 = baseline.corrected(
        estimate_of(blur.isotropic_raw_px2 + motion->anisotropy_px2, motion->anisotropy_sigma_px2));
  }
  return blur;
}

bool outside(const Interval& squared_disc_px2, double limit_px) {
  return squared_disc_px2.low > 0 && std::sqrt(squared_disc_px2.low) > limit_px;
}

bool inside(const Interval& squared_disc_px2, double limit_px) {
  return std::sqrt(std::max(squared_disc_px2.high, 0.0)) < limit_px;
}

// +1 = focus fell behind, -1 = in front, 0 = the plane does not tell.
int side(const std::optional<PlaneReading>& plane, const FractionBox& aim, const AimBlur& blur) {
  if (!plane || plane->contact == Contact::none || !plane->at_contact_px || blur.bound == Bound::lower) return 0;
  const double l = plane->at_contact_px->value, sigma = plane->at_contact_sigma_px;
  if (!(std::abs(l) > kSideSignificance * std::hypot(sigma, kSideFloorPx))) return 0;
  const double slope = std::hypot(plane->x_gradient_px, plane->y_gradient_px);
  if (!(slope > kSlopeSignificance * plane->gradient_sigma_px)) return 0;

  // |l| is what is left of the aim's blur without the blur on the line of best focus; the baseline cancels. Where it
  // is small its error is that of S itself.
  const double expected_px = expected_disc_px(*plane, aim);
  const double excess_px2 = std::max(blur.isotropic_raw_px2 - plane->residual_squared_disc_px2, 0.0);
  const double disc_px = std::sqrt(excess_px2);
  const double excess_sigma_px2 = std::hypot(blur.isotropic_sigma_px2, kBaselineOfPlanePx2);
  const double disc_sigma_px = excess_sigma_px2 / (2 * std::max(disc_px, std::sqrt(excess_sigma_px2) / 2));
  if (!(std::abs(expected_px - disc_px) < kBlurAgreement * std::hypot(sigma, disc_sigma_px))) return 0;
  return l > 0 ? 1 : -1;
}

// Who moved, from the background's own reading.
Cause motion_cause(const MotionReading& subject, const std::optional<MotionReading>& background, bool& panned) {
  panned = false;
  if (!background) return Cause::motion;
  const bool same_direction =
      std::abs(std::remainder(subject.angle_deg - background->angle_deg, 180.0)) <= kSameDirectionDeg;
  if (motion_is_significant(*background) && same_direction) {
    if (background->length_low_px <= subject.length_high_px && subject.length_low_px <= background->length_high_px)
      return Cause::camera_shake;
    if (background->length_px > kPannedRatio * subject.length_px) {
      panned = true;
      return Cause::subject_motion;
    }
  }
  if (motion_length_bound_px(*background, subject.angle_deg) < kStillRatio * subject.length_px)
    return Cause::subject_motion;
  return Cause::motion;
}

// Defocus is a cause where diffraction alone would have been inside and the isotropic blur is outside, or where what
// goes beyond diffraction is outside by itself.
bool defocused(const AimBlur& blur, double diffraction_px2, double limit_px) {
  if (!outside(blur.isotropic_px2, limit_px)) return false;
  const double limit_px2 = limit_px * limit_px;
  return diffraction_px2 < limit_px2 ||
         blur.isotropic_px2.low - (1 + kDiffractionScatter) * diffraction_px2 > limit_px2;
}

bool boxes_overlap(const FractionBox& a, const FractionBox& b) {
  return a.x < b.x + b.width && b.x < a.x + a.width && a.y < b.y + b.height && b.y < a.y + a.height;
}

// Something else in the frame is on.
std::optional<double> elsewhere_on_px2(const Measurement& measurement, const BaselinePosterior& baseline,
                                       double limit_px) {
  if (!measurement.best || !measurement.best->reading.estimate) return std::nullopt;
  if (boxes_overlap(measurement.best->box, measurement.aim.box)) return std::nullopt;
  const Interval best = baseline.corrected(*measurement.best->reading.estimate);
  if (!inside(best, limit_px)) return std::nullopt;
  return best.value;
}

// The softer part of a mixed aim, where it is outside and still the same subject.
std::optional<double> softer_part_px2(const Measurement& measurement, const BaselinePosterior& baseline,
                                      double limit_px) {
  if (!measurement.aim_softer_part) return std::nullopt;
  const Interval softer = baseline.corrected(*measurement.aim_softer_part);
  if (!outside(softer, limit_px) || softer.value > std::pow(kSameSubjectLimits * limit_px, 2)) return std::nullopt;
  return softer.value;
}

void judge_exposure(const Prediction& prediction, const Measurement& measurement, const CompareOptions& options,
                    Verdict& verdict) {
  verdict.clipped = measurement.clipping && (measurement.clipping->kind == ClippedKind::area ||
                                             measurement.clipping->kind == ClippedKind::points);
  verdict.exposure_error_ev = options.exposure_error_ev;
  if (!verdict.exposure_error_ev && options.brightness_predicts && prediction.mid_tone_level && measurement.tone &&
      *prediction.mid_tone_level > 0 && measurement.tone->mean_linear > 0) {
    // The brightness value is an average of the scene, so the average of the picture answers to it.
    const double error = std::log2(measurement.tone->mean_linear / *prediction.mid_tone_level);
    verdict.exposure_error_ev = Interval{error, error - kExposureHalfWidthEv, error + kExposureHalfWidthEv};
  }
  if (!verdict.exposure_error_ev) return;
  const Interval& error = *verdict.exposure_error_ev;
  if (error.low > kExposureToleranceEv) {
    verdict.exposure = ExposureVerdict::over;
    verdict.pull_back_ev = error.value;
  } else if (error.high < -kExposureToleranceEv) {
    verdict.exposure = ExposureVerdict::under;
  } else if (error.low <= 0 && 0 <= error.high) {
    verdict.exposure = ExposureVerdict::as_predicted;
  }
}

// Focus word and causes of a blur that was measured.
void judge_focus(const Measurement& measurement, const BaselinePosterior& baseline, const AimBlur& blur,
                 double limit_px, Verdict& verdict, SummaryFacts& facts) {
  const bool is_outside = outside(blur.worst_px2, limit_px) && blur.bound != Bound::upper;
  if (!is_outside) {
    const bool is_inside = inside(blur.worst_px2, limit_px) && blur.bound != Bound::lower;
    verdict.focus = is_inside ? FocusVerdict::on : FocusVerdict::unsure;
    if (is_inside && (facts.softer_blur_px2 = softer_part_px2(measurement, baseline, limit_px)))
      verdict.causes.push_back(Cause::shallow_depth_of_field);
    return;
  }

  verdict.focus = FocusVerdict::off;
  if (defocused(blur, baseline.diffraction_px2(), limit_px)) {
    verdict.causes.push_back(Cause::defocus);
    const int which = side(measurement.plane, measurement.aim.box, blur);
    if (which != 0) verdict.focus = which > 0 ? FocusVerdict::back : FocusVerdict::front;
  }
  if (blur.moved) {
    verdict.causes.push_back(motion_cause(*measurement.motion, measurement.background_motion, verdict.panned));
    facts.motion_length_px = measurement.motion->length_px;
  }
  if (baseline.diffraction_px2() > limit_px * limit_px) verdict.causes.push_back(Cause::diffraction);
  const bool focus_fell_elsewhere =
      std::find(verdict.causes.begin(), verdict.causes.end(), Cause::defocus) != verdict.causes.end();
  if (focus_fell_elsewhere && (facts.best_blur_px2 = elsewhere_on_px2(measurement, baseline, limit_px)))
    verdict.causes.push_back(Cause::missed_aim);
}

// An aim that nothing named may be on; it cannot be off, for the subject may be elsewhere.
void hold_back_assumed_aim(Verdict& verdict) {
  const bool outside_words = verdict.focus == FocusVerdict::front || verdict.focus == FocusVerdict::back ||
                             verdict.focus == FocusVerdict::off;
  if (outside_words) verdict.focus = FocusVerdict::unsure;
  verdict.causes.clear();
  verdict.panned = false;
}

}  // namespace

Interval blur_after_baseline(const BlurEstimate& estimate, const Prediction& prediction,
                             const Measurement& measurement) {
  return BaselinePosterior(prediction, measurement).corrected(estimate);
}

Verdict compare(const std::optional<OpticalSetup>& setup, const Prediction& prediction,
                const Measurement& measurement, const CompareOptions& options) {
  Verdict verdict;
  const BaselinePosterior baseline(prediction, measurement);
  const double limit_px = acceptable_blur_px(prediction);

  SummaryFacts facts;
  facts.acceptable_blur_px = limit_px;
  facts.diffraction_px2 = baseline.diffraction_px2();
  facts.aim_assumed = options.aim_assumed && !options.trust_centre;
  facts.clipping = measurement.clipping;
  if (setup) facts.f_number = setup->f_number;

  if (const auto blur = aim_blur(measurement, baseline, options)) {
    judge_focus(measurement, baseline, *blur, limit_px, verdict, facts);
    facts.aim_blur_px2 = blur->worst_px2;
    facts.lower_bound_only = blur->bound == Bound::lower;
    // A bound alone says "off" or nothing.
    if (!measurement.aim_blur.estimate && verdict.focus != FocusVerdict::off) verdict.focus = FocusVerdict::no_evidence;
  }
  if (facts.aim_assumed) hold_back_assumed_aim(verdict);

  if (measurement.plane && measurement.plane->at_contact_px) {
    const Defocus error = defocus(*measurement.plane->at_contact_px, setup, prediction);
    verdict.defocus_um = error.um;
    verdict.defocus_limits = error.limits;
    verdict.focus_offset_m = error.offset_m;
  }
  judge_exposure(prediction, measurement, options, verdict);
  verdict.summary = summary(verdict, facts);
  return verdict;
}

}  // namespace focusfall
