// What can be a focus area.
#pragma once

#include "metadata/capture.h"

namespace focusfall {

// Whether the box is no larger than the frame and has its centre on it; its edges may reach out of the frame.
bool lies_in_frame(const FractionRect& box);

}  // namespace focusfall
