#include "src/output/frame_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <string_view>
#include <vector>

#include "analysis/compare/compare.h"
#include "src/output/names.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr int kLabelColumns = 13;      // two blanks, the label, two blanks
constexpr int kWideColumns = 120;      // from here on brief lines hold the focus error and the clipping
constexpr int kTextColumns = 100;      // prose gets no wider: longer lines are hard to read (judgement)

// One labelled block of a paragraph; nothing where there is nothing to say.
std::string block(std::string_view label, const std::vector<std::string>& lines, const TextLayout& layout) {
  std::string text;
  const int columns = std::min(layout.columns, kTextColumns + kLabelColumns) - kLabelColumns;
  for (const std::string& line : lines) {
    text += text.empty() ? padded(fmt::format("  {}", label), kLabelColumns) : std::string(kLabelColumns, ' ');
    std::string folded = wrapped(line, columns, 0);
    for (std::size_t at = folded.find('\n'); at != std::string::npos; at = folded.find('\n', at + 1)) {
      folded.insert(at + 1, kLabelColumns, ' ');
    }
    text += folded + "\n";
  }
  return text;
}

std::string joined(const std::vector<std::string>& parts, std::string_view separator) {
  std::string text;
  for (const std::string& part : parts) {
    if (part.empty()) continue;
    if (!text.empty()) text += separator;
    text += part;
  }
  return text;
}

// "focus 30.2 m (29.3 to 31.1 m)"
std::string focus_distance_text(const FocusDistance& distance) {
  if (std::isinf(distance.value_m)) {
    return std::isinf(distance.low_m) ? "focus at infinity"
                                      : fmt::format("focus at infinity (beyond {})", distance_text(distance.low_m));
  }
  std::string text = "focus " + distance_text(distance.value_m);
  if (distance.high_m > distance.low_m) {
    text += fmt::format(" ({})", distance_range_text(distance.low_m, distance.high_m));
  }
  return distance.stale ? text + ", perhaps out of date" : text;
}

std::vector<std::string> capture_lines(const Capture& c) {
  std::vector<std::string> settings, place;
  if (c.focal_length_mm) settings.push_back(millimetres_text(c.focal_length_mm->value));
  if (c.f_number) settings.push_back(f_number_text(c.f_number->value));
  if (c.exposure_time_s) settings.push_back(time_text(c.exposure_time_s->value));
  if (c.iso_speed) settings.push_back(fmt::format("ISO {:.0f}", c.iso_speed->value));
  if (c.flash_fired && c.flash_fired->value) settings.push_back("flash");
  if (c.focus_distance) settings.push_back(focus_distance_text(c.focus_distance->value));
  if (c.camera) place.push_back(visible_text(c.camera->value));
  if (c.lens) place.push_back(visible_text(c.lens->value));
  if (c.taken_at) place.push_back(visible_text(c.taken_at->value));
  std::vector<std::string> lines;
  if (!settings.empty()) lines.push_back(joined(settings, ", "));
  if (!place.empty()) lines.push_back(joined(place, ", "));
  if (lines.empty()) lines.push_back("no capture data in the file");
  return lines;
}

std::vector<std::string> prediction_lines(const Prediction& p) {
  std::vector<std::string> depth, blur;
  if (p.near_limit_m && (p.far_limit_m || p.far_limit_infinite)) {
    const double far_m = p.far_limit_infinite ? INFINITY : *p.far_limit_m;
    depth.push_back("depth of field " + distance_range_text(*p.near_limit_m, far_m));
  }
  if (p.acceptable_blur_px) {
    std::string limit = "acceptable blur " + px_text(*p.acceptable_blur_px);
    if (p.acceptable_blur_um) limit += fmt::format(" ({})", micrometres_text(*p.acceptable_blur_um));
    depth.push_back(limit);
  }
  if (p.blur_disc_px) blur.push_back("an aim in focus measures " + px_text(*p.blur_disc_px));
  if (p.airy_diameter_px) blur.push_back("diffraction disc " + px_text(*p.airy_diameter_px));
  if (p.motion_blur_px) blur.push_back("motion " + px_text(*p.motion_blur_px));
  std::vector<std::string> lines;
  for (const auto& parts : {depth, blur}) {
    if (!parts.empty()) lines.push_back(joined(parts, "; "));
  }
  return lines;
}

// "8.2 px (7.6 to 8.8), 34 edges"
std::string blur_text(const BlurReading& reading, const FrameRecord& record) {
  if (!reading.estimate) return fmt::format("nothing to measure ({} edges)", reading.edges);
  const Interval s = blur_after_baseline(*reading.estimate, record.prediction.value_or(Prediction{}),
                                         *record.measurement);
  const char* bound = reading.estimate->bound == Bound::lower   ? "at least "
                      : reading.estimate->bound == Bound::upper ? "at most "
                                                                : "";
  return fmt::format("{}{} ({:.1f} to {:.1f}), {} edges", bound, px_text(blur_disc_px(s.value)), blur_disc_px(s.low),
                     blur_disc_px(s.high), reading.edges);
}

std::string motion_text(std::string_view what, const std::optional<MotionReading>& motion) {
  if (!motion) return {};
  return fmt::format("{} {} ({:.1f} to {:.1f}) at {:.0f}\xC2\xB0", what, px_text(motion->length_px),
                     motion->length_low_px, motion->length_high_px, motion->angle_deg);
}

std::string clipping_text(const Clipping& c) {
  if (c.kind == ClippedKind::none) return {};
  std::string text = fmt::format("clipped {} ({}", percent_text(c.any),
                                 c.kind == ClippedKind::colour ? "one colour" : name_of(c.kind));
  if (c.measured_on == ClippedOn::mosaic) text += ", on the raw mosaic";
  text += ")";
  if (c.aim_any > 0) text += fmt::format(", {} of the aim", percent_text(c.aim_any));
  return text;
}

std::string aim_origin_text(const FrameRecord& record) {
  const char* source = name_of(record.aim_origin ? record.aim_origin->kind : FocusAreaKind::centre);
  std::string text = fmt::format("aim ({}", source);
  if (record.measurement->aim.grown) text += ", grown";
  if (record.measurement->aim.mixed) text += ", holds two blurs";
  return text + ") ";
}

std::vector<std::string> measurement_lines(const FrameRecord& record) {
  const Measurement& m = *record.measurement;
  std::vector<std::string> lines{"blur at the " + aim_origin_text(record) + blur_text(m.aim_blur, record)};
  if (m.best && m.best->reading.estimate) {
    lines.push_back(fmt::format("sharpest part {}, {:.0f} % from the left, {:.0f} % from the top",
                                blur_text(m.best->reading, record), 100 * (m.best->box.x + m.best->box.width / 2),
                                100 * (m.best->box.y + m.best->box.height / 2)));
  }
  const std::string motion = joined(
      {motion_text("motion", m.motion), motion_text("background motion", m.background_motion)}, "; ");
  if (!motion.empty()) lines.push_back(motion);
  if (m.plane && m.plane->at_contact_px) {
    const Interval& l = *m.plane->at_contact_px;
    lines.push_back(fmt::format("signed blur on the ground {:+.1f} px ({:+.1f} to {:+.1f})", l.value, l.low, l.high));
  }
  if (m.clipping) {
    if (const std::string clipped = clipping_text(*m.clipping); !clipped.empty()) lines.push_back(clipped);
  }
  return lines;
}

std::string causes_text(const Verdict& verdict) {
  std::vector<std::string> words;
  for (const Cause cause : verdict.causes) words.emplace_back(name_of(cause));
  return joined(words, ", ");
}

std::vector<std::string> verdict_lines(const Verdict& verdict) {
  std::string head = name_of(verdict.focus);
  if (const std::string causes = causes_text(verdict); !causes.empty()) head += ": " + causes;
  if (verdict.exposure != ExposureVerdict::unknown) head += fmt::format("; exposure {}", name_of(verdict.exposure));
  std::vector<std::string> lines{head};
  if (!verdict.summary.empty()) lines.push_back(visible_text(verdict.summary));
  return lines;
}

std::string focus_error_text(const Verdict& verdict) {
  if (!verdict.defocus_limits) return {};
  const Interval& limits = *verdict.defocus_limits;
  return fmt::format("{:+.1f} limits ({:+.1f} to {:+.1f})", limits.value, limits.low, limits.high);
}

// Measured of acceptable: "8.2 of 3.0 px".
std::string blur_of_limit_text(const FrameRecord& record) {
  if (!record.measurement || !record.measurement->aim_blur.estimate) return {};
  const Prediction prediction = record.prediction.value_or(Prediction{});
  const Interval s =
      blur_after_baseline(*record.measurement->aim_blur.estimate, prediction, *record.measurement);
  return fmt::format("{:.1f} of {:.1f} px", blur_disc_px(s.value), acceptable_blur_px(prediction));
}

// Columns of a brief line after the name.
constexpr int kFocusColumns = 11, kBlurColumns = 16, kWhyColumns = 22, kErrorColumns = 30, kClippedColumns = 24;

}  // namespace

TextLayout text_layout(int columns, int longest_path_columns) {
  constexpr int kGaps = 3 * 2;
  int others = kFocusColumns + kBlurColumns + kWhyColumns + kGaps;
  if (columns >= kWideColumns) others += kErrorColumns + kClippedColumns + 2 * 2;
  constexpr int kLeastPath = 16;
  return {.columns = columns,
          .path_columns = std::clamp(longest_path_columns, kLeastPath, std::max(columns - others, kLeastPath))};
}

std::string failure_text(const FrameRecord& record) {
  if (record.issues.empty()) return "could not be done.";
  return visible_text(record.issues.back().message);
}

std::string frame_text(const FrameRecord& record, const TextLayout& layout) {
  std::string text = visible_text(record.path) + "\n";
  if (record.capture) text += block("capture", capture_lines(*record.capture), layout);
  if (record.prediction) text += block("predicted", prediction_lines(*record.prediction), layout);
  if (record.measurement) text += block("measured", measurement_lines(record), layout);
  if (record.verdict) text += block("verdict", verdict_lines(*record.verdict), layout);
  std::vector<std::string> notes;
  for (const Issue& issue : record.issues) notes.push_back(visible_text(issue.message));
  text += block(record.done ? "note" : "not done", notes, layout);
  return text + "\n";
}

std::string brief_text(const FrameRecord& record, const TextLayout& layout) {
  std::string line = padded(shortened(visible_text(record.path), layout.path_columns), layout.path_columns) + "  ";
  if (!record.verdict) return line + "not done: " + failure_text(record) + "\n";
  const Verdict& verdict = *record.verdict;
  line += padded(name_of(verdict.focus), kFocusColumns) + "  ";
  line += padded(blur_of_limit_text(record), kBlurColumns) + "  ";
  if (layout.columns >= kWideColumns) {
    line += padded(focus_error_text(verdict), kErrorColumns) + "  ";
    line += padded(record.measurement && record.measurement->clipping ? clipping_text(*record.measurement->clipping)
                                                                      : std::string(),
                   kClippedColumns) + "  ";
  }
  line += causes_text(verdict);
  line.erase(line.find_last_not_of(' ') + 1);
  return line + "\n";
}

}  // namespace focusfall
