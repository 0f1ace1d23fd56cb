// From frame records with tile maps to the field of focus on a flat wall, square-on.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/compare/lens_field.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

struct FlatRequest {
  FocusTravel travel = FocusTravel::unknown;   // of the frames in their order
  std::vector<std::string> upside_down;        // files or folders of the second series, camera turned by half a circle
};

// um at the sensor. Tilt and curvature count from the centre to half a diagonal.
struct FlatResult {
  int frames = 0;                              // that had a tile map to fit, both series together
  std::optional<Interval> tilt_um;
  std::optional<double> axis_deg;              // 0..180 from +x towards +y (down), unrotated frame
  std::optional<Interval> curvature_um;        // its size where `signed_field` is false
  bool signed_field = false;
  std::optional<Interval> camera_tilt_um;      // lens and body without the wall: from two signed series
  std::string text;
};

FlatResult flat_field(std::span<const FrameRecord> records, const FlatRequest& request);

}  // namespace focusfall
