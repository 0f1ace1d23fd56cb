// The audit on rendered shoots, from pixels to words. The full sets stand in tests/accuracy.
#include "analysis/compare/exposure_audit.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "tests/compare/shoot_frames.h"

namespace focusfall {
namespace {

using render::LightCourse;
using render::Shoot;
using render::ShootSpec;
using render::ToneCurve;

std::vector<double> blamed(const std::vector<MarkError>& marks) {
  std::vector<double> names;
  for (const MarkError& m : marks) {
    if (m.blamed) names.push_back(m.mark);
  }
  return names;
}

// One faulty shoot under a drifting light, rendered once for several tests.
struct FaultyShoot {
  Shoot shoot;
  std::vector<ExposureFrame> frames;
  ExposureAudit audit;
};

const FaultyShoot& faulty_shoot() {
  static const FaultyShoot faulty = [] {
    FaultyShoot f;
    ShootSpec spec;
    spec.key = 11;
    spec.light = LightCourse::drift;
    spec.wrong_f_number = 8;
    spec.wrong_ev = 1 / 3.;
    f.shoot = render::render_shoot(spec);
    f.frames = measured_frames(f.shoot);
    f.audit = audit_exposure(f.frames, {});
    return f;
  }();
  return faulty;
}

TEST(ExposureAudit, ShootOfOneSceneIsOneSet) {
  EXPECT_EQ(faulty_shoot().audit.sets.size(), 1u);
  EXPECT_EQ(faulty_shoot().audit.sets[0].tested.size(), 40u);
  EXPECT_FALSE(faulty_shoot().audit.sets[0].curve_bent);
}

TEST(ExposureAudit, WrongMarkIsNamedUnderADriftingLight) {
  const SetAudit& audit = *faulty_shoot().audit.sets[0].audit;
  EXPECT_EQ(blamed(audit.diaphragm), std::vector{8.0});
  EXPECT_TRUE(blamed(audit.shutter).empty());
  EXPECT_NEAR(audit.slope->value, 1, 0.02);
  EXPECT_FALSE(audit.light_changes.empty());
}

// The target: .05 stop for a frame of an sRGB picture. The truth is what was put in: mark and repeatability.
TEST(ExposureAudit, ErrorOfEveryFrameIsWhatWasPutIn) {
  const FaultyShoot& f = faulty_shoot();
  for (std::size_t i = 0; i < f.frames.size(); ++i) {
    ASSERT_TRUE(f.audit.frames[i].error_ev);
    EXPECT_NEAR(f.audit.frames[i].error_ev->value, f.shoot.frames[i].error_ev, 0.05) << i;
    EXPECT_EQ(f.audit.frames[i].cause == ExposureCause::diaphragm, f.frames[i].f_number == 8.0) << i;
  }
}

TEST(ExposureAudit, PullBackIsTheTruthWhereADarkerFrameShowsIt) {
  const FaultyShoot& f = faulty_shoot();
  const double highlight_ev = render::highlight_truth_ev(f.shoot.scene, ExposureOptions{}.clip_limit);
  int pulled = 0;
  for (std::size_t i = 0; i < f.frames.size(); ++i) {
    const FrameExposure& frame = f.audit.frames[i];
    const double truth_ev = highlight_ev + f.shoot.frames[i].gain_ev;   // positive: beyond clipping
    ASSERT_TRUE(frame.pull_back);
    if (frame.pull_back->bound == Bound::lower) {
      EXPECT_LE(frame.pull_back->ev, std::max(0.0, truth_ev)) << i;
    } else if (frame.pull_back->ev > 0) {
      EXPECT_NEAR(frame.pull_back->ev, truth_ev, 0.15) << i;
      ++pulled;
    }
    if (frame.room_ev && truth_ev > -3.5) {
      EXPECT_NEAR(*frame.room_ev, -truth_ev, 0.15) << i;
    }
  }
  EXPECT_GT(pulled, 5);
}

// Vignetting is put in: .7 stop at the very corner wide open, falling with the fourth power of the radius, .25 a stop
// down. Over the tiles beyond .8 of the half diagonal some half of it is left; the sign and the order are what count.
TEST(ExposureAudit, VignettingIsToldFromExposure) {
  const auto& vignetting = faulty_shoot().audit.sets[0].vignetting;
  ASSERT_EQ(vignetting.size(), 8u);
  EXPECT_LT(vignetting[0].corner_ev, -0.25);
  EXPECT_GT(vignetting[0].corner_ev, -0.7);
  EXPECT_LT(vignetting[1].corner_ev, -0.08);
  EXPECT_GT(vignetting[1].corner_ev, -0.25);
  for (std::size_t m = 2; m < vignetting.size(); ++m) EXPECT_NEAR(vignetting[m].corner_ev, 0, 0.05);
}

// A curve that is not the one the codes are decoded with: found from the frames, and no fault of anybody.
TEST(ExposureAudit, SShapedCurveIsFoundAndBlamesNobody) {
  ShootSpec spec;
  spec.key = 12;
  spec.curve = ToneCurve::s_shaped;
  const auto frames = measured_frames(render::render_shoot(spec));
  const ExposureAudit audit = audit_exposure(frames, {});
  ASSERT_EQ(audit.sets.size(), 1u);
  EXPECT_TRUE(audit.sets[0].curve_bent);
  EXPECT_NEAR(audit.sets[0].audit->slope->value, 1, 0.02);
  EXPECT_TRUE(blamed(audit.sets[0].audit->diaphragm).empty());
  EXPECT_GT(audit.sets[0].audit->contrast, 1.1);   // an S-curve of strength .3 is steeper in the middle
}

// ---- what cannot be tested --------------------------------------------------------------------------------------------

std::vector<ExposureFrame> short_shoot(int count = 8) {
  ShootSpec spec;
  spec.key = 13;
  spec.frames = count;
  return measured_frames(render::render_shoot(spec));
}

NotTestable reason_with(std::vector<ExposureFrame> frames, void (*change)(ExposureFrame&), ExposureOptions options = {}) {
  for (ExposureFrame& frame : frames) change(frame);
  return audit_exposure(frames, options).sets[0].reason;
}

TEST(ExposureAudit, SaysWhyASetIsNotTested) {
  const auto frames = short_shoot();
  EXPECT_EQ(reason_with(frames, [](ExposureFrame&) {}), NotTestable::tested);
  EXPECT_EQ(reason_with(frames, [](ExposureFrame& f) { f.manual_exposure = false; }), NotTestable::automatic_exposure);
  EXPECT_EQ(reason_with(frames, [](ExposureFrame& f) { f.flash_fired = true; }), NotTestable::flash);
  EXPECT_EQ(reason_with(frames, [](ExposureFrame& f) { f.iso_speed.reset(); }), NotTestable::settings_missing);
  EXPECT_EQ(reason_with(frames, [](ExposureFrame& f) { f.exposure_time_s.reset(); }), NotTestable::settings_missing);
  EXPECT_EQ(reason_with({frames.begin(), frames.begin() + 3}, [](ExposureFrame&) {}), NotTestable::too_few_frames);
}

TEST(ExposureAudit, TheUsersWordCountsWhereTheFileIsSilent) {
  const auto silent = [](ExposureFrame& f) { f.manual_exposure.reset(), f.flash_fired.reset(); };
  EXPECT_EQ(reason_with(short_shoot(), silent), NotTestable::automatic_exposure);
  EXPECT_EQ(reason_with(short_shoot(), silent, {.same_light = true}), NotTestable::tested);
  // Where the file does say automatic, nobody's word makes the level speak.
  EXPECT_EQ(reason_with(short_shoot(), [](ExposureFrame& f) { f.manual_exposure = false; }, {.same_light = true}),
            NotTestable::automatic_exposure);
}

TEST(ExposureAudit, BodiesAndPictureSettingsShareNoSet) {
  auto frames = short_shoot();
  for (std::size_t i = 0; i < frames.size(); i += 2) frames[i].group = "another";
  const ExposureAudit audit = audit_exposure(frames, {.same_light = true});
  ASSERT_EQ(audit.sets.size(), 2u);
  EXPECT_EQ(audit.sets[0].frames.size(), 4u);
}

TEST(ExposureAudit, AnotherSceneIsAnotherSet) {
  auto frames = short_shoot();
  ShootSpec other;
  other.key = 14;
  other.frames = 5;
  for (const ExposureFrame& frame : measured_frames(render::render_shoot(other))) frames.push_back(frame);
  const ExposureAudit audit = audit_exposure(frames, {});
  ASSERT_EQ(audit.sets.size(), 2u);
  EXPECT_EQ(audit.sets[0].frames.size(), 8u);
  EXPECT_EQ(audit.sets[1].frames.size(), 5u);
}

TEST(ExposureAudit, BlackWhiteAndEmptyFramesAreSaidToBeUnknown) {
  render::ShootFrame black, white;
  black.f_number = white.f_number = 4;
  black.exposure_time_s = white.exposure_time_s = 0.01;
  for (auto [frame, code] : {std::pair{&black, 0}, std::pair{&white, 255}}) {
    frame->picture.rgb = cv::Mat(256, 384, CV_8UC3, cv::Scalar::all(code));
    frame->picture.luma = cv::Mat(256, 384, CV_8UC1, cv::Scalar::all(code));
  }
  std::vector<ExposureFrame> frames = {measured_frame(black), measured_frame(white), ExposureFrame{}};
  const ExposureAudit audit = audit_exposure(frames, {});
  for (const FrameExposure& frame : audit.frames) EXPECT_EQ(frame.verdict, ExposureVerdict::unknown);
  EXPECT_FALSE(audit.frames[0].measured_ev);                       // no level above nothing
  EXPECT_EQ(audit.frames[0].pull_back->ev, 0);
  EXPECT_EQ(audit.frames[1].pull_back->bound, Bound::lower);       // how far above clipping is not recorded
  EXPECT_EQ(audit.frames[1].pull_back->ev, 0);
  EXPECT_FALSE(audit.frames[2].pull_back);
}

TEST(ExposureAudit, NoFramesGiveNoSets) { EXPECT_TRUE(audit_exposure({}, {}).sets.empty()); }

// ---- brackets and brightness -------------------------------------------------------------------------------------------

TEST(ExposureAudit, BracketIsFoundAndItsStepsMeasured) {
  ShootSpec spec;
  spec.key = 15;
  spec.frames = 3;
  Shoot shoot = render::render_shoot(spec);
  // Three times the same frame a stop apart: made by moving the level, the codes of sRGB.
  std::vector<ExposureFrame> frames;
  for (int k = 0; k < 3; ++k) {
    ExposureFrame frame = measured_frame(shoot.frames[0]);
    frame.manual_exposure = false;
    frame.f_number = 4;
    frame.exposure_time_s = std::exp2(-8 + k);
    frame.taken_at_s = k;
    const auto gain = static_cast<float>(std::exp2(k - 2 + (k == 1 ? 0.1 : 0)));
    for (float& level : frame.levels->mean_linear) level *= gain;
    frames.push_back(frame);
  }
  const ExposureAudit audit = audit_exposure(frames, {});
  ASSERT_EQ(audit.sets.size(), 1u);
  ASSERT_EQ(audit.sets[0].brackets.size(), 1u);
  const Bracket& bracket = audit.sets[0].brackets[0];
  EXPECT_NEAR(bracket.step_ev, 1, 1e-9);
  EXPECT_NEAR(*bracket.measured_ev[1], 1.1, 0.02);
  EXPECT_NEAR(*bracket.measured_ev[2], 2, 0.02);
}

// Manual exposure without flash and a brightness value: B_v 0 is 4 cd/m^2 with K = 12.5. At f/2, 1/8 s, ISO 100 that
// is EV 5 at Bv 0: right, so the mid-tone lies at the meter's aim, .296 stop under the standard's (check of optics).
TEST(ExposureAudit, BrightnessValuePredictsAManualFrame) {
  ExposureFrame frame;
  frame.f_number = 2;
  frame.exposure_time_s = 1 / 8.;
  frame.iso_speed = 100;
  frame.brightness_apex = 0;
  frame.manual_exposure = true;
  frame.flash_fired = false;
  Tone tone;
  tone.median_linear = 0.181164;
  frame.tone = tone;
  const FrameExposure found = audit_exposure(std::vector{frame}, {}).frames[0];
  ASSERT_TRUE(found.predicted_ev);
  EXPECT_EQ(found.basis, ExposureBasis::brightness);
  EXPECT_NEAR(*found.predicted_ev, -0.296, 0.001);
  EXPECT_EQ(found.verdict, ExposureVerdict::as_predicted);
  frame.flash_fired = true;
  EXPECT_EQ(audit_exposure(std::vector{frame}, {}).frames[0].basis, ExposureBasis::none);
}

// T = N / sqrt(transmittance): half the light is a stop less exposure.
TEST(ExposureAudit, TransmittanceCountsAsExposure) {
  ExposureFrame frame;
  frame.f_number = 2;
  frame.exposure_time_s = 1 / 8.;
  frame.iso_speed = 100;
  const double full_ev = *set_exposure_ev(frame);
  frame.transmittance = 0.5;
  EXPECT_NEAR(*set_exposure_ev(frame), full_ev - 1, 1e-12);
}

}  // namespace
}  // namespace focusfall
