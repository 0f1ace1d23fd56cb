#include "analysis/compare/exposure_set.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <functional>
#include <random>

namespace focusfall {
namespace {

// Forty frames: eight marks, five times round, with an exposure time that follows by half: E spans some stops.
constexpr std::array kMarks = {1.4, 2.0, 2.8, 4.0, 5.6, 8.0, 11.0, 16.0};

struct Shoot {
  double noise_ev = 0.02;
  std::function<double(std::size_t)> light_ev = [](std::size_t) { return 0.0; };
  std::function<double(const SetFrame&, std::size_t)> error_ev = [](const SetFrame&, std::size_t) { return 0.0; };
};

std::vector<SetFrame> simulated(const Shoot& shoot, unsigned seed) {
  std::mt19937 random(seed);
  std::normal_distribution<double> noise(0, shoot.noise_ev);
  std::vector<SetFrame> frames;
  for (std::size_t i = 0; i < 40; ++i) {
    const std::size_t mark = i % kMarks.size();
    SetFrame frame;
    frame.f_number = kMarks[mark];
    const double stop = static_cast<double>(mark);
    // Times a stop slower with every second mark, and another step with each round: the two controls are not locked.
    const double time_stop = std::floor(stop / 2) + static_cast<double>(i / kMarks.size() % 2);
    frame.exposure_time_s = std::exp2(time_stop) / 500;
    frame.iso_speed = 100;
    frame.exposure_ev = std::log2(frame.exposure_time_s * 100) - stop;
    frame.sigma_ev = 0.004;
    frame.taken_at_s = 3. * static_cast<double>(i);
    frame.level_ev = frame.exposure_ev + shoot.light_ev(i) + shoot.error_ev(frame, i) + noise(random);
    frames.push_back(frame);
  }
  return frames;
}

std::vector<double> blamed(const std::vector<MarkError>& marks) {
  std::vector<double> names;
  for (const MarkError& m : marks) {
    if (m.blamed) names.push_back(m.mark);
  }
  return names;
}

TEST(ExposureSet, FaultlessSetHasSlopeOneAndBlamesNothing) {
  const SetAudit audit = audit_set(simulated({}, 1));
  ASSERT_TRUE(audit.slope);
  EXPECT_NEAR(audit.slope->value, 1, 0.02);
  EXPECT_NEAR(audit.scatter_ev, 0.02, 0.01);
  EXPECT_TRUE(blamed(audit.diaphragm).empty() && blamed(audit.shutter).empty() && blamed(audit.iso).empty());
  EXPECT_TRUE(audit.light_changes.empty());
  EXPECT_FALSE(audit.light_flickers);
  for (const SetFrameError& frame : audit.frames) EXPECT_EQ(frame.verdict, ExposureVerdict::as_predicted);
}

TEST(ExposureSet, OneStickingMarkIsNamedWithItsSizeAndItsFramesAreUnder) {
  Shoot shoot;
  shoot.error_ev = [](const SetFrame& f, std::size_t) { return f.f_number == 5.6 ? -1 / 3. : 0.0; };
  const auto frames = simulated(shoot, 2);
  const SetAudit audit = audit_set(frames);
  EXPECT_EQ(blamed(audit.diaphragm), std::vector{5.6});
  EXPECT_TRUE(blamed(audit.shutter).empty());
  for (const MarkError& m : audit.diaphragm) {
    if (m.mark != 5.6) continue;
    EXPECT_NEAR(m.error_ev, -1 / 3., 0.06);
    EXPECT_LE(m.low_ev, -1 / 3.);
    EXPECT_GE(m.high_ev, -1 / 3.);
  }
  EXPECT_NEAR(audit.slope->value, 1, 0.02);
  for (std::size_t i = 0; i < frames.size(); ++i) {
    const bool wrong = frames[i].f_number == 5.6;
    EXPECT_EQ(audit.frames[i].verdict, wrong ? ExposureVerdict::under : ExposureVerdict::as_predicted) << i;
    EXPECT_EQ(audit.frames[i].cause, wrong ? ExposureCause::diaphragm : ExposureCause::none) << i;
  }
}

TEST(ExposureSet, DriftingLightIsShownAndBlamesNobody) {
  Shoot shoot;
  shoot.light_ev = [](std::size_t i) { return static_cast<double>(i) / 39; };
  const SetAudit audit = audit_set(simulated(shoot, 3));
  ASSERT_EQ(audit.light_changes.size(), 1u);
  EXPECT_FALSE(audit.light_changes[0].step);
  EXPECT_NEAR(audit.light_changes[0].change_ev.value, 1, 0.1);
  EXPECT_TRUE(blamed(audit.diaphragm).empty() && blamed(audit.shutter).empty());
  for (const SetFrameError& frame : audit.frames) EXPECT_EQ(frame.verdict, ExposureVerdict::as_predicted);
}

TEST(ExposureSet, ACloudIsAStepOfTheLightAtItsPlace) {
  Shoot shoot;
  shoot.light_ev = [](std::size_t i) { return i >= 23 ? -0.8 : 0.0; };
  const SetAudit audit = audit_set(simulated(shoot, 4));
  ASSERT_FALSE(audit.light_changes.empty());
  EXPECT_TRUE(audit.light_changes[0].step);
  EXPECT_EQ(audit.light_changes[0].to, 23u);
  EXPECT_NEAR(audit.light_changes[0].change_ev.value, -0.8, 0.1);
  EXPECT_TRUE(blamed(audit.diaphragm).empty() && blamed(audit.shutter).empty());
}

TEST(ExposureSet, OneOddFrameIsSingle) {
  Shoot shoot;
  shoot.error_ev = [](const SetFrame&, std::size_t i) { return i == 17 ? 0.6 : 0.0; };
  const SetAudit audit = audit_set(simulated(shoot, 5));
  EXPECT_EQ(audit.frames[17].verdict, ExposureVerdict::over);
  EXPECT_EQ(audit.frames[17].cause, ExposureCause::single);
  EXPECT_NEAR(audit.frames[17].error_ev.value, 0.6, 0.06);
  EXPECT_TRUE(blamed(audit.diaphragm).empty());
}

TEST(ExposureSet, AShutterFaultIsToldFromTheDiaphragm) {
  Shoot shoot;
  const double slow = 4 / 500.;
  shoot.error_ev = [slow](const SetFrame& f, std::size_t) { return f.exposure_time_s == slow ? 0.3 : 0.0; };
  const SetAudit audit = audit_set(simulated(shoot, 6));
  EXPECT_EQ(blamed(audit.shutter), std::vector{slow});
  EXPECT_TRUE(blamed(audit.diaphragm).empty());
}

TEST(ExposureSet, FlickeringLightIsNoFaultOfTheShutter) {
  std::mt19937 random(7);
  std::uniform_real_distribution<double> phase(-0.35, 0.35);
  Shoot shoot;
  shoot.error_ev = [&](const SetFrame& f, std::size_t) { return f.exposure_time_s < 1 / 100. ? phase(random) : 0.0; };
  auto frames = simulated(shoot, 7);
  const SetAudit audit = audit_set(frames);
  EXPECT_TRUE(audit.light_flickers);
  EXPECT_TRUE(blamed(audit.shutter).empty());
  for (std::size_t i = 0; i < frames.size(); ++i) {
    if (audit.frames[i].verdict == ExposureVerdict::as_predicted) continue;
    EXPECT_EQ(audit.frames[i].cause, ExposureCause::light_flickers) << i;
  }
}

// All frames of the mark stand together: a cloud that passed meanwhile would look the same.
TEST(ExposureSet, AMarkUsedInOneRunOnlyIsNotBlamed) {
  Shoot shoot;
  auto frames = simulated(shoot, 8);
  std::ranges::stable_sort(frames, {}, &SetFrame::f_number);
  for (std::size_t i = 0; i < frames.size(); ++i) {
    frames[i].taken_at_s = 3. * static_cast<double>(i);
    if (frames[i].f_number == 5.6) frames[i].level_ev -= 1 / 3.;
  }
  EXPECT_TRUE(blamed(audit_set(frames).diaphragm).empty());
}

// Six marks at 95 % each would blame a faultless lens in 26 % of sets; together they may do so in 5 %. Here with the
// light drifting by a stop in every second set. Of 60 sets, 8 or more are 2 % likely at 5 %.
TEST(ExposureSet, IntervalsHoldForAllMarksTogether) {
  int outside = 0;
  for (unsigned seed = 0; seed < 60; ++seed) {
    Shoot shoot;
    if (seed % 2 == 1) shoot.light_ev = [](std::size_t i) { return std::sin(static_cast<double>(i) / 9) / 2; };
    const SetAudit audit = audit_set(simulated(shoot, 100 + seed));
    outside += std::ranges::any_of(audit.diaphragm, [](const MarkError& m) { return m.low_ev > 0 || m.high_ev < 0; });
  }
  EXPECT_LT(outside, 8);
}

TEST(ExposureSet, SlopeIsNotGivenWhereTheExposureStaysPut) {
  std::vector<SetFrame> frames;
  for (std::size_t i = 0; i < 8; ++i) {
    frames.push_back({.f_number = 4, .exposure_time_s = 1 / 100., .iso_speed = 100, .exposure_ev = 0,
                      .level_ev = i == 5 ? -0.7 : 0.01 * static_cast<double>(i % 3), .sigma_ev = 0.004, .taken_at_s = {}});
  }
  const SetAudit audit = audit_set(frames);
  EXPECT_FALSE(audit.slope);
  EXPECT_EQ(audit.frames[5].verdict, ExposureVerdict::under);
  EXPECT_EQ(audit.frames[5].cause, ExposureCause::single);
}

}  // namespace
}  // namespace focusfall
