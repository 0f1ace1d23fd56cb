#include "analysis/compare/lens_words.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace focusfall {
namespace {

constexpr double kLevel = 0.05;

std::string counted(std::size_t count, const char* one) {
  return fmt::format("{} {}{}", count, one, count == 1 ? "" : "s");
}

std::string acts(std::size_t count) { return fmt::format("{} {} of focusing", count, count == 1 ? "act" : "acts"); }

std::string side_words(double value) { return value < 0 ? "in front of the aim" : "behind the aim"; }

// "38 µm in front of the aim at the sensor (29 to 47 µm), 0.84 limits of the depth of field"
std::string bias_words(const LensGroup& group) {
  const Interval& um = *group.bias_um;
  const double sign = um.value < 0 ? -1 : 1;
  const double low = sign < 0 ? -um.high : um.low, high = sign < 0 ? -um.low : um.high;
  return fmt::format("{:.0f} µm {} at the sensor ({:.0f} to {:.0f} µm), {:.2f} limits of the depth of field",
                     std::abs(um.value), side_words(um.value), low, high, std::abs(group.bias_limits->value));
}

// Why nothing can be said, most basic reason first.
std::string missing_words(const LensGroup& group) {
  const std::size_t frames = group.of.readings.size(), acquisitions = group.of.acquisitions.size();
  if (static_cast<int>(frames) < kLeastFrames)
    return fmt::format("{}, and a finding takes {} or more", counted(frames, "usable frame"), kLeastFrames);
  if (!group.bias_um)
    return fmt::format("the {} were focused in {} only, and a finding takes {} or more",
                       counted(frames, "usable frame"), counted(acquisitions, "act"), kLeastAcquisitionsForBias);
  if (group.hint && static_cast<int>(acquisitions) < kLeastOrdinary)
    return fmt::format("ordinary frames need {} acts of focusing for a finding, and there are {}", kLeastOrdinary,
                       acquisitions);
  return fmt::format("the bias lies between {:+.2f} and {:+.2f} limits, which leaves more than one answer open",
                     group.bias_limits->low, group.bias_limits->high);
}

std::string open_words(const LensGroup& group) {
  std::string text = fmt::format("Not enough evidence: {}.", missing_words(group));
  if (!group.bias_um) return text;
  if (group.hint && (group.bias_um->low > 0 || group.bias_um->high < 0))
    text += fmt::format(" A hint, no finding: focus fell {} on average.", bias_words(group));
  return text;
}

// "grows towards far distances" ... for a trend that is significant.
std::string direction_words(const LensTrend& trend) {
  const bool up = trend.slope_um->value > 0;
  const char* way = up ? "further behind" : "further in front";
  switch (trend.kind) {
    case TrendKind::focus_distance: return fmt::format("falls {} the farther the subject is", way);
    case TrendKind::f_number: return fmt::format("falls {} as the diaphragm closes (focus shift)", way);
    case TrendKind::focal_length: return fmt::format("falls {} the longer the focal length is", way);
    case TrendKind::approach: return fmt::format("falls {} when approached from far than from near", way);
  }
  return "";
}

std::string part_words(const char* what, const std::vector<PartEffect>& parts) {
  std::string text;
  for (const PartEffect& part : parts) {
    text += fmt::format(" {} {}: {:+.0f} µm ({:+.0f} to {:+.0f} µm) against the others{}.", what, part.name,
                        part.effect_um.value, part.effect_um.low, part.effect_um.high,
                        part.p_holm < kLevel ? ", clearly different" : "");
  }
  return text;
}

}  // namespace

const char* lens_finding_name(LensFinding finding) {
  switch (finding) {
    case LensFinding::front_focus: return "front focus";
    case LensFinding::back_focus: return "back focus";
    case LensFinding::within_tolerance: return "within tolerance";
    case LensFinding::scatter: return "scatter";
    case LensFinding::not_enough_evidence: return "not enough evidence";
  }
  return "";
}

const char* series_kind_name(SeriesKind kind) {
  return kind == SeriesKind::test_series ? "test series" : "ordinary frames";
}

const char* focus_area_place_name(FocusAreaPlace place) {
  switch (place) {
    case FocusAreaPlace::centre: return "centre";
    case FocusAreaPlace::off_centre: return "off centre";
    case FocusAreaPlace::unknown: return "unknown";
  }
  return "";
}

const char* trend_kind_name(TrendKind kind) {
  switch (kind) {
    case TrendKind::focus_distance: return "focus distance";
    case TrendKind::f_number: return "f-number";
    case TrendKind::focal_length: return "focal length";
    case TrendKind::approach: return "approach";
  }
  return "";
}

const char* trend_unit(TrendKind kind) {
  switch (kind) {
    case TrendKind::focus_distance: return "um per doubling";
    case TrendKind::f_number: return "um per stop";
    case TrendKind::focal_length: return "um per doubling";
    case TrendKind::approach: return "um, far minus near";
  }
  return "";
}

std::string finding_text(const LensGroup& group) {
  if (group.finding == LensFinding::not_enough_evidence) return open_words(group);
  const std::string over = fmt::format("over {} in {}", counted(group.of.readings.size(), "frame"),
                                       acts(group.of.acquisitions.size()));
  const std::string from = group.hint ? " These are ordinary frames: a hint to follow with a test series." : "";
  std::string text;
  switch (group.finding) {
    case LensFinding::front_focus:
    case LensFinding::back_focus:
      text = fmt::format("{}: focus falls {}, {}.",
                         group.finding == LensFinding::front_focus ? "Front focus" : "Back focus", bias_words(group),
                         over);
      if (group.spread_um->value > group.of.limit_um)
        text += fmt::format(" It scatters as well, by {:.0f} µm from one act to the next.", group.spread_um->value);
      break;
    case LensFinding::within_tolerance:
      text = fmt::format("Within tolerance: a bias of {:+.2f} limits of the depth of field ({:+.2f} to {:+.2f}), {}.",
                         group.bias_limits->value, group.bias_limits->low, group.bias_limits->high, over);
      break;
    case LensFinding::scatter:
      text = fmt::format("Scatter: focus varies by {:.0f} µm from one act to the next, {:.1f} limits of the depth of "
                         "field, {}; that is more than a bias{}.",
                         group.spread_um->value, group.spread_um->value / group.of.limit_um, over,
                         group.mixed ? ", and front and back occur side by side" : "");
      break;
    case LensFinding::not_enough_evidence: break;
  }
  return text + from;
}

std::string next_step_text(const LensGroup& group) {
  if (group.hint)
    return "Shoot a test series: ten frames or more of a textured flat surface leaning away, focus run out and found "
           "anew before each.";
  switch (group.finding) {
    case LensFinding::front_focus:
    case LensFinding::back_focus:
      return "Repeat at another distance, and with this lens on another body and another lens on this body, to tell "
             "which of them it is.";
    case LensFinding::scatter:
      return "Repeat in brighter light on a bolder surface, from a firm support; scatter that stays does not come from "
             "the subject.";
    case LensFinding::within_tolerance: return "Repeat at another distance if other frames looked misfocused.";
    case LensFinding::not_enough_evidence: break;
  }
  return "Take more frames, focus run out and found anew before each.";
}

std::string trend_text(const LensTrend& trend) {
  if (!trend.slope_um) return trend.missing;
  const Interval& slope = *trend.slope_um;
  std::string text = trend.p_holm < kLevel ? "Focus " + direction_words(trend) + ": " : "No trend is shown: ";
  text += fmt::format("{:+.0f} {} ({:+.0f} to {:+.0f}) over {}", slope.value,
                      trend.kind == TrendKind::approach ? "µm" : trend.kind == TrendKind::f_number ? "µm per stop"
                                                                                                   : "µm per doubling",
                      slope.low, slope.high, acts(static_cast<std::size_t>(trend.acquisitions)));
  const double largest = std::max(std::abs(slope.low), std::abs(slope.high)) * trend.span;
  if (trend.p_holm >= kLevel && largest < 2 * kToleranceLimits * trend.limit_um) text += "; constant at the sensor";
  return text + ".";
}

std::string lens_or_body_text(const LensOrBody& parts) {
  if (!parts.missing.empty()) return parts.missing;
  std::string text = "What all share belongs to neither lens nor body alone." + part_words("Lens", parts.lenses) +
                     part_words("Body", parts.bodies);
  if (parts.p_interaction && *parts.p_interaction < kLevel)
    text += " The pairs differ by more than lens and body add up to: read these figures with care.";
  return text;
}

std::string summary_text(const LensReport& report) {
  if (report.groups.empty()) return "Not enough evidence: no usable frame.";
  if (report.groups.size() == 1) return report.groups.front().text;
  std::string text = counted(report.groups.size(), "group") + ":";
  for (const LensFinding finding : {LensFinding::front_focus, LensFinding::back_focus, LensFinding::scatter,
                                    LensFinding::within_tolerance, LensFinding::not_enough_evidence}) {
    std::size_t count = 0;
    for (const LensGroup& group : report.groups) count += group.finding == finding ? 1 : 0;
    if (count > 0) text += fmt::format("{} {} {}", text.back() == ':' ? "" : ",", count, lens_finding_name(finding));
  }
  return text + ".";
}

}  // namespace focusfall
