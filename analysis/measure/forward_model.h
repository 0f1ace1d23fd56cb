// What the edge estimator would report for a given optical system: compare like with like.
#pragma once

#include "analysis/optics/prediction.h"

namespace focusfall {

struct ForwardReading {
  double squared_disc_px2 = 0;   // as edge_blur() would report it; may be negative
  double edge_rise_px = 0;       // 10-90 %
};

// Draws an ideal edge through the system (disc or exact defocused aperture, diffraction, pixel, motion) at six
// angles, runs the same estimator on it and returns the median.
// struct SystemResponse stands in analysis/optics/system_response.h.
struct SystemResponse;
ForwardReading forward_reading(const SystemResponse& response);

}  // namespace focusfall
