#include "src/output/lens_plot.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "analysis/compare/lens_words.h"
#include "src/output/quantity_text.h"
#include "src/output/sheet.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr double kTop = 84, kPlotHeight = 380, kBottom = 118;   // px
constexpr double kLeft = 92, kRight = 24;
constexpr double kLeastGroupWidth = 280;                        // room for the words below a group
constexpr double kGroupGap = 20;
constexpr double kLeastWidth = 480;                             // room for the title
constexpr double kMostWidth = 4000;                             // beyond, frames are drawn closer
constexpr double kUsualStep = 16;                               // from one frame to the next
constexpr double kLeastRange = 2;                               // limits, to each side: the rule goes from -2 to +2
constexpr double kMostRange = 12;                               // what lies farther out stands at the border

struct Column {
  double left = 0, width = 0, step = 0;
};

// From limits of the depth of field to px; + is behind and stands on top.
struct Axis {
  double range = kLeastRange;
  double y(double limits) const {
    return kTop + kPlotHeight * (range - std::clamp(limits, -range, range)) / (2 * range);
  }
};

const Interval& frame_limits(const LensOutput& output, std::size_t reading) {
  return *output.records[output.input.readings[reading].frame].verdict->defocus_limits;
}

Axis axis_for(const LensOutput& output) {
  double most = kLeastRange;
  for (const LensReading& reading : output.input.readings) {
    const Interval& limits = *output.records[reading.frame].verdict->defocus_limits;
    most = std::max({most, std::abs(limits.low), std::abs(limits.high)});
  }
  return {std::min(std::ceil(most), kMostRange)};
}

std::vector<Column> columns_for(const LensOutput& output) {
  std::size_t frames = 0;
  for (const LensGroup& group : output.report.groups) frames += group.of.readings.size();
  const double step = std::min(kUsualStep, kMostWidth / std::max(1.0, static_cast<double>(frames)));
  std::vector<Column> columns;
  double left = kLeft;
  for (const LensGroup& group : output.report.groups) {
    const double count = static_cast<double>(group.of.readings.size());
    const double width = std::max(kLeastGroupWidth, (count + 1) * step);
    columns.push_back({left, width, width / (count + 1)});
    left += width + kGroupGap;
  }
  return columns;
}

void draw_axis(Sheet& sheet, const Axis& axis, double right) {
  sheet.fill({kLeft, axis.y(1), right - kLeft, axis.y(-1) - axis.y(1)}, 0.9);
  const int tick = axis.range > 6 ? 2 : 1;
  for (int limits = -static_cast<int>(axis.range); limits <= static_cast<int>(axis.range); limits += 1) {
    const double y = axis.y(limits);
    const bool edge = std::abs(limits) == 1;
    if (limits % tick != 0 && !edge) continue;
    const std::array<SheetPoint, 2> line{SheetPoint{kLeft, y}, SheetPoint{right, y}};
    sheet.line(line, {.width_px = limits == 0 ? 1.4 : 0.7,
                      .dash_px = edge ? 6.0 : 0.0,
                      .gap_px = 4,
                      .casing_px = 0,
                      .grey = limits == 0 || edge ? 0.25 : 0.75});
    const std::string words = fmt::format("{:+d}", limits);
    sheet.text(limits == 0 ? "0" : words, {kLeft - 30, y + 5}, {.size_px = 14});
  }
  sheet.text("behind", {8, axis.y(axis.range) + 26}, {.size_px = 13, .grey = 0.3});
  sheet.text("in front", {8, axis.y(-axis.range) - 16}, {.size_px = 13, .grey = 0.3});
}

// The group's bias as a line with its interval as a frame around it.
void draw_bias(Sheet& sheet, const Axis& axis, const Column& column, const Interval& bias) {
  const double x = column.left + column.step / 2, right = column.left + column.width - column.step / 2;
  const double top = axis.y(bias.high), bottom = axis.y(bias.low);
  sheet.box({x, top, right - x, std::max(1.0, bottom - top)}, {.width_px = 0.8, .casing_px = 0, .grey = 0.35});
  const std::array<SheetPoint, 2> line{SheetPoint{x, axis.y(bias.value)}, SheetPoint{right, axis.y(bias.value)}};
  sheet.line(line, {.width_px = 2.2, .casing_px = 0});
}

void draw_frames(Sheet& sheet, const Axis& axis, const Column& column, const LensOutput& output,
                 const LensGroup& group) {
  for (std::size_t k = 0; k < group.of.readings.size(); ++k) {
    const Interval& limits = frame_limits(output, group.of.readings[k]);
    const double x = column.left + column.step * static_cast<double>(k + 1);
    const std::array<SheetPoint, 2> bar{SheetPoint{x, axis.y(limits.low)}, SheetPoint{x, axis.y(limits.high)}};
    sheet.line(bar, {.width_px = 1.2, .casing_px = 0, .grey = 0.2});
    sheet.dot({x, axis.y(limits.value)}, 6, true, 0);
  }
}

void write_below(Sheet& sheet, const Column& column, const LensGroup& group) {
  const ReadingGroup& of = group.of;
  std::string conditions = fmt::format("{}, {}", millimetres_text(of.focal_length_mm), f_number_text(of.f_number));
  if (of.focus_distance_m) conditions += ", " + distance_text(*of.focus_distance_m);
  conditions += fmt::format("; 1 limit is {:.0f} µm", of.limit_um);
  const std::string finding = fmt::format("{}, {} frames", lens_finding_name(group.finding), of.readings.size());
  const std::string owner = fmt::format("{} on {}", of.lens.empty() ? "lens not recorded" : of.lens,
                                        of.body.empty() ? "body not recorded" : of.body);
  const SheetBox room{column.left, kTop + kPlotHeight + 22, column.width, kBottom - 26};
  const double below = sheet.paragraph(finding, room, {.size_px = 14, .bold = true});
  const double next = sheet.paragraph(conditions, {room.x, below, room.width, room.y + room.height - below},
                                      {.size_px = 13});
  sheet.paragraph(visible_text(owner), {room.x, next, room.width, room.y + room.height - next},
                  {.size_px = 12, .grey = 0.25});
}

}  // namespace

std::string lens_plot_svg(const LensOutput& output) {
  const std::vector<Column> columns = columns_for(output);
  const double right = columns.empty() ? kLeft + kLeastGroupWidth : columns.back().left + columns.back().width;
  const Axis axis = axis_for(output);
  const double width = std::max(right + kRight, kLeastWidth);
  Sheet sheet(static_cast<int>(std::lround(width)),
              static_cast<int>(kTop + kPlotHeight + kBottom), SheetForm::lines);
  sheet.text("Where focus fell, in limits of the depth of field", {12, 26}, {.size_px = 17, .bold = true});
  sheet.paragraph("Points with bars: frames and their 95 % intervals. Line in a frame: the bias. Band: the depth of focus.",
                  {12, 46, width - 24, 30}, {.size_px = 12, .grey = 0.3});
  draw_axis(sheet, axis, right);
  for (std::size_t g = 0; g < columns.size(); ++g) {
    const LensGroup& group = output.report.groups[g];
    if (group.bias_limits) draw_bias(sheet, axis, columns[g], *group.bias_limits);
    draw_frames(sheet, axis, columns[g], output, group);
    write_below(sheet, columns[g], group);
  }
  return sheet.svg(kLensPlotMark);
}

}  // namespace focusfall
