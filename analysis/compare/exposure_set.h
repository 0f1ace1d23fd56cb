// Frames of one static scene under one light: does the level follow the exposure, stop by stop, and who is to blame
// where it does not?
//
// The level of frame i, in stops, is
//   level_i = slope E_i + light(t_i) + error(f-number) + error(exposure time) + error(ISO) + error(frame) + noise,
// E = log2(t S / N^2) at the exact values of the marks. The light is a straight trend, steps, and a random walk. Errors
// are taken in one after the other, the one that explains most first, as long as they are significant over all that were
// tried (5 % in each family). An error of a mark needs frames in at least two separate runs of the set, since a light
// that changed before and after a single run looks the same.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "analysis/compare/exposure_frame.h"

namespace focusfall {

// A frame as the set sees it, in the order of time.
struct SetFrame {
  double f_number = 0;             // as marked
  double exposure_time_s = 0;
  double iso_speed = 0;
  double exposure_ev = 0;          // E
  double level_ev = 0;             // relative to the other frames
  double sigma_ev = 0;
  std::optional<double> taken_at_s;
};

// One mark of a control against a reference mark, with intervals that hold for all marks together at 95 %.
struct MarkError {
  double mark = 0;
  int frames = 0;
  double error_ev = 0;             // more light than the mark says: positive
  double low_ev = 0, high_ev = 0;
  bool reference = false;          // the mark that the others are compared with; its own error is 0 by definition
  bool blamed = false;
};

struct LightChange {
  std::size_t from = 0, to = 0;    // frames of the set: the step lies between them, the drift runs from one to the other
  Interval change_ev;
  bool step = false;
};

struct SetFrameError {
  Interval error_ev;               // light taken off
  ExposureVerdict verdict = ExposureVerdict::unknown;
  ExposureCause cause = ExposureCause::none;
};

struct SetAudit {
  std::optional<Interval> slope;   // absent where the exposures span less than kLeastSpanEv
  double contrast = 1;             // slope of the line that everything else is measured from: 1, or fitted (see options)
  double scatter_ev = 0;           // of a frame about the line, marks and light taken off
  std::vector<MarkError> diaphragm, shutter, iso;
  std::vector<LightChange> light_changes;
  bool light_flickers = false;
  std::vector<SetFrameError> frames;
};

// Fewer frames say nothing about a line.
inline constexpr std::size_t kLeastSetFrames = 4;
// Exposures must span a stop before a slope means anything (judgement).
inline constexpr double kLeastSpanEv = 1;
// Smaller errors are no fault: diaphragms and shutters are made to about a tenth of a stop (judgement).
inline constexpr double kLeastMarkErrorEv = 0.1;
// A single frame is odd from a sixth of a stop on, half the step of a third that controls move in (judgement).
inline constexpr double kLeastFrameErrorEv = 1.0 / 6;
// Lamps on mains flicker at 100 or 120 Hz: an exposure that holds a whole period averages it out.
inline constexpr double kFlickerPeriodS = 1.0 / 100;

struct SetOptions {
  bool contrast_unknown = false;   // the curve of the picture was bent: its contrast is fitted to the exposures
};

// At least kLeastSetFrames frames.
SetAudit audit_set(const std::vector<SetFrame>& frames, const SetOptions& options = {});

}  // namespace focusfall
