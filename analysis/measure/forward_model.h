// What the edge estimator would report for a given optical system: compare like with like.
//
// An ideal edge is drawn through the system at several angles and run through the very fit that measures pictures, so
// that a prediction and a measurement err alike. Diffraction has no second moment and cannot be added in quadrature;
// this is the way to bring it in.
#pragma once

#include <optional>

#include "analysis/optics/system_response.h"

namespace focusfall {

struct ForwardReading {
  double squared_disc_px2 = 0;   // as edge_blur() would report it; may be negative
  double edge_rise_px = 0;       // 10-90 % of the reported disc with the pixel
};

// `response.pixel_aperture_px` is taken as 1: the estimator's tables hold the pixel box. With motion the angles are
// spread over all directions of the edge normal and the median is what a region of mixed edges would report.
// nullopt where the edge is too wide for the coarsest level (about 170 px).
std::optional<ForwardReading> forward_reading(const SystemResponse& response);

}  // namespace focusfall
