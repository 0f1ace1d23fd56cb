#include "analysis/compare/compare.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "tests/compare/readings.h"

namespace focusfall {
namespace {

using ::testing::ElementsAre;
using ::testing::HasSubstr;
using ::testing::IsEmpty;

Measurement aim_of(double disc_px) {
  Measurement measurement;
  measurement.aim.box = {0.4, 0.5, 0.2, 0.2};
  measurement.aim_blur = blur(disc_px);
  return measurement;
}

Verdict judge(const Measurement& measurement, const CompareOptions& options = {},
              const Prediction& prediction = known_camera()) {
  return compare(std::nullopt, prediction, measurement, options);
}

CompareOptions assumed_centre(bool trusted = false) {
  CompareOptions options;
  options.aim_assumed = true;
  options.trust_centre = trusted;
  return options;
}

CompareOptions lost_edges(double bound_px) {
  CompareOptions options;
  options.aim_lower_bound_px = bound_px;
  return options;
}

CompareOptions with_brightness() {
  CompareOptions options;
  options.brightness_predicts = true;
  return options;
}

TEST(FocusVerdict, BlurInsideTheLimitIsOn) {
  const Verdict verdict = judge(aim_of(1.2));
  EXPECT_EQ(verdict.focus, FocusVerdict::on);
  EXPECT_THAT(verdict.causes, IsEmpty());
}

TEST(FocusVerdict, BlurBesideTheLimitIsUnsure) {
  // 3 px +- .27 px against 3 px.
  const Verdict verdict = judge(aim_of(3));
  EXPECT_EQ(verdict.focus, FocusVerdict::unsure);
  EXPECT_THAT(verdict.causes, IsEmpty());
}

TEST(FocusVerdict, BlurOutsideWithoutASurfaceIsOffForDefocus) {
  const Verdict verdict = judge(aim_of(8));
  EXPECT_EQ(verdict.focus, FocusVerdict::off);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::defocus));
  EXPECT_FALSE(verdict.defocus_limits);
}

TEST(FocusVerdict, ASurfaceNearerThanThePlaneOfFocusIsBackFocus) {
  Measurement measurement = aim_of(8);
  measurement.plane = plane_with(+8.1, 0.2);
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::back);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::defocus));
  ASSERT_TRUE(verdict.defocus_limits);
  EXPECT_NEAR(verdict.defocus_limits->value, 2.7, 1e-9);
}

TEST(FocusVerdict, ASurfaceBeyondThePlaneOfFocusIsFrontFocus) {
  Measurement measurement = aim_of(8);
  measurement.plane = plane_with(-7.8, 0.2, Contact::foot);
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::front);
  EXPECT_LT(verdict.defocus_limits->high, 0);
}

TEST(FocusVerdict, NoSideWhereTheAimIsNotAsBlurredAsTheSurface) {
  // The subject floats: 8 px at the aim, 3.5 px on the ground below it. Still the signed blur of the ground is given.
  Measurement measurement = aim_of(8);
  measurement.plane = plane_with(3.5, 0.2);
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::off);
  EXPECT_TRUE(verdict.defocus_limits);
}

TEST(FocusVerdict, NoSideWithoutContactOrWithoutASlope) {
  Measurement measurement = aim_of(8);
  measurement.plane = plane_with(8, 0.2, Contact::none);
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::off);
  measurement.plane = plane_with(8, 0.2);
  measurement.plane->gradient_sigma_px = 20;   // 40 +- 20 px per frame height
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::off);
  measurement.plane = plane_with(8, 4);        // l = 8 +- 4 px
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::off);
}

TEST(FocusVerdict, DefocusIsGivenInsideTheBandToo) {
  Measurement measurement = aim_of(1);
  measurement.plane = plane_with(-0.9, 0.1);
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::on);
  ASSERT_TRUE(verdict.defocus_limits);
  EXPECT_NEAR(verdict.defocus_limits->value, -0.3, 1e-9);
}

TEST(FocusVerdict, AnAimWithoutEdgesIsNoEvidence) {
  Measurement measurement = aim_of(1);
  measurement.aim_blur = {std::nullopt, 3};
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::no_evidence);
  EXPECT_THAT(verdict.causes, IsEmpty());
}

TEST(FocusVerdict, EdgesLostAgainstTheNeighboursAreOffBeyondTheLimitOnly) {
  Measurement measurement = aim_of(1);
  measurement.aim_blur = {std::nullopt, 0};
  EXPECT_EQ(judge(measurement, lost_edges(20)).focus, FocusVerdict::off);
  EXPECT_EQ(judge(measurement, lost_edges(2)).focus, FocusVerdict::no_evidence);
}

TEST(FocusVerdict, ALowerBoundIsNeverOnAndAnUpperBoundNeverOff) {
  Measurement measurement = aim_of(1);
  measurement.aim_blur.estimate->bound = Bound::lower;
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::unsure);
  measurement = aim_of(12);
  measurement.aim_blur.estimate->bound = Bound::lower;
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::off);
  measurement.aim_blur.estimate->bound = Bound::upper;
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::unsure);
  measurement = aim_of(1);
  measurement.aim_blur.estimate->bound = Bound::upper;
  EXPECT_EQ(judge(measurement).focus, FocusVerdict::on);
}

TEST(FocusVerdict, AnAssumedCentreIsNeverCalledOff) {
  Measurement measurement = aim_of(8);
  measurement.plane = plane_with(8, 0.2);
  const Verdict held = judge(measurement, assumed_centre());
  EXPECT_EQ(held.focus, FocusVerdict::unsure);
  EXPECT_THAT(held.causes, IsEmpty());
  EXPECT_EQ(judge(measurement, assumed_centre(true)).focus, FocusVerdict::back);
  EXPECT_EQ(judge(aim_of(1), assumed_centre()).focus, FocusVerdict::on);
}

TEST(Cause, MovementBeforeAStillBackgroundIsSubjectMotion) {
  Measurement measurement = aim_of(5);
  measurement.motion = movement(8, 20);
  measurement.background_motion = movement(0.5, 100);
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::off);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::subject_motion));
  EXPECT_FALSE(verdict.panned);
}

TEST(Cause, TheSameMovementInTheBackgroundIsCameraShake) {
  Measurement measurement = aim_of(5);
  measurement.motion = movement(8, 175);
  measurement.background_motion = movement(8.1, 2);   // 7 degrees apart, across the wrap at 180
  EXPECT_THAT(judge(measurement).causes, ElementsAre(Cause::camera_shake));
}

TEST(Cause, ALongerMovementOfTheBackgroundIsAPannedSubject) {
  Measurement measurement = aim_of(5);
  measurement.motion = movement(6, 0);
  measurement.background_motion = movement(40, 3);
  const Verdict verdict = judge(measurement);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::subject_motion));
  EXPECT_TRUE(verdict.panned);
  EXPECT_THAT(verdict.summary, HasSubstr("panned"));
}

TEST(Cause, MovementBeforeABackgroundThatCannotBeMeasuredIsMotion) {
  Measurement measurement = aim_of(5);
  measurement.motion = movement(8, 20);
  EXPECT_THAT(judge(measurement).causes, ElementsAre(Cause::motion));
}

TEST(Cause, MovementInsideTheLimitIsDataAndNoCause) {
  Measurement measurement = aim_of(1.8);
  measurement.motion = movement(2.1, 20, 0, 0.4);   // S across it: 6.2 +- .8 px^2, 2.5 px
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::on);
  EXPECT_THAT(verdict.causes, IsEmpty());
}

TEST(Cause, MovementAndDefocusAreBothNamed) {
  Measurement measurement = aim_of(8);
  measurement.motion = movement(12, 20, 49, 4);   // 202 px^2 of movement on a disc of 7 px
  measurement.plane = plane_with(7, 0.2);
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::back);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::defocus, Cause::motion));
}

TEST(Cause, DiffractionIsNamedWhereItAloneExceedsTheLimit) {
  Prediction prediction = known_camera();
  prediction.blur_disc_px = 5;
  const Verdict verdict = judge(aim_of(5.1), {}, prediction);
  EXPECT_EQ(verdict.focus, FocusVerdict::off);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::diffraction));
  // Below the limit it is never a cause, though it has its share in the blur.
  prediction.blur_disc_px = 2.5;
  EXPECT_THAT(judge(aim_of(6), {}, prediction).causes, ElementsAre(Cause::defocus));
}

TEST(Cause, SomethingElseInFocusIsAMissedAim) {
  Measurement measurement = aim_of(8);
  measurement.best = SharpestRegion{{0.8, 0.1, 0.1, 0.1}, blur(0.8)};
  EXPECT_THAT(judge(measurement).causes, ElementsAre(Cause::defocus, Cause::missed_aim));
  measurement.best = SharpestRegion{{0.8, 0.1, 0.1, 0.1}, blur(6)};
  EXPECT_THAT(judge(measurement).causes, ElementsAre(Cause::defocus));
}

TEST(Cause, APartOfTheSubjectOutsideIsShallowDepthOfField) {
  Measurement measurement = aim_of(1);
  measurement.aim.mixed = true;
  measurement.aim_softer_part = *blur(7).estimate;
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.focus, FocusVerdict::on);
  EXPECT_THAT(verdict.causes, ElementsAre(Cause::shallow_depth_of_field));
  // 40 px is a background, 2 px is inside.
  measurement.aim_softer_part = *blur(40).estimate;
  EXPECT_THAT(judge(measurement).causes, IsEmpty());
  measurement.aim_softer_part = *blur(2).estimate;
  EXPECT_THAT(judge(measurement).causes, IsEmpty());
}

TEST(ExposureVerdict, SaysNothingWithoutAPrediction) {
  Measurement measurement = aim_of(1);
  measurement.tone = Tone{0.7, 0.7, std::nullopt, 0.99};
  const Verdict verdict = judge(measurement);
  EXPECT_EQ(verdict.exposure, ExposureVerdict::unknown);
  EXPECT_FALSE(verdict.exposure_error_ev);
}

TEST(ExposureVerdict, ComparesTheMeanWithThePredictedLevel) {
  Prediction prediction = known_camera();
  prediction.mid_tone_level = 0.12;
  Measurement measurement = aim_of(1);
  const auto with_mean = [&](double mean) {
    measurement.tone = Tone{mean, mean, std::nullopt, 0.99};
    return judge(measurement, with_brightness(), prediction);
  };
  EXPECT_EQ(with_mean(0.48).exposure, ExposureVerdict::over);    // 2 stops
  EXPECT_NEAR(with_mean(0.48).exposure_error_ev->value, 2, 1e-12);
  EXPECT_EQ(with_mean(0.03).exposure, ExposureVerdict::under);
  EXPECT_EQ(with_mean(0.13).exposure, ExposureVerdict::as_predicted);
  EXPECT_EQ(with_mean(0.19).exposure, ExposureVerdict::unknown);   // .66 stop: neither
}

TEST(ExposureVerdict, OneChannelAloneIsColourAndNotClipped) {
  Measurement measurement = aim_of(1);
  measurement.clipping = Clipping{};
  measurement.clipping->kind = ClippedKind::colour;
  EXPECT_FALSE(judge(measurement).clipped);
  measurement.clipping->kind = ClippedKind::area;
  measurement.clipping->two_or_more = 0.031;
  const Verdict verdict = judge(measurement);
  EXPECT_TRUE(verdict.clipped);
  EXPECT_THAT(verdict.summary, HasSubstr("3.1 %"));
}

TEST(Summary, SaysSideDistanceLimitsAndBlur) {
  OpticalSetup setup;
  setup.focal_length_mm = 400;
  setup.f_number = 2.8;
  setup.pixel_pitch_um = Interval{6, 6, 6};
  setup.focus_distance_m = Interval{30, 29, 31};
  setup.distance_from = DistanceOrigin::lens;
  Measurement measurement = aim_of(5.4);
  measurement.plane = plane_with(5.4, 0.2);
  // d = 1/(1/30000 + .0324/57915) mm = 29.505 m: .495 m; 5.4/3 = 1.8 limits.
  EXPECT_EQ(compare(setup, known_camera(), measurement).summary,
            "Focus fell 0.50 m behind the subject (+1.8 limits of the depth of field); blur at the aim 5.4 px, "
            "3.0 px would do.");
}

TEST(Summary, NamesDiffractionWithItsFNumber) {
  OpticalSetup setup;
  setup.focal_length_mm = 50;
  setup.f_number = 32;
  Prediction prediction = known_camera();
  prediction.blur_disc_px = 5;
  EXPECT_EQ(compare(setup, prediction, aim_of(5.1)).summary,
            "Diffraction at f/32 alone gives 5.0 px; blur at the aim 5.1 px, 3.0 px would do.");
}

}  // namespace
}  // namespace focusfall
