// The exposure audit on rendered sets of forty frames: sRGB and an S-shaped tone curve, a diaphragm that is a third of a
// stop off at one marking, a light that drifts by a stop in every second set.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <atomic>
#include <cmath>
#include <mutex>
#include <span>

#include "analysis/compare/exposure_audit.h"
#include "analysis/compare/pull_back.h"
#include "tests/accuracy/scoring.h"
#include "tests/compare/shoot_frames.h"
#include "tests/render/random.h"

namespace focusfall::accuracy {
namespace {

constexpr double kClipLimit = 0.001;

struct Score {
  int sets = 0, tested = 0, named = 0, blamed = 0, bent = 0, whole = 0;
  std::vector<double> frame_errors_ev, slope_errors, fault_errors_ev, pull_back_errors_ev, room_errors_ev;
  int lower_bounds = 0, over_promised = 0;
};

constexpr double kTruthEv = 0.02;   // what noise and the JPEG move the truth's own quantile by

// What the frame on its own may say of its highlights, without darker ones beside it.
void score_alone(const ExposureFrame& frame, double truth_ev, Score& score) {
  const HighlightRoom room = highlight_room(frame.highlights->frame_share_above, kClipLimit);
  if (room.pull_back->bound != Bound::lower) return;
  ++score.lower_bounds;
  score.over_promised += room.pull_back->ev > std::max(0.0, truth_ev) + kTruthEv;
}

// A frame's error against what was put into it, relative to the frames without fault.
void score_frames(const render::Shoot& shoot, std::span<const ExposureFrame> frames, const ExposureAudit& audit,
                  double highlight_ev, Score& score) {
  for (std::size_t i = 0; i < shoot.frames.size(); ++i) {
    const FrameExposure& found = audit.frames[i];
    if (found.basis == ExposureBasis::set) {
      score.frame_errors_ev.push_back(std::abs(found.error_ev->value - shoot.frames[i].error_ev));
    }
    // Positive: beyond clipping by so much.
    const double truth_ev = highlight_ev + shoot.frames[i].gain_ev;
    score_alone(frames[i], truth_ev, score);
    if (!found.pull_back || found.pull_back->bound == Bound::lower) continue;
    if (found.room_ev) {
      if (truth_ev > -3.5) score.room_errors_ev.push_back(std::abs(*found.room_ev + truth_ev));
    } else {
      score.pull_back_errors_ev.push_back(std::abs(found.pull_back->ev - truth_ev));
    }
  }
}

void score_set(const render::ShootSpec& spec, Score& score, std::mutex& mutex) {
  const render::Shoot shoot = render::render_shoot(spec);
  const auto frames = measured_frames(shoot);
  const ExposureAudit audit = audit_exposure(frames, {.clip_limit = kClipLimit});
  const double highlight_ev = render::highlight_truth_ev(shoot.scene, kClipLimit);
  const std::scoped_lock lock(mutex);
  ++score.sets;
  score.whole += audit.sets.size() == 1;
  score_frames(shoot, frames, audit, highlight_ev, score);
  const ExposureSet& set = audit.sets.front();
  if (!set.audit) return;
  ++score.tested;
  score.bent += set.curve_bent;
  if (set.audit->slope) score.slope_errors.push_back(std::abs(set.audit->slope->value - 1));
  std::vector<double> blamed;
  for (const MarkError& m : set.audit->diaphragm) {
    if (m.blamed) blamed.push_back(m.mark);
    if (m.mark == spec.wrong_f_number) score.fault_errors_ev.push_back(std::abs(m.error_ev - spec.wrong_ev));
  }
  const bool others = std::ranges::any_of(set.audit->shutter, &MarkError::blamed) ||
                      std::ranges::any_of(set.audit->iso, &MarkError::blamed);
  score.named += blamed == std::vector{spec.wrong_f_number} && !others;
  score.blamed += !blamed.empty() || others;
}

double percent(int part, int whole) { return whole > 0 ? 100.0 * part / whole : 0; }

}  // namespace

std::vector<Figure> run_exposure(const SetOptions& options) {
  constexpr std::array kWrong = {2.0, 2.8, 4.0, 5.6, 8.0, 11.0, 16.0};   // errors are told relative to wide open
  const int sets = count_of(options, 100, 2);
  std::vector<Figure> figures;
  fmt::print("\nExposure of sets of 40 frames, {} of each kind\n", sets);
  fmt::print("  {:<22} tested  whole  curve fitted  frame error p95 / max   |slope - 1| p95   fault named  blamed  "
             "pull back p95  room p95  over-promised\n", "");
  for (const auto curve : {render::ToneCurve::srgb, render::ToneCurve::s_shaped}) {
    for (const bool faulty : {true, false}) {
      Score score;
      std::mutex mutex;
      for_each_case(sets, [&](int i, FrameMeasurer&) {
        render::Random random(first_key(options, 7) + static_cast<std::uint64_t>(i));
        render::ShootSpec spec{.key = random.bits(), .curve = curve};
        spec.light = i % 2 == 0 ? render::LightCourse::steady : render::LightCourse::drift;
        const double wrong = kWrong[static_cast<std::size_t>(random.below(static_cast<int>(kWrong.size())))];
        const double sign = random.below(2) == 0 ? 1 : -1;
        if (faulty) spec.wrong_f_number = wrong, spec.wrong_ev = sign / 3;
        score_set(spec, score, mutex);
      });
      const char* curve_name = curve == render::ToneCurve::srgb ? "sRGB" : "S-shaped";
      const std::string name = fmt::format("{}, {}", curve_name, faulty ? "1/3 stop off" : "faultless");
      const auto most = [](const std::vector<double>& v) { return v.empty() ? 0 : *std::ranges::max_element(v); };
      fmt::print("  {:<22} {:>6} {:>6} {:>13} {:>13.3f} / {:.3f} {:>17.4f} {:>13} {:>7} {:>14.3f} {:>9.3f} {:>7} of {}\n", name,
                 score.tested, score.whole, score.bent, quantile(score.frame_errors_ev, 0.95), most(score.frame_errors_ev),
                 quantile(score.slope_errors, 0.95), faulty ? score.named : 0, score.blamed,
                 quantile(score.pull_back_errors_ev, 0.95), quantile(score.room_errors_ev, 0.95), score.over_promised,
                 score.lower_bounds);
      const auto within = [](const std::vector<double>& values, double limit) {
        return percent(static_cast<int>(std::ranges::count_if(values, [&](double v) { return v <= limit; })),
                       static_cast<int>(values.size()));
      };
      const auto add = [&](const char* what, double value, double target, bool at_most, int cases) {
        figures.push_back({fmt::format("exposure, {}: {}", name, what), value, target, at_most, "%", cases});
      };
      if (curve == render::ToneCurve::srgb) {
        add("frames within .05 stop", within(score.frame_errors_ev, 0.05), 95, false, static_cast<int>(score.frame_errors_ev.size()));
      }
      add("sets with slope within 2 %", within(score.slope_errors, 0.02), 95, false, static_cast<int>(score.slope_errors.size()));
      if (faulty) add("fault found and nothing else blamed", percent(score.named, score.sets), 95, false, score.sets);
      else add("sets that blame a mark", percent(score.blamed, score.sets), 5, true, score.sets);
      add("pull back within .15 stop", within(score.pull_back_errors_ev, 0.15), 95, false, static_cast<int>(score.pull_back_errors_ev.size()));
      add("room within .15 stop", within(score.room_errors_ev, 0.15), 95, false, static_cast<int>(score.room_errors_ev.size()));
      add("lower bounds of single frames above the truth", percent(score.over_promised, score.lower_bounds), 0, true, score.lower_bounds);
    }
  }
  return figures;
}

}  // namespace focusfall::accuracy
