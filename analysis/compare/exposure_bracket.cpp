#include "analysis/compare/exposure_bracket.h"

#include <algorithm>
#include <cmath>

namespace focusfall {
namespace {

constexpr std::size_t kLeastFrames = 3, kMostFrames = 9;   // what cameras offer
constexpr double kLeastStepEv = 0.3;
// Marks are exact to within rounding; displayed biases are rounded to a tenth.
constexpr double kEqualStepsEv = 0.12;
// From the end of one exposure to the next. Judgement: a person who turns the dial by hand needs as much.
constexpr double kLongestPauseS = 20;

// Exposures as set against the first, if they make a bracket.
std::optional<double> equal_step_ev(std::vector<double> exposures) {
  std::ranges::sort(exposures);
  const double step = (exposures.back() - exposures.front()) / static_cast<double>(exposures.size() - 1);
  if (step < kLeastStepEv) return std::nullopt;
  for (std::size_t i = 1; i < exposures.size(); ++i) {
    if (std::abs(exposures[i] - exposures[i - 1] - step) > kEqualStepsEv) return std::nullopt;
  }
  return step;
}

bool follows(const ExposureFrame& before, const ExposureFrame& after) {
  if (!before.taken_at_s || !after.taken_at_s) return true;
  const double pause_s = *after.taken_at_s - *before.taken_at_s - before.exposure_time_s.value_or(0);
  return pause_s <= kLongestPauseS;
}

// t S / N^2 of every frame, or the bias of every frame.
std::optional<std::vector<double>> exposures_of(std::span<const ExposureFrame> frames, const ExposureSet& set,
                                                std::size_t first, std::size_t count) {
  std::vector<double> by_setting, by_bias;
  for (std::size_t k = first; k < first + count; ++k) {
    const ExposureFrame& frame = frames[set.frames[k]];
    if (frame.f_number != frames[set.frames[first]].f_number) return std::nullopt;   // cameras bracket by time or ISO
    if (k > first && !follows(frames[set.frames[k - 1]], frame)) return std::nullopt;
    if (set.exposure_ev[k]) by_setting.push_back(*set.exposure_ev[k]);
    if (frame.exposure_bias_ev) by_bias.push_back(*frame.exposure_bias_ev);
  }
  if (by_setting.size() == count) return by_setting;
  if (by_bias.size() == count) return by_bias;
  return std::nullopt;
}

// Measured steps of unknown contrast, scaled to span what was set, by least squares through the first frame.
void scale_to_setting(Bracket& bracket) {
  double product = 0, square = 0;
  for (std::size_t k = 0; k < bracket.frames.size(); ++k) {
    if (!bracket.measured_ev[k]) continue;
    product += *bracket.measured_ev[k] * bracket.set_ev[k];
    square += *bracket.measured_ev[k] * *bracket.measured_ev[k];
  }
  if (square <= 0) return;
  for (auto& measured : bracket.measured_ev) {
    if (measured) measured = *measured * product / square;
  }
}

}  // namespace

std::vector<Bracket> find_brackets(std::span<const ExposureFrame> frames, const ExposureSet& set) {
  std::vector<Bracket> brackets;
  for (std::size_t first = 0; first + kLeastFrames <= set.frames.size();) {
    std::size_t taken = 0;
    for (std::size_t count = std::min(kMostFrames, set.frames.size() - first); count >= kLeastFrames; --count) {
      const auto exposures = exposures_of(frames, set, first, count);
      const auto step = exposures ? equal_step_ev(*exposures) : std::nullopt;
      if (!step) continue;
      Bracket bracket;
      bracket.step_ev = *step;
      for (std::size_t k = first; k < first + count; ++k) {
        bracket.frames.push_back(set.frames[k]);
        bracket.set_ev.push_back((*exposures)[k - first] - exposures->front());
        const bool known = set.level_ev[k] && set.level_ev[first];
        bracket.measured_ev.push_back(known ? std::optional(*set.level_ev[k] - *set.level_ev[first]) : std::nullopt);
      }
      if (set.curve_bent) scale_to_setting(bracket);
      brackets.push_back(std::move(bracket));
      taken = count;
      break;
    }
    first += std::max<std::size_t>(taken, 1);
  }
  return brackets;
}

}  // namespace focusfall
