#include "analysis/compare/exposure_audit.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>

#include "analysis/compare/exposure_bracket.h"
#include "analysis/compare/exposure_curve.h"
#include "analysis/compare/exposure_group.h"
#include "analysis/compare/pull_back.h"
#include "analysis/optics/exposure.h"
#include "analysis/optics/series.h"

namespace focusfall {
namespace {

// What a reflected-light meter leaves open about one mid-tone: its constant (.16 stop between 12.5 and 14) and, far
// more, which part of the scene it weighed. Standard deviation, stops. Judgement.
constexpr double kMeterSigmaEv = 0.5;
constexpr double kNormal95 = 1.959964;

// A curve whose shape and contrast come from the frames leaves nothing to test in fewer than these. Judgement.
constexpr std::size_t kLeastBentFrames = 12;

// The level is compared in the middle of the frame, where a lens vignettes least: within this part of the half
// diagonal. Corners lie beyond the second part.
constexpr double kCentralRadius = 0.55, kCornerRadius = 0.8;

using Tiles = std::vector<std::vector<std::optional<TileLevel>>>;

double radius_of_tile(const LevelGrid& grid, std::size_t i) {
  const auto column = static_cast<double>(i % static_cast<std::size_t>(grid.columns));
  const auto row = static_cast<double>(i / static_cast<std::size_t>(grid.columns));
  const double x = column + 0.5 - grid.columns / 2.0, y = row + 0.5 - grid.rows / 2.0;
  return std::hypot(x, y) / (0.5 * std::hypot(grid.columns, grid.rows));
}

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

double exact_time_s(const ExposureFrame& f) { return exact_exposure_time_s(*f.exposure_time_s).value_or(*f.exposure_time_s); }

// f-number of the light that comes through: exact mark, close-up, transmittance.
double effective_f_number(const ExposureFrame& f) {
  const double marked = exact_f_number(*f.f_number).value_or(*f.f_number);
  return t_number(marked * f.working_ratio, f.transmittance.value_or(1));
}

// ---- one frame on its own -------------------------------------------------------------------------------------------

void set_mid_tone(const ExposureFrame& frame, FrameExposure& result) {
  result.exposure_ev = set_exposure_ev(frame);
  if (!frame.tone) return;
  const double level = frame.tone->aim_median_linear.value_or(frame.tone->median_linear);
  if (!(level > 0)) return;
  result.measured_ev = std::log2(level / kMidToneLevel);
  if (!result.exposure_ev) return;
  // H = q L t / N^2 turned round. The light that the lens loses stands in q.
  LensLoss loss;
  loss.transmittance = frame.transmittance.value_or(loss.transmittance);
  const double marked = exact_f_number(*frame.f_number).value_or(*frame.f_number) * frame.working_ratio;
  const double per_luminance = focal_plane_exposure_lx_s(1, marked, exact_time_s(frame), loss);
  result.implied_luminance_cd_m2 = exposure_of_level_lx_s(level, *frame.iso_speed) / per_luminance;
}

// The meter's own word, where it did not choose the exposure.
void predict_by_brightness(const ExposureFrame& frame, FrameExposure& result) {
  if (!frame.brightness_apex || !result.measured_ev || !result.implied_luminance_cd_m2) return;
  if (!frame.manual_exposure.value_or(false) || frame.flash_fired.value_or(true)) return;
  const double luminance = luminance_of_brightness_value_cd_m2(*frame.brightness_apex);
  const double error = std::log2(*result.implied_luminance_cd_m2 / luminance);
  const double half = kNormal95 * kMeterSigmaEv;
  result.basis = ExposureBasis::brightness;
  result.error_ev = Interval{error, error - half, error + half};
  result.predicted_ev = *result.measured_ev - error;
  const bool outside = error - half > 0 || error + half < 0;
  result.verdict = !outside  ? ExposureVerdict::as_predicted
                   : error > 0 ? ExposureVerdict::over
                               : ExposureVerdict::under;
}

void set_highlights(const ExposureFrame& frame, double clip_limit, FrameExposure& result) {
  if (!frame.highlights) return;
  HighlightRoom room = highlight_room(frame.highlights->frame_share_above, clip_limit);
  if (frame.aim_named && !frame.highlights->aim_share_above.empty()) {
    const HighlightRoom aim = highlight_room(frame.highlights->aim_share_above, clip_limit);
    if (aim.pull_back->bound == Bound::lower) {
      if (room.pull_back->bound == Bound::none || aim.pull_back->ev > room.pull_back->ev) room.pull_back = aim.pull_back;
      room.room_ev.reset();
    } else if (room.room_ev) {
      room.room_ev = std::min(*room.room_ev, *aim.room_ev);
    }
  }
  result.pull_back = room.pull_back;
  result.room_ev = room.room_ev;
}

// ---- sets -----------------------------------------------------------------------------------------------------------

bool is_manual(const ExposureFrame& f, bool same_light) { return f.manual_exposure.value_or(same_light); }
bool is_without_flash(const ExposureFrame& f, bool same_light) { return !f.flash_fired.value_or(!same_light); }

// What keeps most of the frames of a set from being tested.
NotTestable reason_of(std::span<const ExposureFrame> frames, const FrameGroup& group, bool same_light) {
  std::size_t automatic = 0, flash = 0, unset = 0, moved = 0;
  for (const GroupedFrame& g : group.frames) {
    if (!is_manual(frames[g.frame], same_light)) ++automatic;
    else if (!is_without_flash(frames[g.frame], same_light)) ++flash;
    else if (!set_exposure_ev(frames[g.frame])) ++unset;
    else if (!g.match) ++moved;
  }
  const std::size_t most = std::max({automatic, flash, unset, moved});
  if (most == 0 || group.frames.size() < kLeastSetFrames) return NotTestable::too_few_frames;
  if (most == automatic) return NotTestable::automatic_exposure;
  if (most == flash) return NotTestable::flash;
  return most == unset ? NotTestable::settings_missing : NotTestable::scene_changes;
}

// Relative levels of the frames of a set that could be registered, by place in `group.frames`.
struct SetLevels {
  std::vector<std::size_t> members;   // places in the group
  RelativeLevels relative;
  Tiles all_tiles;                    // of the members, whole frame
};

SetLevels levels_of(std::span<const ExposureFrame> frames, const FrameGroup& group) {
  SetLevels levels;
  Tiles central, quantiles;
  for (std::size_t k = 0; k < group.frames.size(); ++k) {
    const GroupedFrame& g = group.frames[k];
    if (!g.match || !frames[g.frame].levels) continue;
    const LevelGrid& grid = *frames[g.frame].levels;
    levels.members.push_back(k);
    levels.all_tiles.push_back(registered_levels(grid, *g.match));
    central.push_back(levels.all_tiles.back());
    quantiles.push_back(quantile_levels(frames[g.frame].highlights.value_or(Highlights{})));
    for (std::size_t i = 0; i < central.back().size(); ++i) {
      if (radius_of_tile(grid, i) > kCentralRadius) central.back()[i].reset();
    }
  }
  if (!central.empty()) levels.relative = relative_levels(central, quantiles);
  return levels;
}

// Corner against centre by f-number, from the tiles: what is left of a tile beside its frame's level, averaged over the
// frames of a mark, relative to the smallest opening.
std::vector<Vignetting> vignetting_of(std::span<const ExposureFrame> frames, const FrameGroup& group, const SetLevels& levels) {
  std::map<double, std::vector<std::size_t>> by_mark;   // members
  for (std::size_t m = 0; m < levels.members.size(); ++m) {
    const ExposureFrame& frame = frames[group.frames[levels.members[m]].frame];
    if (frame.f_number && levels.relative.frames[m]) by_mark[*frame.f_number].push_back(m);
  }
  if (by_mark.size() < 2) return {};
  const auto corner_tiles = [&](std::size_t member) {
    const LevelGrid& grid = *frames[group.frames[levels.members[member]].frame].levels;
    std::vector<std::optional<double>> values(levels.all_tiles[member].size());
    for (std::size_t i = 0; i < values.size(); ++i) {
      const auto& tile = levels.all_tiles[member][i];
      if (!tile || radius_of_tile(grid, i) < kCornerRadius) continue;
      values[i] = levels.relative.shape.exposure_ev(tile->level_ev) - levels.relative.frames[member]->level_ev;
    }
    return values;
  };
  const auto mean_corner = [&](const std::vector<std::size_t>& members) {
    std::vector<std::vector<double>> values;
    for (const std::size_t m : members) {
      const auto tiles = corner_tiles(m);
      values.resize(tiles.size());
      for (std::size_t i = 0; i < tiles.size(); ++i) {
        if (tiles[i]) values[i].push_back(*tiles[i]);
      }
    }
    std::vector<std::optional<double>> middle(values.size());
    for (std::size_t i = 0; i < values.size(); ++i) {
      if (!values[i].empty()) middle[i] = median(values[i]);
    }
    return middle;
  };
  const auto reference = mean_corner(by_mark.rbegin()->second);
  std::vector<Vignetting> result;
  for (const auto& [mark, members] : by_mark) {
    const auto corner = mean_corner(members);
    std::vector<double> differences;
    for (std::size_t i = 0; i < corner.size(); ++i) {
      if (corner[i] && reference[i]) differences.push_back(*corner[i] - *reference[i]);
    }
    if (differences.empty()) continue;
    result.push_back({mark, median(std::move(differences)), static_cast<int>(members.size())});
  }
  return result;
}

void test_set(std::span<const ExposureFrame> frames, const FrameGroup& group, const SetLevels& levels, bool same_light,
              ExposureSet& set) {
  std::vector<SetFrame> tested;
  for (std::size_t m = 0; m < levels.members.size(); ++m) {
    const std::size_t index = group.frames[levels.members[m]].frame;
    const ExposureFrame& frame = frames[index];
    const auto exposure_ev = set_exposure_ev(frame);
    const auto& level = levels.relative.frames[m];
    if (!exposure_ev || !level || !is_manual(frame, same_light) || !is_without_flash(frame, same_light)) continue;
    tested.push_back({.f_number = *frame.f_number,
                      .exposure_time_s = *frame.exposure_time_s,
                      .iso_speed = *frame.iso_speed,
                      .exposure_ev = *exposure_ev,
                      .level_ev = level->level_ev,
                      .sigma_ev = level->sigma_ev,
                      .taken_at_s = frame.taken_at_s});
    set.tested.push_back(index);
  }
  if (tested.size() < kLeastSetFrames) {
    set.tested.clear();
    set.reason = reason_of(frames, group, same_light);
    return;
  }
  if (set.curve_bent && tested.size() < kLeastBentFrames) {
    set.tested.clear();
    set.reason = NotTestable::curve_unknown;
    return;
  }
  set.audit = audit_set(tested, {.contrast_unknown = set.curve_bent});
}

void apply_set(const ExposureSet& set, std::vector<FrameExposure>& results) {
  if (!set.audit) return;
  for (std::size_t k = 0; k < set.tested.size(); ++k) {
    FrameExposure& result = results[set.tested[k]];
    const SetFrameError& error = set.audit->frames[k];
    result.basis = ExposureBasis::set;
    result.error_ev = error.error_ev;
    result.verdict = error.verdict;
    result.cause = error.cause;
    if (result.measured_ev) result.predicted_ev = *result.measured_ev - error.error_ev.value;
  }
}

// Stops of exposure that lie between a decoded level and clipping: the shape of the set's curve and its contrast.
double exposure_of_level_ev(const ExposureSet& set, const SetLevels& levels, double level_ev) {
  return levels.relative.shape.exposure_ev(level_ev) / (set.audit ? set.audit->contrast : 1);
}

// Room in stops of the picture becomes room in stops of exposure.
void rescale_room(const ExposureSet& set, const SetLevels& levels, std::vector<FrameExposure>& results) {
  for (const std::size_t frame : set.frames) {
    if (auto& room_ev = results[frame].room_ev) room_ev = -exposure_of_level_ev(set, levels, -*room_ev);
  }
}

// A darker frame of the set that shows the highlights whole says how far above clipping they went in this one.
void pull_back_by_siblings(std::span<const ExposureFrame> frames, const FrameGroup& group, const SetLevels& levels,
                           double clip_limit, const ExposureSet& set, std::vector<FrameExposure>& results) {
  const double contrast = set.audit ? set.audit->contrast : 1;
  for (std::size_t m = 0; m < levels.members.size(); ++m) {
    FrameExposure& result = results[group.frames[levels.members[m]].frame];
    const auto& own = levels.relative.frames[m];
    if (!own || !result.pull_back || result.pull_back->bound != Bound::lower) continue;
    std::optional<double> nearest_level;
    for (std::size_t s = 0; s < levels.members.size(); ++s) {
      const ExposureFrame& sibling = frames[group.frames[levels.members[s]].frame];
      const auto& other = levels.relative.frames[s];
      if (s == m || !other || !sibling.highlights || other->level_ev >= own->level_ev) continue;
      const auto level_ev = highlight_level_ev(sibling.highlights->frame_share_above, clip_limit);
      if (!level_ev || (nearest_level && other->level_ev <= *nearest_level)) continue;
      const double pull_back = (own->level_ev - other->level_ev) / contrast + exposure_of_level_ev(set, levels, *level_ev);
      nearest_level = other->level_ev;
      result.pull_back = PullBack{std::max(0.0, pull_back), Bound::none};
    }
  }
}

}  // namespace

const char* exposure_cause_name(ExposureCause cause) {
  switch (cause) {
    case ExposureCause::none: return "none";
    case ExposureCause::diaphragm: return "diaphragm";
    case ExposureCause::shutter: return "shutter";
    case ExposureCause::iso: return "iso";
    case ExposureCause::diaphragm_or_shutter: return "diaphragm or shutter";
    case ExposureCause::light_flickers: return "light flickers";
    case ExposureCause::single: return "single";
  }
  return "none";
}

const char* exposure_basis_name(ExposureBasis basis) {
  switch (basis) {
    case ExposureBasis::none: return "none";
    case ExposureBasis::set: return "set";
    case ExposureBasis::brightness: return "brightness value";
  }
  return "none";
}

const char* not_testable_text(NotTestable reason) {
  switch (reason) {
    case NotTestable::tested: return "tested";
    case NotTestable::too_few_frames: return "fewer than four frames of one scene under one light";
    case NotTestable::automatic_exposure: return "exposed automatically, so the level stays put and says nothing";
    case NotTestable::settings_missing: return "f-number, exposure time or ISO is not recorded";
    case NotTestable::flash: return "flash fired, or it is not recorded whether it did";
    case NotTestable::scene_changes: return "the frames do not show the same scene";
    case NotTestable::curve_unknown: return "the tone curve is not known, and the frames are too few to find it";
  }
  return "";
}

std::optional<double> set_exposure_ev(const ExposureFrame& frame) {
  if (!frame.f_number || !frame.exposure_time_s || !frame.iso_speed) return std::nullopt;
  return std::log2(exact_time_s(frame) * *frame.iso_speed) - aperture_value(effective_f_number(frame));
}

ExposureAudit audit_exposure(std::span<const ExposureFrame> frames, const ExposureOptions& options) {
  ExposureAudit audit;
  audit.frames.resize(frames.size());
  for (std::size_t i = 0; i < frames.size(); ++i) {
    set_mid_tone(frames[i], audit.frames[i]);
    predict_by_brightness(frames[i], audit.frames[i]);
    set_highlights(frames[i], options.clip_limit, audit.frames[i]);
  }
  for (const FrameGroup& group : group_frames(frames, options.same_light)) {
    ExposureSet set;
    const SetLevels levels = levels_of(frames, group);
    set.curve_bent = !levels.relative.shape.is_identity();
    for (const GroupedFrame& g : group.frames) {
      audit.frames[g.frame].set = audit.sets.size();
      set.frames.push_back(g.frame);
      set.exposure_ev.push_back(set_exposure_ev(frames[g.frame]));
    }
    set.level_ev.resize(set.frames.size());
    for (std::size_t m = 0; m < levels.members.size(); ++m) {
      if (const auto& level = levels.relative.frames[m]) set.level_ev[levels.members[m]] = level->level_ev;
    }
    test_set(frames, group, levels, options.same_light, set);
    apply_set(set, audit.frames);
    rescale_room(set, levels, audit.frames);
    pull_back_by_siblings(frames, group, levels, options.clip_limit, set, audit.frames);
    set.vignetting = vignetting_of(frames, group, levels);
    set.brackets = find_brackets(frames, set);
    audit.sets.push_back(std::move(set));
  }
  return audit;
}

}  // namespace focusfall
