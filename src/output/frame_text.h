// The frame record for a person: a paragraph, or one line.
#pragma once

#include <string>

#include "src/pipeline/frame_record.h"

namespace focusfall {

struct TextLayout {
  int columns = 80;        // of the terminal
  int path_columns = 26;   // for the name in brief lines
  bool bold = false;       // the name and the verdict in bold, on terminals
};

// Layout whose name column holds the longest of the names, as far as the other columns leave room.
TextLayout text_layout(int columns, int longest_name_columns);

// Capture, predicted, measured, verdict, with units; ends with an empty line.
std::string frame_text(const FrameRecord& record, const TextLayout& layout);

// "sample-images/": what stands above the brief lines of a folder; empty for files without a folder.
std::string folder_heading(const std::string& path, const TextLayout& layout);

// The titles of the columns of brief lines.
std::string brief_heading(const TextLayout& layout);

// Name without its folder, focus, blur at the aim against the acceptable blur, why; on wide terminals the focus error and clipping too.
std::string brief_text(const FrameRecord& record, const TextLayout& layout);

// One line without the name: why the frame could not be done.
std::string failure_text(const FrameRecord& record);

}  // namespace focusfall
