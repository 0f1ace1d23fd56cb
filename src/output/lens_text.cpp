// The report of `lens` for a person.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "analysis/compare/lens_words.h"
#include "src/output/lens_report.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr int kLabelColumns = 13;   // two blanks, the label, blanks
constexpr int kTextColumns = 100;   // prose gets no wider: longer lines are hard to read (judgement)

std::string labelled(const char* label, const std::string& words, const TextLayout& layout) {
  const int columns = std::min(layout.columns, kTextColumns + kLabelColumns);
  return padded(fmt::format("  {}", label), kLabelColumns) + wrapped(words, columns - kLabelColumns, 0) + "\n";
}

// The same with every further line below the words, not below the label.
std::string block(const char* label, const std::string& words, const TextLayout& layout) {
  std::string text = labelled(label, words, layout);
  for (std::size_t at = text.find('\n'); at + 1 < text.size(); at = text.find('\n', at + 1))
    text.insert(at + 1, kLabelColumns, ' ');
  return text;
}

std::string owner_text(const std::string& lens, const std::string& body) {
  return fmt::format("{} on {}", lens.empty() ? "Lens not recorded" : visible_text(lens),
                     body.empty() ? "a body that is not recorded" : visible_text(body));
}

std::string heading(const ReadingGroup& of) {
  std::string text = fmt::format("{}\n  {}, {}", owner_text(of.lens, of.body), millimetres_text(of.focal_length_mm),
                                 f_number_text(of.f_number));
  if (of.focus_distance_m) text += ", focus " + distance_text(*of.focus_distance_m);
  if (of.area != FocusAreaPlace::unknown) text += fmt::format(", focus area {}", focus_area_place_name(of.area));
  if (!of.focus_mode.empty()) text += fmt::format(", {} autofocus", of.focus_mode);
  return text + "\n";
}

// "+141 µm (+126 to +156 µm)"
std::string signed_um(const Interval& um) {
  return fmt::format("{:+.0f} µm ({:+.0f} to {:+.0f} µm)", um.value, um.low, um.high);
}

std::string signed_limits(const Interval& limits) {
  return fmt::format("{:+.2f} limits ({:+.2f} to {:+.2f})", limits.value, limits.low, limits.high);
}

std::string spread_words(const LensGroup& group) {
  const Interval& um = *group.spread_um;
  return fmt::format("{:.0f} µm ({:.0f} to {:.0f} µm) from one act of focusing to the next; {:.0f} % within a third of "
                     "the depth of field, {:.0f} % within the whole",
                     um.value, um.low, um.high, 100 * group.within_third, 100 * group.within_whole);
}

std::string frame_line(const FrameRecord& record, const TextLayout& layout) {
  const Verdict& verdict = *record.verdict;
  std::string text = "    " + padded(shortened(visible_text(record.path), layout.path_columns), layout.path_columns) +
                     fmt::format(" {:+7.2f} px  {:+5.0f} ±{:.0f} µm  {:+5.2f} limits",
                                 record.measurement->plane->at_contact_px->value, verdict.defocus_um->value,
                                 (verdict.defocus_um->high - verdict.defocus_um->low) / 2,
                                 verdict.defocus_limits->value);
  if (verdict.focus_offset_m) text += fmt::format("  {:+.0f} mm", verdict.focus_offset_m->value * 1000);
  return text + "\n";
}

std::string group_text(const LensOutput& output, std::size_t number, const LensTextOptions& options) {
  const LensGroup& group = output.report.groups[number];
  const TextLayout& layout = options.layout;
  std::string text = heading(group.of);
  text += block("frames", fmt::format("{} in {} acts of focusing, {}", group.of.readings.size(),
                                      group.of.acquisitions.size(), series_kind_name(group.kind)),
                layout);
  if (options.frames) {
    for (const std::size_t i : group.of.readings)
      text += frame_line(output.records[output.input.readings[i].frame], layout);
  }
  text += block("limit", fmt::format("{:.0f} µm at the sensor to each side", group.of.limit_um), layout);
  if (group.bias_um)
    text += block("bias", signed_um(*group.bias_um) + ", " + signed_limits(*group.bias_limits) + "; + is behind",
                  layout);
  if (group.spread_um) text += block("spread", spread_words(group), layout);
  if (!group.outliers.empty()) {
    std::string names;
    for (const std::size_t frame : group.outliers)
      names += (names.empty() ? "" : ", ") + visible_text(output.records[frame].path);
    text += block("outliers", names, layout);
  }
  if (!output.diaphragms.empty()) text += block("diaphragm", output.diaphragms[number].text, layout);
  return text + block("finding", visible_text(group.text), layout) + block("next", group.next, layout);
}

std::string left_out_text(const LensOutput& output, const TextLayout& layout) {
  std::map<LeftOut, int> counts;
  for (const auto& why : output.input.left_out) {
    if (why) ++counts[*why];
  }
  if (counts.empty()) return {};
  std::string words;
  for (const auto& [reason, count] : counts)
    words += fmt::format("{}{} {}", words.empty() ? "" : ", ", count, left_out_name(reason));
  return "Left out\n" + block("frames", words, layout) + "\n";
}

// Trends that have a figure; the others are named in one line.
std::string trends_text(const LensReport& report, const TextLayout& layout) {
  std::string text;
  for (std::size_t i = 0; i < report.trends.size(); ++i) {
    const LensTrend& trend = report.trends[i];
    const bool first = i == 0 || report.trends[i - 1].lens != trend.lens || report.trends[i - 1].body != trend.body;
    if (!trend.slope_um) continue;
    if (first || text.empty()) text += "Trends of " + owner_text(trend.lens, trend.body) + "\n";
    text += block(trend_kind_name(trend.kind), trend_text(trend), layout);
  }
  if (!text.empty()) return text + "\n";
  return wrapped("No trend with distance, f-number, focal length or approach can be told from these frames.",
                 std::min(layout.columns, kTextColumns), 0) +
         "\n\n";
}

}  // namespace

std::string lens_text(const LensOutput& output, const LensTextOptions& options) {
  std::string text;
  for (std::size_t g = 0; g < output.report.groups.size(); ++g) text += group_text(output, g, options) + "\n";
  if (output.focus_series) text += "Focus series\n" + block("finding", output.focus_series->text, options.layout) + "\n";
  if (output.flat) text += "Flat wall\n" + block("finding", output.flat->text, options.layout) + "\n";
  text += left_out_text(output, options.layout);
  if (!output.report.groups.empty()) {
    const int columns = std::min(options.layout.columns, kTextColumns);
    text += trends_text(output.report, options.layout);
    text += wrapped(visible_text(lens_or_body_text(output.report.lens_or_body)), columns, 0) + "\n\n";
    if (output.report.groups.size() > 1) text += wrapped(output.report.summary, columns, 0) + "\n";
  } else {
    text += output.report.summary + "\n";
  }
  return text;
}

}  // namespace focusfall
