// The frame record as CSV after RFC 4180: a header, then one line a frame. A choice of the record's fields, named as in
// JSON with points between the levels.
#pragma once

#include <string>
#include <string_view>

#include "src/pipeline/frame_record.h"

namespace focusfall {

// With CR LF at the end, as the standard asks.
std::string csv_header();
std::string csv_line(const FrameRecord& record);

// One text cell: quoted where needed; an apostrophe in front of = + - @, tab and carriage return, which a spreadsheet
// would take for a formula.
std::string csv_text_cell(std::string_view text);

}  // namespace focusfall
