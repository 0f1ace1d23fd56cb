// A record with something in every field, for tests of what is made of records.
#pragma once

#include "src/pipeline/frame_record.h"

namespace focusfall {

FrameRecord sample_record();

}  // namespace focusfall
