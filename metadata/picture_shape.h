// Whether a picture is still the one that the camera recorded, as far as its two sizes tell.
#pragma once

#include "metadata/read_capture.h"

namespace focusfall {

// Neither side is 0.
bool is_known(DecodedSize size);

// The same ratio of the long side to the short one, within 2 %: cropping of masked borders and rounding stay below, a
// crop to another format does not. Both sizes must be known.
bool same_shape(DecodedSize a, DecodedSize b);

// One is upright and the other is not. Both sizes must be known; a square is never turned.
bool is_turned(DecodedSize a, DecodedSize b);

}  // namespace focusfall
