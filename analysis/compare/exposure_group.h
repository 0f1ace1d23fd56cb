// Which frames belong to one set: same group, same scene, close in time.
#pragma once

#include <span>
#include <vector>

#include "analysis/compare/exposure_audit.h"
#include "analysis/compare/exposure_register.h"

namespace focusfall {

struct GroupedFrame {
  std::size_t frame = 0;           // index into the frames given
  std::optional<GridMatch> match;  // on the set's first frame, or on the one that it was chained to
  double correlation = 0;
};

struct FrameGroup {
  std::vector<GroupedFrame> frames;   // in the order of time
};

std::vector<FrameGroup> group_frames(std::span<const ExposureFrame> frames, bool same_light);

}  // namespace focusfall
