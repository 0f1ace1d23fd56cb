#include "analysis/compare/baseline.h"

#include <gtest/gtest.h>

#include <cstdio>
#include <random>

#include "analysis/compare/compare.h"
#include "tests/compare/readings.h"

namespace focusfall {
namespace {

Prediction unknown_camera(double limit_px) {
  Prediction prediction;
  prediction.acceptable_blur_px = limit_px;
  return prediction;
}

TEST(Baseline, AKnownBaselineIsTakenOff) {
  Prediction prediction = known_camera();
  prediction.baseline_px2 = Interval{-4, -4.4, -3.6};
  Measurement measurement;
  measurement.aim_blur = blur(6, -4);
  const Interval corrected = blur_after_baseline(*measurement.aim_blur.estimate, prediction, measurement);
  EXPECT_NEAR(corrected.value, 36, 1e-9);
  EXPECT_LT(corrected.low, 36);
  EXPECT_GT(corrected.high, 36);
  EXPECT_LT(corrected.high - corrected.low, 4 * usual_sigma_px2(6) + 1);
}

TEST(Baseline, ASharpRegionInTheFrameTellsThatTheCameraSharpened) {
  // The aim reads 5 px^2 (2.2 px); another region reads -4 px^2: what is -4 there was at least 9 px^2 here.
  Measurement measurement;
  measurement.aim_blur = {estimate(5, 0.6), 60};
  const Interval alone = blur_after_baseline(*measurement.aim_blur.estimate, unknown_camera(2), measurement);
  measurement.best = SharpestRegion{{0.8, 0.1, 0.1, 0.1}, {estimate(-4, 0.5), 60}};
  const Interval beside = blur_after_baseline(*measurement.aim_blur.estimate, unknown_camera(2), measurement);
  EXPECT_LT(alone.low, 4);
  EXPECT_GT(beside.low, 7);
}

TEST(Baseline, SharperThanTheBaselineIsSharpWithBaselineUnknownAndNeverNoEvidence) {
  // A stated baseline of 0 +- .5 px^2 and a reading of -6: another picture setting. The aim is sharp all the same.
  Prediction prediction = known_camera();
  Measurement measurement;
  measurement.aim_blur = {estimate(-6, 0.5), 60};
  const Interval corrected = blur_after_baseline(*measurement.aim_blur.estimate, prediction, measurement);
  EXPECT_LT(corrected.value, 0);
  EXPECT_EQ(compare(std::nullopt, prediction, measurement).focus, FocusVerdict::on);
  EXPECT_EQ(compare(std::nullopt, unknown_camera(2), measurement).focus, FocusVerdict::on);
}

struct Tally {
  int frames = 0, false_on = 0, false_outside = 0, sharp = 0, sharp_on = 0, soft = 0, soft_outside = 0;
};

// Frames of cameras whose processing the program does not know: half sharpen (-2.7 to -5.6 px^2), a quarter do
// nothing, a quarter demosaic only (+3 to +5). `in_focus_share` of them have something in focus somewhere; discs at
// the aim up to 10 px, any as likely as another.
Tally judge_many(double limit_px, double in_focus_share, unsigned seed) {
  std::mt19937 random(seed);
  std::normal_distribution<double> normal;
  const auto uniform = [&](double low, double high) {
    return std::uniform_real_distribution<double>(low, high)(random);
  };
  Tally tally;
  for (int frame = 0; frame < 2000; ++frame) {
    const double kind = uniform(0, 1);
    const double baseline = kind < 0.5 ? uniform(-5.6, -2.7) : kind < 0.75 ? 0 : uniform(3, 5);
    const double aim_px = uniform(0, 10);
    const double best_px = uniform(0, 1) < in_focus_share ? uniform(0, 1) : uniform(0, aim_px);
    const auto reading = [&](double disc_px) {
      const double sigma = usual_sigma_px2(disc_px);
      return BlurReading{estimate(disc_px * disc_px + baseline + sigma * normal(random), sigma), 60};
    };
    Measurement measurement;
    measurement.aim_blur = reading(aim_px);
    measurement.best = SharpestRegion{{0.8, 0.8, 0.1, 0.1}, reading(std::min(best_px, aim_px))};
    const FocusVerdict focus = compare(std::nullopt, unknown_camera(limit_px), measurement).focus;
    ++tally.frames;
    tally.false_on += focus == FocusVerdict::on && aim_px > limit_px;
    tally.false_outside += focus == FocusVerdict::off && aim_px < limit_px;
    // Farther than 1 px from the limit a decision is expected (product targets).
    if (aim_px < limit_px - 1) ++tally.sharp, tally.sharp_on += focus == FocusVerdict::on;
    if (aim_px > limit_px + 1) ++tally.soft, tally.soft_outside += focus == FocusVerdict::off;
  }
  return tally;
}

TEST(Baseline, UnknownProcessingKeepsFalseClaimsBelowTwoPercent) {
  for (double limit_px : {2.0, 3.0})
    for (double share : {0.9, 0.6, 0.3}) {
      const Tally tally = judge_many(limit_px, share, 5);
      std::printf("limit %.0f px, %2.0f %% with something in focus: false on %.2f %%, false off %.2f %%, "
                  "sharp called on %.1f %%, soft called off %.1f %%\n",
                  limit_px, 100 * share, 100.0 * tally.false_on / tally.frames,
                  100.0 * tally.false_outside / tally.frames, 100.0 * tally.sharp_on / tally.sharp,
                  100.0 * tally.soft_outside / tally.soft);
      EXPECT_LE(tally.false_on + tally.false_outside, tally.frames / 50);
      // Without a known baseline most frames are decided all the same.
      EXPECT_GE(tally.sharp_on, tally.sharp * 8 / 10);
      EXPECT_GE(tally.soft_outside, tally.soft * 9 / 10);
    }
}

}  // namespace
}  // namespace focusfall
