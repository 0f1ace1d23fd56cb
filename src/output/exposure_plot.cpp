#include "src/output/exposure_plot.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "src/output/quantity_text.h"

namespace focusfall {
namespace {

constexpr int kWidthPx = 1040, kStripPx = 470;
constexpr SheetBox kLeft{84, 86, 400, 300};     // of the strip: the two fields
constexpr SheetBox kRight{584, 86, 420, 300};
constexpr Lettering kTitle{.size_px = 17, .bold = true};
constexpr Lettering kWords{.size_px = 13};
constexpr Lettering kSmall{.size_px = 12, .grey = 0.25};
constexpr Stroke kFrame{.width_px = 1, .casing_px = 0};
constexpr Stroke kGrid{.width_px = 0.7, .casing_px = 0, .grey = 0.85};
constexpr Stroke kUnit{.width_px = 1.6, .dash_px = 9, .gap_px = 5, .casing_px = 0};
constexpr Stroke kBar{.width_px = 1.6, .casing_px = 0};
constexpr double kDotPx = 9, kSmallDotPx = 5;

// One axis: values to pixels.
struct Axis {
  double low = 0, high = 1;        // values
  double from_px = 0, to_px = 1;

  double px(double value) const { return from_px + (value - low) / (high - low) * (to_px - from_px); }
};

// The range of some values with a margin, at least `least` wide.
Axis axis_of(const std::vector<double>& values, double least, double from_px, double to_px) {
  const auto [low, high] = std::ranges::minmax(values);
  const double middle = (low + high) / 2, half = std::max(least, (high - low) * 1.15) / 2;
  return {middle - half, middle + half, from_px, to_px};
}

// A step of 1, 2 or 5 times a power of ten that makes some six ticks.
double tick_step(const Axis& axis) {
  constexpr int kTicks = 6;
  const double rough = (axis.high - axis.low) / kTicks;
  const double power = std::pow(10, std::floor(std::log10(rough)));
  for (const double step : {1.0, 2.0, 5.0}) {
    if (rough <= step * power) return step * power;
  }
  return 10 * power;
}

std::string tick_text(double value, double step) {
  const int decimals = std::max(0, static_cast<int>(std::ceil(-std::log10(step) - 1e-9)));
  return fmt::format("{:.{}f}", std::abs(value) < step / 1000 ? 0.0 : value, decimals);
}

void draw_vertical_scale(Sheet& sheet, const SheetBox& field, const Axis& axis, std::string_view label) {
  const double step = tick_step(axis);
  for (double value = std::ceil(axis.low / step) * step; value <= axis.high + 1e-9; value += step) {
    const double y = axis.px(value);
    sheet.line(std::array{SheetPoint{field.x, y}, SheetPoint{field.x + field.width, y}}, kGrid);
    const std::string text = tick_text(value, step);
    sheet.text(text, {field.x - 8 - sheet.text_width_px(text, kWords), y + 4.5}, kWords);
  }
  sheet.upright_text(label, {field.x - 56, field.y + (field.height + sheet.text_width_px(label, kWords)) / 2}, kWords);
}

void draw_centred(Sheet& sheet, std::string_view words, SheetPoint middle, const Lettering& lettering) {
  sheet.text(words, {middle.x - sheet.text_width_px(words, lettering) / 2, middle.y}, lettering);
}

void draw_horizontal_scale(Sheet& sheet, const SheetBox& field, const Axis& axis, std::string_view label) {
  const double step = tick_step(axis);
  for (double value = std::ceil(axis.low / step) * step; value <= axis.high + 1e-9; value += step) {
    const double x = axis.px(value);
    sheet.line(std::array{SheetPoint{x, field.y}, SheetPoint{x, field.y + field.height}}, kGrid);
    draw_centred(sheet, tick_text(value, step), {x, field.y + field.height + 19}, kWords);
  }
  draw_centred(sheet, label, {field.x + field.width / 2, field.y + field.height + 42}, kWords);
}

SheetBox moved(SheetBox box, double y) {
  box.y += y;
  return box;
}

// A tested frame: where it lies once the light is taken off, and where it lay before.
struct PlottedFrame {
  double exposure_ev = 0;
  double level_ev = 0;             // exposure + error
  std::optional<double> raw_level_ev;
  ExposureVerdict verdict = ExposureVerdict::unknown;
};

std::vector<PlottedFrame> plotted_frames(const ExposureSet& set) {
  std::vector<PlottedFrame> frames;
  double exposure_sum = 0;
  for (std::size_t k = 0; k < set.frames.size(); ++k) {
    const auto tested = std::ranges::find(set.tested, set.frames[k]);
    if (tested == set.tested.end()) continue;
    const SetFrameError& error = set.audit->frames[static_cast<std::size_t>(tested - set.tested.begin())];
    PlottedFrame frame{*set.exposure_ev[k], *set.exposure_ev[k] + error.error_ev.value, {}, error.verdict};
    if (set.level_ev[k]) frame.raw_level_ev = *set.level_ev[k] / set.audit->contrast;
    exposure_sum += frame.exposure_ev;
    frames.push_back(frame);
  }
  // Exposures count from their mean; so do the levels as measured, whose own zero means nothing.
  double raw_sum = 0;
  int raw_count = 0;
  for (const PlottedFrame& frame : frames) {
    if (frame.raw_level_ev) raw_sum += *frame.raw_level_ev, ++raw_count;
  }
  const double mean = exposure_sum / static_cast<double>(frames.size());
  for (PlottedFrame& frame : frames) {
    frame.exposure_ev -= mean, frame.level_ev -= mean;
    if (frame.raw_level_ev) *frame.raw_level_ev -= raw_sum / raw_count;
  }
  return frames;
}

void draw_levels(Sheet& sheet, const ExposureSet& set, const SheetBox& field) {
  const auto frames = plotted_frames(set);
  std::vector<double> all;
  for (const PlottedFrame& frame : frames) {
    all.push_back(frame.exposure_ev);
    all.push_back(frame.level_ev);
    all.push_back(frame.raw_level_ev.value_or(frame.level_ev));
  }
  const Axis x = axis_of(all, 2, field.x, field.x + field.width), y = axis_of(all, 2, field.y + field.height, field.y);
  draw_horizontal_scale(sheet, field, x, "exposure as set, stops from the mean of the set");
  draw_vertical_scale(sheet, field, y, "level, stops");
  sheet.box(field, kFrame);
  sheet.clip(field);
  sheet.line(std::array{SheetPoint{x.px(x.low), y.px(x.low)}, SheetPoint{x.px(x.high), y.px(x.high)}}, kUnit);
  for (const PlottedFrame& frame : frames) {
    if (frame.raw_level_ev) sheet.dot({x.px(frame.exposure_ev), y.px(*frame.raw_level_ev)}, kSmallDotPx, true, 0.7);
  }
  for (const PlottedFrame& frame : frames) {
    const bool odd = frame.verdict == ExposureVerdict::over || frame.verdict == ExposureVerdict::under;
    sheet.dot({x.px(frame.exposure_ev), y.px(frame.level_ev)}, kDotPx, odd, 0);
  }
  sheet.unclip();
}

void draw_marks(Sheet& sheet, const ExposureSet& set, const SheetBox& field) {
  const auto& marks = set.audit->diaphragm;
  std::vector<double> all = {-0.25, 0.25};
  for (const MarkError& mark : marks) all.insert(all.end(), {mark.low_ev, mark.high_ev});
  // One wide interval must not flatten the others.
  constexpr double kMostEv = 1.5;
  for (double& value : all) value = std::clamp(value, -kMostEv, kMostEv);
  const Axis y = axis_of(all, 0.5, field.y + field.height, field.y);
  draw_vertical_scale(sheet, field, y, "error against the widest mark, stops");
  sheet.box(field, kFrame);
  sheet.line(std::array{SheetPoint{field.x, y.px(0)}, SheetPoint{field.x + field.width, y.px(0)}}, kUnit);
  for (std::size_t m = 0; m < marks.size(); ++m) {
    const double x = field.x + (static_cast<double>(m) + 0.5) / static_cast<double>(marks.size()) * field.width;
    sheet.clip(field);
    sheet.line(std::array{SheetPoint{x, y.px(marks[m].low_ev)}, SheetPoint{x, y.px(marks[m].high_ev)}}, kBar);
    for (const double end : {marks[m].low_ev, marks[m].high_ev}) {
      sheet.line(std::array{SheetPoint{x - 5, y.px(end)}, SheetPoint{x + 5, y.px(end)}}, kBar);
    }
    sheet.dot({x, y.px(marks[m].error_ev)}, kDotPx, marks[m].blamed, 0);
    sheet.unclip();
    draw_centred(sheet, f_number_text(marks[m].mark), {x, field.y + field.height + 19}, kWords);
  }
  draw_centred(sheet, "f-number as marked; 95 % for all marks together", {field.x + field.width / 2, field.y + field.height + 42},
               kWords);
}

std::string title_of(const ExposureSet& set, std::size_t index) {
  std::string title = fmt::format("Set {}: {} frames tested", index + 1, set.tested.size());
  const SetAudit& audit = *set.audit;
  if (audit.slope) {
    title += fmt::format(", slope {:.3f} ({:.3f} to {:.3f})", audit.slope->value, audit.slope->low, audit.slope->high);
  }
  return title + fmt::format(", scatter {:.2f} stops", audit.scatter_ev);
}

std::vector<std::size_t> tested_sets(const ExposureReport& report) {
  std::vector<std::size_t> sets;
  for (std::size_t s = 0; s < report.audit.sets.size(); ++s) {
    if (report.audit.sets[s].audit) sets.push_back(s);
  }
  return sets;
}

}  // namespace

PlotSize exposure_plot_size(const ExposureReport& report) {
  const auto strips = std::max<std::size_t>(1, tested_sets(report).size());
  return {kWidthPx, kStripPx * static_cast<int>(strips)};
}

void draw_exposure_plot(const ExposureReport& report, Sheet& sheet) {
  const auto sets = tested_sets(report);
  if (sets.empty()) {
    sheet.text("No set could be tested: a set is four frames or more of one scene under one light, exposed by hand.", {40, 60},
               kWords);
    return;
  }
  double top = 0;
  for (const std::size_t s : sets) {
    const ExposureSet& set = report.audit.sets[s];
    sheet.text(title_of(set, s), {24, top + 34}, kTitle);
    sheet.text("ring: as predicted, disc: over or under, small grey: before changes of the light were taken off; dashed: slope 1",
               {24, top + 58}, kSmall);
    draw_levels(sheet, set, moved(kLeft, top));
    draw_marks(sheet, set, moved(kRight, top));
    sheet.text("ring: within its interval of the mark, disc: blamed", {kRight.x, top + 76}, kSmall);
    top += kStripPx;
  }
}

std::string exposure_plot_svg(const ExposureReport& report) {
  const PlotSize size = exposure_plot_size(report);
  Sheet sheet(size.width_px, size.height_px, SheetForm::lines);
  draw_exposure_plot(report, sheet);
  return sheet.svg(kExposurePlotMark);
}

}  // namespace focusfall
