// From frame records to what the exposure audit takes.
#pragma once

#include <string>
#include <vector>

#include "analysis/compare/exposure_audit.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

// Frames that could not be done keep their place, with nothing known about them.
ExposureFrame exposure_frame(const FrameRecord& record);

// Whether the file names software that may have changed its tone: a name in words that are not those of the camera or
// of its firmware ("Ver.1.10", "1.0.2").
bool may_be_edited(const Capture& capture);

}  // namespace focusfall
