// Noise of a picture, from its smoothest places.
#pragma once

#include "analysis/conventions.h"
#include "analysis/measure/luma_picture.h"

namespace focusfall {

// Standard deviation of pixel noise in 8-bit codes: the second difference [1 -2 1] x [1 -2 1] / 6 has unit gain for
// white noise and hides steps; per 32 px tile median(|.|)/0.6745, then the 20 % quantile over tiles; at least 0.35
// (quantisation and JPEG hide less). After Immerkaer, "Fast noise variance estimation", 1996, with medians.
double noise_codes(const LumaPicture& picture, PixelRect region);

}  // namespace focusfall
