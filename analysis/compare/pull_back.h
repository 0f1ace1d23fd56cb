// How much less exposure would keep the highlights, or how much more they would bear.
#pragma once

#include <optional>
#include <vector>

#include "analysis/compare/exposure_frame.h"

namespace focusfall {

struct HighlightRoom {
  std::optional<PullBack> pull_back;
  std::optional<double> room_ev;
};

// `share_above` as in Highlights, in stops of exposure as the picture's curve gives them; `clip_limit` is the fraction
// of pixels that may clip, > 0.
//  - No more than that clips: nothing to pull back; the room is where the share above falls to the limit, at most four
//    stops (the range of the table).
//  - More than that clips: how far above clipping the light went is not recorded. What is given is a lower bound. It is
//    more than 0 only where the tones run up to clipping without a gap: the distribution is then carried on past it at
//    the greatest density of its last half stop, which is the soonest that it can fall to the limit unless it swells
//    out of sight. A flat bright patch just above clipping would be such a swelling, so a share that stands apart from
//    what lies under it gives a bound of 0.
HighlightRoom highlight_room(const std::vector<float>& share_above, double clip_limit);

// Level in stops below clipping (<= 0) above which `share` of the pixels lies; std::nullopt where more than that clips
// or where the table ends.
std::optional<double> highlight_level_ev(const std::vector<float>& share_above, double share);

}  // namespace focusfall
