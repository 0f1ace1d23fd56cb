#include "analysis/compare/exposure_group.h"

#include <algorithm>
#include <cmath>
#include <map>

namespace focusfall {
namespace {

// A longer pause ends a set: daylight and lamps need not be the same after a quarter of an hour (judgement).
constexpr double kLongestPauseS = 15 * 60;
// How many open sets of a group a frame is compared with: a shoot may go back and forth between a few scenes.
constexpr std::size_t kOpenSets = 4;
// Frames of a set that a new one is registered on, the latest ones first: at a far exposure few tiles are usable in
// both the first frame and this one.
constexpr std::size_t kReferences = 6;

// A longer set is cut: the search for what stands out takes a second here and grows with the cube.
constexpr std::size_t kMostSetFrames = 240;

std::vector<std::size_t> order_in_time(std::span<const ExposureFrame> frames) {
  std::vector<std::size_t> order(frames.size());
  for (std::size_t i = 0; i < order.size(); ++i) order[i] = i;
  const bool timed = std::ranges::all_of(frames, [](const ExposureFrame& f) { return f.taken_at_s.has_value(); });
  if (timed) {
    std::ranges::stable_sort(order, [&](std::size_t a, std::size_t b) { return *frames[a].taken_at_s < *frames[b].taken_at_s; });
  }
  return order;
}

// The frame on the set's own grid: registered on one of its members, whose displacement is added.
std::optional<GridMatch> placed(const FrameGroup& set, std::span<const ExposureFrame> frames, const ExposureFrame& frame) {
  std::optional<GridMatch> best;
  std::size_t tried = 0;
  for (auto member = set.frames.rbegin(); member != set.frames.rend() && tried < kReferences; ++member) {
    if (!member->match || !frames[member->frame].levels) continue;
    ++tried;
    auto match = match_grids(*frames[member->frame].levels, *frame.levels);
    if (!match) continue;
    match->shift_x += member->match->shift_x;
    match->shift_y += member->match->shift_y;
    if (!best || match->correlation > best->correlation) best = match;
  }
  return best;
}

bool within_pause(const ExposureFrame& before, const ExposureFrame& after) {
  if (!before.taken_at_s || !after.taken_at_s) return true;
  return std::abs(*after.taken_at_s - *before.taken_at_s) <= kLongestPauseS;
}

}  // namespace

std::vector<FrameGroup> group_frames(std::span<const ExposureFrame> frames, bool same_light) {
  std::vector<FrameGroup> sets;
  std::map<std::string, std::vector<std::size_t>> open;   // by group: indices of sets, the latest used last
  for (const std::size_t i : order_in_time(frames)) {
    const ExposureFrame& frame = frames[i];
    auto& candidates = open[frame.group];
    std::optional<std::size_t> home;
    GroupedFrame grouped;
    grouped.frame = i;
    for (auto candidate = candidates.rbegin(); candidate != candidates.rend(); ++candidate) {
      const FrameGroup& set = sets[*candidate];
      if (set.frames.size() >= kMostSetFrames) continue;
      if (!same_light && !within_pause(frames[set.frames.back().frame], frame)) continue;
      const auto match = frame.levels ? placed(set, frames, frame) : std::nullopt;
      const bool alike = match && match->correlation >= kSameSceneCorrelation;
      if (!alike && !same_light) continue;
      grouped.match = alike ? match : std::nullopt;
      grouped.correlation = match ? match->correlation : 0;
      home = *candidate;
      break;
    }
    if (!home) {
      home = sets.size();
      sets.emplace_back();
      if (frame.levels) grouped.match = GridMatch{.correlation = 1, .tiles = static_cast<int>(frame.levels->mean_linear.size())};
      grouped.correlation = 1;
      candidates.push_back(*home);
      if (candidates.size() > kOpenSets) candidates.erase(candidates.begin());
    } else {
      std::erase(candidates, *home);
      candidates.push_back(*home);
    }
    sets[*home].frames.push_back(grouped);
  }
  return sets;
}

}  // namespace focusfall
