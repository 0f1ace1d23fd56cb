// The exposure of a shoot: sets found, levels compared with the exposures that were set, highlights, brackets.
//
// A set is frames of one group (body and picture settings) that show the same static scene, close in time. It is testable
// where its frames were exposed by hand and without flash: in automatic exposure the level stays put whatever the
// diaphragm does, and says nothing. The curve from the picture's codes to light is that of sRGB or of the profile;
// where the tiles of the set contradict it, its shape is found from them, and its contrast is fitted to the exposures,
// so that the slope of such a set is checked by halves: fitted on every second frame, tested on the others.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/compare/exposure_frame.h"
#include "analysis/compare/exposure_set.h"

namespace focusfall {

struct ExposureOptions {
  double clip_limit = 0.001;       // fraction of the aim or the frame that may clip. Judgement
  bool same_light = false;         // the user's word: all frames of a group are one set under one light, and frames
                                   //   whose exposure mode or flash is not recorded count as manual, without flash
};

enum class NotTestable { tested, too_few_frames, automatic_exposure, settings_missing, flash, scene_changes,
                         curve_unknown };
// One clause for people.
const char* not_testable_text(NotTestable reason);

// Light in the corners against the centre, at one f-number, relative to the smallest opening of the set.
struct Vignetting {
  double f_number = 0;
  double corner_ev = 0;            // negative: the corners are darker than at the smallest opening
  int frames = 0;
};

// Frames taken one after the other at exposures in equal steps.
struct Bracket {
  // Where the tone curve of the set is not known, measured_ev is scaled to span what was set: only how even the steps
  // are is then measured.
  std::vector<std::size_t> frames;     // in the order taken
  double step_ev = 0;                  // as set, > 0
  std::vector<double> set_ev;          // of each frame against the first, as set
  std::vector<std::optional<double>> measured_ev;
};

struct ExposureSet {
  std::vector<std::size_t> frames;     // in the order of time
  std::vector<std::size_t> tested;     // of these, those that the audit is made of
  NotTestable reason = NotTestable::tested;
  bool curve_bent = false;             // the tiles contradict the curve that the picture is decoded with
  std::optional<SetAudit> audit;       // its frames are those of `tested`
  std::vector<std::optional<double>> level_ev;   // relative level of each of `frames`; for the plot
  std::vector<std::optional<double>> exposure_ev;
  std::vector<Vignetting> vignetting;
  std::vector<Bracket> brackets;
};

struct ExposureAudit {
  std::vector<FrameExposure> frames;   // as given
  std::vector<ExposureSet> sets;
};

ExposureAudit audit_exposure(std::span<const ExposureFrame> frames, const ExposureOptions& options);

// E = log2(t S / N^2) with the exact values of the marks; std::nullopt where one of the three is not known.
std::optional<double> set_exposure_ev(const ExposureFrame& frame);

}  // namespace focusfall
