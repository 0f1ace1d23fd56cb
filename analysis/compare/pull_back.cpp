#include "analysis/compare/pull_back.h"

#include <algorithm>
#include <cmath>

namespace focusfall {
namespace {

// The share within a quarter stop under clipping, against the clipped share, from which on the tones are taken to run
// up to clipping without a gap. Judgement.
constexpr double kContinuousShare = 0.5;
constexpr int kQuarterStop = 2;   // steps of the table
constexpr int kHalfStop = 4;

double share(const std::vector<float>& share_above, int step) {
  return static_cast<double>(share_above[static_cast<std::size_t>(step)]);
}

double lower_bound_ev(const std::vector<float>& share_above, double clip_limit) {
  const double clipped = share(share_above, 0);
  if (share(share_above, kQuarterStop) - clipped < kContinuousShare * clipped) return 0;
  double density = 0;   // per stop
  for (int step = 0; step < kHalfStop; ++step) {
    density = std::max(density, (share(share_above, step + 1) - share(share_above, step)) * kHighlightStepsPerStop);
  }
  return (clipped - clip_limit) / density;
}

}  // namespace

std::optional<double> highlight_level_ev(const std::vector<float>& share_above, double wanted) {
  if (share_above.empty() || share(share_above, 0) > wanted) return std::nullopt;
  for (int step = 1; step < static_cast<int>(share_above.size()); ++step) {
    const double above = share(share_above, step - 1), below = share(share_above, step);
    if (below <= wanted) continue;
    const double part = (wanted - above) / (below - above);   // of the step, linear in stops
    return -(step - 1 + part) / kHighlightStepsPerStop;
  }
  return std::nullopt;
}

HighlightRoom highlight_room(const std::vector<float>& share_above, double clip_limit) {
  HighlightRoom room;
  if (share_above.empty()) return room;
  if (share(share_above, 0) > clip_limit) {
    room.pull_back = PullBack{lower_bound_ev(share_above, clip_limit), Bound::lower};
    return room;
  }
  room.pull_back = PullBack{};
  const double last_ev = (static_cast<double>(share_above.size()) - 1) / kHighlightStepsPerStop;
  room.room_ev = -highlight_level_ev(share_above, clip_limit).value_or(-last_ev);
  return room;
}

}  // namespace focusfall
