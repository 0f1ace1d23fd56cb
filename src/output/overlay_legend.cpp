#include "src/output/overlay_legend.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <string>
#include <vector>

#include "analysis/compare/compare.h"
#include "src/output/names.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr Lettering kTitle{.size_px = 15, .bold = true};
constexpr Lettering kHead{.size_px = 21, .bold = true};
constexpr Lettering kBody{.size_px = 14};
constexpr double kMarginPx = 18, kKeyWidthPx = 46, kLinePx = 19;

// A line of the legend: how it looks in the picture, and what it says.
struct Key {
  std::function<void(Sheet&, SheetPoint middle)> draw;
  std::string words;
};

Key key_line(const Stroke& stroke, std::string words) {
  return {[stroke](Sheet& sheet, SheetPoint m) {
            const SheetPoint ends[] = {{m.x - kKeyWidthPx / 2, m.y}, {m.x + kKeyWidthPx / 2, m.y}};
            sheet.line(ends, stroke);
          },
          std::move(words)};
}

Key key_box(const Stroke& stroke, std::string words) {
  return {[stroke](Sheet& sheet, SheetPoint m) { sheet.box({m.x - 14, m.y - 7, 28, 14}, stroke); },
          std::move(words)};
}

Key key_arrow(std::string words) {
  return {[](Sheet& sheet, SheetPoint m) { sheet.arrow(m, {kKeyWidthPx / 2 - 2, 0}, kArrow); }, std::move(words)};
}

Key key_hatch(std::string words) {
  return {[](Sheet& sheet, SheetPoint m) {
            sheet.hatch(cv::Mat(14, 40, CV_8UC1, cv::Scalar(255)), {std::round(m.x - 20), std::round(m.y - 7)});
          },
          std::move(words)};
}

Key key_cross(std::string words) {
  return {[](Sheet& sheet, SheetPoint m) {
            const SheetPoint rising[] = {{m.x - 7, m.y + 7}, {m.x + 7, m.y - 7}};
            const SheetPoint falling[] = {{m.x - 7, m.y - 7}, {m.x + 7, m.y + 7}};
            sheet.line(rising, kArrow);
            sheet.line(falling, kArrow);
          },
          std::move(words)};
}

Key remark(std::string words) { return {nullptr, std::move(words)}; }

std::string reading_text(const BlurReading& reading, const FrameRecord& record) {
  if (!reading.estimate) return "nothing to measure";
  const Interval s = blur_after_baseline(*reading.estimate, record.prediction.value_or(Prediction{}),
                                         *record.measurement);
  return fmt::format("blur {} ({:.1f} to {:.1f})", px_text(blur_disc_px(s.value)), blur_disc_px(s.low),
                     blur_disc_px(s.high));
}

std::vector<Key> blur_keys(const FrameRecord& record) {
  const Measurement& m = *record.measurement;
  std::vector<Key> keys;
  const double limit = acceptable_blur_px(record.prediction.value_or(Prediction{}));
  const char* source = name_of(record.aim_origin ? record.aim_origin->kind : FocusAreaKind::centre);
  keys.push_back(key_box(kAimBox, fmt::format("aim ({}): {}", source, reading_text(m.aim_blur, record))));
  if (m.best && m.best->reading.estimate) {
    keys.push_back(key_box(kBestBox, "sharpest part: " + reading_text(m.best->reading, record)));
  }
  if (m.tiles) {
    keys.push_back(key_line(kAcceptableContour, fmt::format("blur disc of {}, the acceptable blur", px_text(limit))));
    keys.push_back(key_line(kContour, fmt::format("blur disc of {:.2g}, {:.2g}, {:.2g} ... px; no line: nothing to "
                                                  "measure there",
                                                  2 * limit, 4 * limit, 8 * limit)));
  } else {
    keys.push_back(remark("No map of blur: only the aim was measured."));
  }
  return keys;
}

std::string clipped_text(const Clipping& c) {
  return fmt::format("clipped: R {}, G {}, B {} of the frame", percent_text(c.red), percent_text(c.green),
                     percent_text(c.blue));
}

std::vector<Key> field_keys(const FrameRecord& record) {
  const Measurement& m = *record.measurement;
  std::vector<Key> keys;
  if (m.plane) {
    keys.push_back(key_line(kFocusLine, "where focus fell on the surface"));
    keys.push_back(key_line(kLimitLine, "one limit of the depth of field before and behind"));
    if (m.plane->contact != Contact::none) {
      keys.push_back(key_cross("where the subject meets it, with the signed blur there"));
    }
  } else {
    keys.push_back(remark("No line of best focus: no surface that carries the subject was found."));
  }
  const auto motion = [&keys](const std::optional<MotionReading>& reading, const char* what) {
    if (!motion_is_told(reading)) return;
    keys.push_back(key_arrow(fmt::format("{} {} ({:.1f} to {:.1f}); direction, not length", what,
                                         px_text(reading->length_px), reading->length_low_px,
                                         reading->length_high_px)));
  };
  motion(m.motion, "motion");
  motion(m.background_motion, "background");
  if (m.clipping && m.clipping->any > 0) {
    keys.push_back(key_hatch(clipped_text(*m.clipping)));
  } else if (m.clipping) {
    keys.push_back(remark("Nothing is clipped."));
  }
  return keys;
}

// Draws the keys from the top of the room; returns the first free y.
double draw_keys(Sheet& sheet, const SheetBox& room, const std::vector<Key>& keys) {
  double y = room.y;
  for (const Key& key : keys) {
    if (key.draw) key.draw(sheet, {room.x + kKeyWidthPx / 2, y - 5});
    const double x = room.x + (key.draw ? kKeyWidthPx + 12 : 0);
    y = sheet.paragraph(key.words, {x, y, room.x + room.width - x, room.y + room.height - y}, kBody) + 6;
  }
  return y;
}

double draw_verdict(Sheet& sheet, const SheetBox& room, const FrameRecord& record) {
  const std::string name = visible_text(record.path.substr(record.path.find_last_of('/') + 1));
  double y = sheet.paragraph(name, {room.x, room.y, room.width, kLinePx}, kTitle) + 10;
  if (!record.verdict) return y;
  std::string head = name_of(record.verdict->focus);
  const char* separator = ": ";
  for (const Cause cause : record.verdict->causes) {
    head.append(separator).append(name_of(cause));
    separator = ", ";
  }
  y = sheet.paragraph(head, {room.x, y, room.width, room.y + room.height - y}, kHead) + 2;
  return sheet.paragraph(visible_text(record.verdict->summary), {room.x, y, room.width, room.y + room.height - y},
                         kBody);
}

}  // namespace

bool motion_is_told(const std::optional<MotionReading>& motion) { return motion && motion->length_low_px > 0; }

void draw_legend(Sheet& sheet, const SheetBox& room, const FrameRecord& record) {
  const double top = room.y + kMarginPx + 12;
  const double bottom = room.y + room.height - 6;
  if (room.width < 2 * room.height) {   // beside the picture: one column
    const SheetBox column{room.x + kMarginPx, top, room.width - 2 * kMarginPx, bottom - top};
    double y = draw_verdict(sheet, column, record) + 24;
    if (!record.measurement) return;
    y = draw_keys(sheet, {column.x, y, column.width, bottom - y}, blur_keys(record)) + 12;
    draw_keys(sheet, {column.x, y, column.width, bottom - y}, field_keys(record));
    return;
  }
  const double third = (room.width - 4 * kMarginPx) / 3;
  const auto column = [&](int i) {
    return SheetBox{room.x + kMarginPx + i * (third + kMarginPx), top, third, bottom - top};
  };
  draw_verdict(sheet, column(0), record);
  if (!record.measurement) return;
  draw_keys(sheet, column(1), blur_keys(record));
  draw_keys(sheet, column(2), field_keys(record));
}

}  // namespace focusfall
