#include "analysis/compare/summary.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace focusfall {
namespace {

bool has(const Verdict& verdict, Cause cause) {
  return std::find(verdict.causes.begin(), verdict.causes.end(), cause) != verdict.causes.end();
}

double disc_px(double squared_disc_px2) { return std::sqrt(std::max(squared_disc_px2, 0.0)); }

// "0.85 m", "12 m", "4.2 cm".
std::string length(double metres) {
  if (metres >= 10) return fmt::format("{:.0f} m", metres);
  if (metres >= 1) return fmt::format("{:.1f} m", metres);
  if (metres >= 0.1) return fmt::format("{:.2f} m", metres);
  if (metres >= 0.01) return fmt::format("{:.1f} cm", metres * 100);
  return fmt::format("{:.1f} mm", metres * 1000);
}

// "blur at the aim 5.4 px, 3.0 px would do"
std::string blur_clause(const SummaryFacts& facts) {
  if (!facts.aim_blur_px2) return fmt::format("{:.1f} px would do", facts.acceptable_blur_px);
  return fmt::format("blur at the aim {}{:.1f} px, {:.1f} px would do", facts.lower_bound_only ? "at least " : "",
                     disc_px(facts.aim_blur_px2->value), facts.acceptable_blur_px);
}

// "Focus fell 0.85 m behind the subject (+1.8 limits of the depth of field)"
std::string side_clause(const Verdict& verdict) {
  const char* where = verdict.focus == FocusVerdict::back ? "behind" : "in front of";
  std::string distance;
  if (verdict.focus_offset_m) {
    distance = length(std::abs(verdict.focus_offset_m->value)) + " ";
  } else if (verdict.defocus_um) {
    distance = fmt::format("{:.0f} µm at the sensor ", std::abs(verdict.defocus_um->value));
  }
  std::string clause = fmt::format("Focus fell {}{} the subject", distance, where);
  if (verdict.defocus_limits)
    clause += fmt::format(" ({:+.1f} limits of the depth of field)", verdict.defocus_limits->value);
  return clause;
}

std::string motion_clause(const Verdict& verdict, const SummaryFacts& facts) {
  const double moved_px = facts.motion_length_px.value_or(0);
  if (has(verdict, Cause::camera_shake)) return fmt::format("the camera shook by {:.1f} px", moved_px);
  if (has(verdict, Cause::subject_motion))
    return fmt::format("the subject moved {:.1f} px{}", moved_px, verdict.panned ? " while the camera panned" : "");
  return fmt::format("subject or camera moved {:.1f} px, which of the two cannot be told", moved_px);
}

std::string capitalised(std::string text) {
  if (!text.empty() && text[0] >= 'a' && text[0] <= 'z') text[0] = char(text[0] - 'a' + 'A');
  return text;
}

std::string outside_sentence(const Verdict& verdict, const SummaryFacts& facts) {
  std::string sentence;
  const auto join = [&](const std::string& clause) { sentence += sentence.empty() ? clause : ", and " + clause; };
  if (verdict.focus == FocusVerdict::front || verdict.focus == FocusVerdict::back) {
    join(side_clause(verdict));
  } else if (has(verdict, Cause::defocus)) {
    join("the aim is outside the depth of field, on which side the frame does not tell");
  }
  if (facts.motion_length_px) join(motion_clause(verdict, facts));
  if (has(verdict, Cause::diffraction))
    join(fmt::format("diffraction{} alone gives {:.1f} px",
                     facts.f_number ? fmt::format(" at f/{:.4g}", *facts.f_number) : std::string(),
                     disc_px(facts.diffraction_px2)));
  sentence = capitalised(sentence) + "; " + blur_clause(facts);
  if (facts.best_blur_px2)
    sentence += fmt::format("; something else in the frame is sharp ({:.1f} px)", disc_px(*facts.best_blur_px2));
  return sentence + ".";
}

std::string unsure_sentence(const SummaryFacts& facts) {
  if (facts.lower_bound_only) return capitalised(blur_clause(facts)) + "; more than a lower bound cannot be told.";
  return fmt::format("Blur at the aim lies between {:.1f} and {:.1f} px, {:.1f} px would do: too close to call.",
                     disc_px(facts.aim_blur_px2->low), disc_px(facts.aim_blur_px2->high), facts.acceptable_blur_px);
}

std::string assumed_sentence(const Verdict& verdict, const SummaryFacts& facts) {
  if (verdict.focus == FocusVerdict::no_evidence)
    return "Nothing named the subject, and the centre of the frame shows no edges to measure.";
  return fmt::format("Nothing named the subject; at the centre of the frame blur is {:.1f} px, {:.1f} px would do.",
                     disc_px(facts.aim_blur_px2->value), facts.acceptable_blur_px);
}

std::string focus_sentence(const Verdict& verdict, const SummaryFacts& facts) {
  if (facts.aim_assumed) return assumed_sentence(verdict, facts);
  switch (verdict.focus) {
    case FocusVerdict::on:
      if (facts.softer_blur_px2)
        return fmt::format("The aim is in focus ({:.1f} px), but part of the subject is outside the depth of field: "
                           "{:.1f} px, {:.1f} px would do.",
                           disc_px(facts.aim_blur_px2->value), disc_px(*facts.softer_blur_px2),
                           facts.acceptable_blur_px);
      return fmt::format("In focus: blur at the aim {:.1f} px, at most {:.1f} px, {:.1f} px would do.",
                         disc_px(facts.aim_blur_px2->value), disc_px(facts.aim_blur_px2->high),
                         facts.acceptable_blur_px);
    case FocusVerdict::front:
    case FocusVerdict::back:
    case FocusVerdict::off: return outside_sentence(verdict, facts);
    case FocusVerdict::unsure: return unsure_sentence(facts);
    case FocusVerdict::no_evidence: return "The aim shows no edges to measure blur on.";
  }
  return "";
}

std::string exposure_sentence(const Verdict& verdict, const SummaryFacts& facts) {
  std::string sentence;
  const bool strayed = verdict.exposure == ExposureVerdict::over || verdict.exposure == ExposureVerdict::under;
  if (strayed && verdict.exposure_error_ev)
    sentence = fmt::format("Exposure is {:.1f} stops {}", std::abs(verdict.exposure_error_ev->value),
                           verdict.exposure == ExposureVerdict::over ? "over" : "under");
  if (verdict.clipped && facts.clipping) {
    const double percent = 100 * facts.clipping->two_or_more;
    sentence += fmt::format("{} clipped {} {:.2g} % of the frame", sentence.empty() ? "Highlights are" : ", highlights are",
                            facts.clipping->kind == ClippedKind::points ? "in points over" : "over", percent);
  }
  return sentence.empty() ? sentence : " " + sentence + ".";
}

}  // namespace

std::string summary(const Verdict& verdict, const SummaryFacts& facts) {
  return focus_sentence(verdict, facts) + exposure_sentence(verdict, facts);
}

}  // namespace focusfall
