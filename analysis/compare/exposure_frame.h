// What the exposure audit is told about one frame of a set, and what it says about it.
//
// Everything about exposure is in stops (ev). The exposure that a frame was set to is E = log2(t S / N^2) with the exact
// values that the marks stand for; its measured level moves with E, stop by stop, under one light.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "analysis/compare/verdict.h"
#include "analysis/conventions.h"
#include "analysis/measure/measurement.h"

namespace focusfall {

struct ExposureFrame {
  std::string group;                        // body and picture settings: frames of different groups share no set
  std::optional<double> taken_at_s;         // any origin; absent: the order given is the order in time
  std::optional<double> f_number;           // as marked; working f-number / marked one in working_ratio
  std::optional<double> exposure_time_s;
  std::optional<double> iso_speed;
  double working_ratio = 1;                 // >= 1, close-up
  std::optional<double> transmittance;      // of the lens, 0..1
  std::optional<double> exposure_bias_ev;
  std::optional<double> brightness_apex;
  std::optional<bool> manual_exposure;      // absent: not recorded
  std::optional<bool> flash_fired;
  bool aim_named = false;                   // somebody named the aim, so that clipping inside it counts on its own
  std::optional<Clipping> clipping;
  std::optional<Tone> tone;
  std::optional<LevelGrid> levels;
  std::optional<Highlights> highlights;
};

// Why a level is what it is, by pattern over the set.
enum class ExposureCause {
  none,
  diaphragm,               // all frames at one f-number are off
  shutter,                 // all frames at one exposure time
  iso,                     // all frames at one sensitivity
  diaphragm_or_shutter,    // two controls moved together: which one cannot be told
  light_flickers,          // scatter at short exposures only
  single                   // this frame alone: flash misfire, passing cloud
};
const char* exposure_cause_name(ExposureCause cause);

// How the predicted level came about.
enum class ExposureBasis { none, set, brightness };
const char* exposure_basis_name(ExposureBasis basis);

struct PullBack {
  double ev = 0;             // how much less exposure, >= 0
  Bound bound = Bound::none; // lower: at least this much; the frame does not record how far above clipping it went
};

// The audit of one frame. Levels in stops from the standard mid-tone (kMidToneLevel).
struct FrameExposure {
  std::size_t set = 0;                       // index of its set
  std::optional<double> exposure_ev;         // as set, log2(t S / N^2)
  std::optional<double> measured_ev;         // mid-tone of the aim, else of the frame
  std::optional<double> predicted_ev;
  std::optional<Interval> error_ev;          // measured - predicted; light changes of the set already taken off
  ExposureBasis basis = ExposureBasis::none;
  ExposureVerdict verdict = ExposureVerdict::unknown;
  ExposureCause cause = ExposureCause::none;
  std::optional<double> implied_luminance_cd_m2;   // of the mid-tone, from level and setting
  std::optional<PullBack> pull_back;
  std::optional<double> room_ev;             // how much more exposure before --clip-limit is reached, >= 0
};

}  // namespace focusfall
