// The legend of an overlay: the verdict in words, and a key for every kind of line, with units.
#pragma once

#include "src/output/sheet.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

inline constexpr int kLegendHeightPx = 172;   // under a picture that lies
inline constexpr int kLegendWidthPx = 440;    // beside one that stands

// The styles that picture and legend share.
inline constexpr Stroke kAcceptableContour{.width_px = 3.2};
inline constexpr Stroke kContour{.width_px = 1.5};
inline constexpr Stroke kAimBox{.width_px = 3, .casing_px = 2};
inline constexpr Stroke kBestBox{.width_px = 1.8, .dash_px = 9, .gap_px = 6};
inline constexpr Stroke kFocusLine{.width_px = 2.6, .dash_px = 22, .gap_px = 5};
inline constexpr Stroke kLimitLine{.width_px = 1.4, .dash_px = 5, .gap_px = 5};
inline constexpr Stroke kArrow{.width_px = 2.4};

// Whether the motion stands out of what still air and noise give: its lower bound is above zero.
bool motion_is_told(const std::optional<MotionReading>& motion);

void draw_legend(Sheet& sheet, const SheetBox& room, const FrameRecord& record);

}  // namespace focusfall
