// One frame as a picture to look at: where it is how much blurred, where focus fell, what clipped. Readable in grey
// print: lines, dashes, hatching, letters and numbers, no colours.
#pragma once

#include <string>

#include "src/output/overlay_picture.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

inline constexpr int kOverlayLongSidePx = 1600;       // of the whole sheet, legend included
inline constexpr const char* kOverlayMark = "Focusfall overlay";   // text chunk that says who wrote the PNG

// The room that the legend leaves for a picture of this shape (as displayed).
LargestSize overlay_picture_room(bool upright);

// The record drawn over its picture, as the bytes of a PNG. Contours where the record has a tile map. `picture` is
// turned by the record's orientation.
std::string overlay_png(const FrameRecord& record, const OverlayPicture& picture);

}  // namespace focusfall
