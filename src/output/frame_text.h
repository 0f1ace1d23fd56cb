// The frame record for a person: a paragraph, or one line.
#pragma once

#include <string>

#include "src/pipeline/frame_record.h"

namespace focusfall {

struct TextLayout {
  int columns = 80;        // of the terminal
  int path_columns = 26;   // for the name in brief lines
};

// Layout whose name column holds the longest of the names, as far as the other columns leave room.
TextLayout text_layout(int columns, int longest_path_columns);

// Capture, predicted, measured, verdict, with units; ends with an empty line.
std::string frame_text(const FrameRecord& record, const TextLayout& layout);

// Name, focus, blur at the aim against the acceptable blur, why; on wide terminals the focus error and clipping too.
std::string brief_text(const FrameRecord& record, const TextLayout& layout);

// One line without the name: why the frame could not be done.
std::string failure_text(const FrameRecord& record);

}  // namespace focusfall
