// The verdict's words against what was done to the frame.
#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>
#include <numbers>
#include <set>

#include "analysis/compare/compare.h"
#include "analysis/measure/forward_model.h"
#include "analysis/optics/predict.h"
#include "tests/accuracy/scenes.h"
#include "tests/accuracy/scoring.h"

namespace focusfall::accuracy {
namespace {

enum class Kind { sharp, front, back, off, subject_motion, shake, panned, motion_before_blur, diffraction, nothing };
constexpr Kind kKinds[] = {Kind::sharp, Kind::front, Kind::back, Kind::off, Kind::subject_motion, Kind::shake, Kind::panned, Kind::motion_before_blur, Kind::diffraction, Kind::nothing};
const char* kind_name(Kind kind) {
  constexpr const char* kNames[] = {"on", "front", "back", "off, no surface", "subject motion", "camera shake", "panned", "motion before blur", "diffraction", "nothing to measure"};
  return kNames[static_cast<int>(kind)];
}

SceneSpec spec_of(Kind kind, std::uint64_t key) {
  render::Random random(key ^ 0x7777);
  SceneSpec spec{.key = key, .gradient = random.log_uniform(0.01, 0.06), .contact_disc = random.uniform(-0.6, 0.6)};
  spec.texture = static_cast<GroundTexture>(random.below(3));
  const double angle = random.uniform(0, 2 * std::numbers::pi), length = random.uniform(5, 14);
  const cv::Vec2d vector(length * std::cos(angle), length * std::sin(angle));
  switch (kind) {
    case Kind::sharp: break;
    case Kind::front: spec.contact_disc = -random.log_uniform(2.2, 14); break;
    case Kind::back: spec.contact_disc = random.log_uniform(2.2, 14); break;
    case Kind::off:
      spec.contact_disc = random.log_uniform(2.2, 14) * (random.below(2) == 0 ? 1 : -1);
      spec.ground = false;
      break;
    case Kind::subject_motion:
      spec.subject_motion = vector;
      spec.background_disc = random.uniform(1, 6);
      break;
    case Kind::shake:
      spec.camera_motion = vector;
      spec.background_disc = random.uniform(1, 6);
      break;
    case Kind::panned:
      // The background runs two to three times as far in the same direction.
      spec.subject_motion = vector - random.uniform(2, 3) * vector;
      spec.camera_motion = vector - spec.subject_motion;
      spec.background_disc = random.uniform(1, 6);
      break;
    case Kind::motion_before_blur:
      spec.subject_motion = vector;
      spec.background_disc = 150;
      spec.ground = false;
      break;
    case Kind::diffraction:
      spec.lambda_n_over_p = random.uniform(2.2, 4);
      spec.ground = false;
      break;
    case Kind::nothing:
      spec.plain_figure = true;
      spec.ground = false;
      break;
  }
  return spec;
}

struct Outcome {
  Verdict verdict;
  double blur = 0, low = 0, high = 0;
};

Outcome judge(const Scene& scene, const Measurement& m, bool known_baseline) {
  const OpticalSetup setup = setup_of(scene);
  Prediction prediction = predict(setup);
  // The frames come from a camera that neither sharpens nor demosaics: zero, as a settings file would state it.
  if (known_baseline) {
    prediction.baseline_px2 = Interval{0, -1, 1};
    prediction.baseline_source = "settings";
  }
  if (const auto response = system_response(setup, 0)) {
    if (const auto forward = forward_reading(*response)) {
      prediction.blur_disc_px = blur_disc_px(forward->squared_disc_px2);
      prediction.edge_rise_px = forward->edge_rise_px;
    }
  }
  Outcome outcome{compare(setup, prediction, m)};
  if (m.aim_blur.estimate) {
    outcome.blur = blur_disc_px(m.aim_blur.estimate->squared_disc_px2);
    const Interval bounds = blur_after_baseline(*m.aim_blur.estimate, prediction, m);
    outcome.low = blur_disc_px(bounds.low);
    outcome.high = blur_disc_px(bounds.high);
  }
  return outcome;
}

bool has(const Verdict& v, Cause cause) { return std::find(v.causes.begin(), v.causes.end(), cause) != v.causes.end(); }

struct Judgement {
  bool right = false, false_claim = false, side_called = false, side_wrong = false;
};

// Right: the words fit what was done. `unsure` within 1 px of the limit is right. A claim is a cause, or a side, or
// `on` for a frame that is not.
Judgement score(Kind kind, const SceneSpec& spec, const Verdict& v) {
  Judgement j;
  const double disc = std::abs(spec.contact_disc);
  const bool near_limit = std::abs(disc - kAcceptablePx) <= 1;
  const bool outside = v.focus == FocusVerdict::front || v.focus == FocusVerdict::back || v.focus == FocusVerdict::off;
  const bool motion = has(v, Cause::motion) || has(v, Cause::subject_motion) || has(v, Cause::camera_shake);
  j.side_called = v.focus == FocusVerdict::front || v.focus == FocusVerdict::back;
  j.side_wrong = (v.focus == FocusVerdict::front && spec.contact_disc > 0) || (v.focus == FocusVerdict::back && spec.contact_disc < 0);
  const bool focus_claim = has(v, Cause::defocus) || has(v, Cause::missed_aim) || has(v, Cause::shallow_depth_of_field);
  switch (kind) {
    case Kind::sharp:
      j.right = v.focus == FocusVerdict::on && v.causes.empty();
      j.false_claim = outside || !v.causes.empty();
      break;
    case Kind::front:
    case Kind::back:
    case Kind::off: {
      const bool side_fits = kind == Kind::off ? v.focus == FocusVerdict::off || !j.side_wrong : !j.side_wrong;
      j.right = (outside && side_fits && !motion && !has(v, Cause::diffraction)) || (v.focus == FocusVerdict::unsure && near_limit && v.causes.empty());
      j.false_claim = v.focus == FocusVerdict::on || motion || has(v, Cause::diffraction) || j.side_wrong;
      break;
    }
    case Kind::subject_motion:
      j.right = has(v, Cause::subject_motion) && !v.panned;
      j.false_claim = v.focus == FocusVerdict::on || has(v, Cause::camera_shake) || v.panned || j.side_called;
      break;
    case Kind::shake:
      j.right = has(v, Cause::camera_shake);
      j.false_claim = v.focus == FocusVerdict::on || has(v, Cause::subject_motion) || j.side_called;
      break;
    case Kind::panned:
      j.right = has(v, Cause::subject_motion) && v.panned;
      j.false_claim = v.focus == FocusVerdict::on || has(v, Cause::camera_shake) || j.side_called;
      break;
    case Kind::motion_before_blur:
      j.right = has(v, Cause::motion) || has(v, Cause::subject_motion);
      j.false_claim = v.focus == FocusVerdict::on || has(v, Cause::camera_shake) || v.panned || j.side_called;
      break;
    case Kind::diffraction:
      j.right = has(v, Cause::diffraction) && !motion && !focus_claim;
      j.false_claim = v.focus == FocusVerdict::on || motion || focus_claim || j.side_called;
      break;
    case Kind::nothing:
      j.right = v.focus == FocusVerdict::no_evidence;
      j.false_claim = !v.causes.empty() || j.side_called;
      break;
  }
  // Motion and diffraction frames are in focus to within .6 px: a claim of defocus on top is false.
  if (kind == Kind::subject_motion || kind == Kind::shake || kind == Kind::panned || kind == Kind::motion_before_blur)
    j.false_claim = j.false_claim || focus_claim || has(v, Cause::diffraction);
  if (kind == Kind::sharp || kind == Kind::nothing) j.side_wrong = false;
  return j;
}

std::string words_of(const Verdict& v) {
  std::string text = focus_verdict_name(v.focus);
  for (const Cause cause : v.causes) text += std::string(", ") + cause_name(cause);
  return text + (v.panned ? " (panned)" : "");
}

std::vector<Figure> print_table(const std::string& title, const std::string& prefix, const std::vector<std::pair<Kind, Judgement>>& judged, const std::vector<std::string>& words) {
  std::map<Kind, std::map<std::string, int>> said;
  int right = 0, claims = 0, sides = 0, wrong = 0;
  std::map<Kind, std::pair<int, int>> by_kind;
  for (std::size_t i = 0; i < judged.size(); ++i) {
    const auto& [kind, j] = judged[i];
    ++by_kind[kind].first;
    by_kind[kind].second += j.right;
    ++said[kind][words[i]];
    right += j.right;
    claims += j.false_claim;
    sides += j.side_called;
    wrong += j.side_wrong;
  }
  fmt::print("\n{}\n", title);
  for (const auto& [kind, counts] : by_kind) {
    fmt::print("  {:<20} {:3} of {:3} right:", kind_name(kind), counts.second, counts.first);
    for (const auto& [text, n] : said[kind]) fmt::print("  {} {}", n, text);
    fmt::print("\n");
  }
  const int n = static_cast<int>(judged.size());
  return {{prefix + ": right", 100.0 * right / n, 95, false, "%", n},
          {prefix + ": false claims", 100.0 * claims / n, 2, true, "%", n},
          {prefix + ": wrong side, of calls", 100.0 * wrong / std::max(1, sides), 0.5, true, "%", sides}};
}

}  // namespace

std::vector<Figure> run_causes(const SetOptions& options) {
  const int kinds = std::size(kKinds), count = kinds * count_of(options, 32, 1);
  std::vector<std::pair<Kind, Judgement>> known(static_cast<std::size_t>(count)), unknown(known.size());
  std::vector<std::string> known_words(known.size()), unknown_words(known.size());
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    const auto k = static_cast<std::size_t>(i);
    const Kind kind = kKinds[i % kinds];
    const SceneSpec spec = spec_of(kind, first_key(options, 7) + static_cast<std::uint64_t>(i));
    const Scene scene = make_scene(spec);
    const render::Picture picture = render::render_frame(scene.frame);
    const Measurement m = measurer.measure({picture.luma, srgb_linear_of_code(256), picture.coding_step_codes}, request_for(scene.aim, picture.luma.size()));
    const Outcome with = judge(scene, m, true), without = judge(scene, m, false);
    known[k] = {kind, score(kind, spec, with.verdict)};
    unknown[k] = {kind, score(kind, spec, without.verdict)};
    known_words[k] = words_of(with.verdict);
    unknown_words[k] = words_of(without.verdict);
    if (options.list && options.tuning)
      fmt::print(stderr, "{} key {} l {:.2f} motion {:.1f} {:.1f}: {} blur {:.2f} [{:.2f} {:.2f}]{}{}\n", kind_name(kind), spec.key, spec.contact_disc,
                 cv::norm(spec.subject_motion), cv::norm(spec.camera_motion), known_words[k], with.blur, with.low, with.high,
                 known[k].second.right ? "" : " NOT RIGHT", known[k].second.false_claim ? " FALSE CLAIM" : "");
  });
  std::vector<Figure> figures = print_table("Cause, baseline known (0 +- .5 px^2, 'settings')", "cause, baseline known", known, known_words);
  const std::vector<Figure> prior = print_table("Cause, baseline unknown (prior)", "cause, baseline unknown", unknown, unknown_words);
  figures.insert(figures.end(), prior.begin(), prior.end());
  return figures;
}

}  // namespace focusfall::accuracy
