#include "src/output/frame_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string_view>
#include <vector>

#include "analysis/compare/compare.h"
#include "src/output/names.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"
#include "src/pipeline/resolve.h"

namespace focusfall {
namespace {

constexpr int kLabelColumns = 13;      // two blanks, the label, two blanks
constexpr int kWideColumns = 120;      // from here on brief lines hold the focus error and the clipping
constexpr int kTextColumns = 100;      // prose gets no wider: longer lines are hard to read (judgement)

std::string emphasised(const std::string& text, const TextLayout& layout) {
  return layout.bold ? "\x1b[1m" + text + "\x1b[0m" : text;
}

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
  // An interval below a hundredth is less than the digits that are shown.
  if (distance.high_m - distance.low_m > 0.01 * distance.value_m) {
    text += fmt::format(" ({})", distance_range_text(distance.low_m, distance.high_m));
  }
  return distance.stale ? text + ", perhaps out of date" : text;
}

// Whether a value came from a person and not from the file.
bool is_said(Source source) { return source == Source::user || source == Source::settings; }

// What a person said in place of the file is marked: "f/4 (user)".
std::string with_origin(const std::string& text, Source source) {
  return is_said(source) ? fmt::format("{} ({})", text, source_name(source)) : text;
}

std::vector<std::string> capture_lines(const Capture& c) {
  std::vector<std::string> settings, place;
  const auto add = [&settings](const OptionalSourced<double>& value, auto text_of) {
    if (value) settings.push_back(with_origin(text_of(value->value), value->source));
  };
  add(c.focal_length_mm, millimetres_text);
  add(c.f_number, f_number_text);
  add(c.exposure_time_s, time_text);
  add(c.iso_speed, [](double speed) { return fmt::format("ISO {:.0f}", speed); });
  if (c.flash_fired && c.flash_fired->value) settings.push_back("flash");
  if (c.focus_distance) {
    settings.push_back(with_origin(focus_distance_text(c.focus_distance->value), c.focus_distance->source));
  }
  if (c.pixel_pitch_um && is_said(c.pixel_pitch_um->source)) {
    settings.push_back(
        with_origin("pixels of " + micrometres_text(c.pixel_pitch_um->value.value), c.pixel_pitch_um->source));
  }
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

int orientation_of(const FrameRecord& record) {
  return record.capture && record.capture->orientation ? record.capture->orientation->value : 1;
}

// Direction in the picture as displayed: "level", "upright", "rising to the right at 30 degrees".
std::string direction_text(double angle_deg, int orientation) {
  constexpr double kDegree = std::numbers::pi / 180, kLevelDeg = 7;   // a hand's breadth on a horizon (judgement)
  const FramePoint zero = displayed_point({0, 0}, orientation);
  const FramePoint tip = displayed_point({std::cos(angle_deg * kDegree), std::sin(angle_deg * kDegree)}, orientation);
  double rise_deg = std::atan2(zero.y - tip.y, tip.x - zero.x) / kDegree;   // y runs down
  if (rise_deg > 90) rise_deg -= 180;
  if (rise_deg <= -90) rise_deg += 180;
  if (std::abs(rise_deg) < kLevelDeg) return "level";
  if (std::abs(rise_deg) > 90 - kLevelDeg) return "upright";
  return fmt::format("{} to the right at {:.0f}\xC2\xB0", rise_deg > 0 ? "rising" : "falling", std::abs(rise_deg));
}

std::string motion_text(std::string_view what, const std::optional<MotionReading>& motion, int orientation) {
  if (!motion) return {};
  // A lower bound of zero: no direction stands out.
  if (!(motion->length_low_px > 0)) return fmt::format("no {} to tell (up to {})", what, px_text(motion->length_high_px));
  return fmt::format("{} {} ({:.1f} to {:.1f}), {}", what, px_text(motion->length_px), motion->length_low_px,
                     motion->length_high_px, direction_text(motion->angle_deg, orientation));
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
    const FractionBox& box = m.best->box;
    const FramePoint centre = displayed_point({box.x + box.width / 2, box.y + box.height / 2}, orientation_of(record));
    lines.push_back(fmt::format("sharpest part {}, {:.0f} % from the left, {:.0f} % from the top",
                                blur_text(m.best->reading, record), 100 * centre.x, 100 * centre.y));
  }
  const std::string motion = joined(
      {motion_text("motion", m.motion, orientation_of(record)),
       motion_text("background motion", m.background_motion, orientation_of(record))}, "; ");
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

std::vector<std::string> verdict_lines(const Verdict& verdict, const TextLayout& layout) {
  std::string head = name_of(verdict.focus);
  if (const std::string causes = causes_text(verdict); !causes.empty()) head += ": " + causes;
  if (verdict.exposure != ExposureVerdict::unknown) head += fmt::format("; exposure {}", name_of(verdict.exposure));
  std::vector<std::string> lines{emphasised(head, layout)};
  if (!verdict.summary.empty()) lines.push_back(visible_text(verdict.summary));
  return lines;
}

std::string focus_error_text(const Verdict& verdict) {
  if (!verdict.defocus_limits) return {};
  const Interval& limits = *verdict.defocus_limits;
  return fmt::format("{:+.1f} ({:+.1f} to {:+.1f})", limits.value, limits.low, limits.high);
}

// Measured of acceptable: "8.2 of 3.0 px".
std::string blur_of_limit_text(const FrameRecord& record) {
  if (!record.measurement || !record.measurement->aim_blur.estimate) return {};
  const Prediction prediction = record.prediction.value_or(Prediction{});
  const Interval s =
      blur_after_baseline(*record.measurement->aim_blur.estimate, prediction, *record.measurement);
  return fmt::format("{:.1f} of {:.1f} px", blur_disc_px(s.value), acceptable_blur_px(prediction));
}

// The clipped part for a brief line: "points .5 %, aim 2.4 %".
std::string brief_clipping_text(const FrameRecord& record) {
  if (!record.measurement || !record.measurement->clipping) return {};
  const Clipping& c = *record.measurement->clipping;
  if (c.kind == ClippedKind::none) return {};
  std::string text = fmt::format("{} {}", name_of(c.kind), percent_text(c.any));
  if (c.aim_any > 0) text += ", aim " + percent_text(c.aim_any);
  return text;
}

// Columns of a brief line after the name.
constexpr int kFocusColumns = 11, kBlurColumns = 14, kWhyColumns = 19, kErrorColumns = 26, kClippedColumns = 26;

struct BriefCells {
  std::string name, focus, blur, why, error, clipped;
};

std::string brief_line(const BriefCells& cells, const TextLayout& layout) {
  std::string line = "  " + padded(shortened(cells.name, layout.path_columns), layout.path_columns) + "  ";
  line += padded(cells.focus, kFocusColumns) + "  " + padded(cells.blur, kBlurColumns) + "  ";
  line += padded(cells.why, kWhyColumns);
  if (layout.columns >= kWideColumns) {
    line += "  " + padded(cells.error, kErrorColumns) + "  " + padded(cells.clipped, kClippedColumns);
  }
  line.erase(line.find_last_not_of(' ') + 1);
  return line + "\n";
}

std::string name_without_folder(const std::string& path) { return path.substr(path.find_last_of('/') + 1); }

}  // namespace

TextLayout text_layout(int columns, int longest_name_columns) {
  constexpr int kIndent = 2, kGap = 2;
  int others = kIndent + kFocusColumns + kBlurColumns + kWhyColumns + 3 * kGap;
  if (columns >= kWideColumns) others += kErrorColumns + kClippedColumns + 2 * kGap;
  constexpr int kLeastName = 20;
  return {.columns = columns,
          .path_columns = std::clamp(longest_name_columns, kLeastName, std::max(columns - others, kLeastName))};
}

std::string failure_text(const FrameRecord& record) {
  if (record.issues.empty()) return "could not be done.";
  return visible_text(record.issues.back().message);
}

std::string frame_text(const FrameRecord& record, const TextLayout& layout) {
  std::string text = emphasised(visible_text(record.path), layout) + "\n";
  if (record.capture) text += block("capture", capture_lines(*record.capture), layout);
  if (record.prediction) text += block("predicted", prediction_lines(*record.prediction), layout);
  if (record.measurement) text += block("measured", measurement_lines(record), layout);
  if (record.verdict) text += block("verdict", verdict_lines(*record.verdict, layout), layout);
  std::vector<std::string> notes;
  for (const Issue& issue : record.issues) notes.push_back(visible_text(issue.message));
  text += block(record.done ? "note" : "not done", notes, layout);
  return text + "\n";
}

std::string folder_heading(const std::string& path, const TextLayout& layout) {
  const auto slash = path.find_last_of('/');
  if (slash == std::string::npos) return {};
  return emphasised(visible_text(path.substr(0, slash + 1)), layout) + "\n";
}

std::string brief_heading(const TextLayout& layout) {
  return brief_line({"frame", "focus", "blur at aim", "why", "limits of depth of field", "clipped"}, layout);
}

std::string brief_text(const FrameRecord& record, const TextLayout& layout) {
  const std::string name = visible_text(name_without_folder(record.path));
  if (!record.verdict) {
    return "  " + padded(shortened(name, layout.path_columns), layout.path_columns) + "  not done: " +
           failure_text(record) + "\n";
  }
  return brief_line({.name = name,
                     .focus = name_of(record.verdict->focus),
                     .blur = blur_of_limit_text(record),
                     .why = causes_text(*record.verdict),
                     .error = focus_error_text(*record.verdict),
                     .clipped = brief_clipping_text(record)},
                    layout);
}

}  // namespace focusfall
