// From frame records to the two bench questions: best position of a focus series, working f-number from the slope.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <tl/expected.hpp>
#include <vector>

#include "analysis/compare/lens_bench.h"
#include "src/pipeline/lens_input.h"

namespace focusfall {

struct FocusSeries {
  std::vector<FocusStep> steps;            // positions at the sensor, um, from the first frame on
  std::vector<std::size_t> frames;         // the record of each
  double limit_um = 0;                     // half the depth of focus, median
};

struct FocusSeriesResult {
  std::optional<BestFocus> best;
  std::string text;                        // the finding, or why there is none
  std::string positions_from;              // "step" or "recorded distance"
};

// Frames of one lens and body, in the order given; manual focus is usual here. Positions are `step_um` apart, or follow
// from the recorded focus distances (image distance grows as focus comes nearer). Nearly always some frames have no
// evidence at the aim, because they lie far out of focus; they are passed over.
FocusSeriesResult focus_series(std::span<const FrameRecord> records, const std::optional<double>& step_um);

struct GroupDiaphragm {
  std::optional<DiaphragmReading> reading;
  int frames = 0;                          // that gave a slope
  std::string text;
};

// One a group of the report, in its order.
std::vector<GroupDiaphragm> group_diaphragms(std::span<const FrameRecord> records, const LensInput& input,
                                             const LensReport& report, const SurfaceAttitude& attitude);

// Units: deg (bare too), rad. 5 to 85 degrees away from square-on; beyond, a slope tells nothing.
tl::expected<double, std::string> parse_tilt_rad(const std::string& text);

// Units: um (bare too), mm.
tl::expected<double, std::string> parse_focus_step_um(const std::string& text);

}  // namespace focusfall
