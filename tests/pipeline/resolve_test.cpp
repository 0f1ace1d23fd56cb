#include "src/pipeline/resolve.h"

#include <gmock/gmock.h>

#include <cmath>

namespace focusfall {
namespace {

constexpr DecodedSize kFrame{6000, 4000};

Capture recorded() {
  Capture c;
  c.camera = {"Invented One", Source::exif};
  c.body_serial = {"0042", Source::exif};
  c.lens = {"Invented 400 mm f/2.8", Source::exif};
  c.taken_at = {"2026-06-14T15:02:11", Source::exif};
  c.focal_length_mm = {400.0, Source::exif};
  c.f_number = {2.8, Source::exif};
  c.orientation = {1, Source::exif};
  c.pixel_pitch_um = {{.value = 6, .low = 5.9, .high = 6.1}, Source::derived};
  return c;
}

bool has_issue(const Resolved& resolved, const std::string& code) {
  for (const Issue& issue : resolved.issues) {
    if (issue.code == code) return true;
  }
  return false;
}

TEST(Resolve, TheCommandLineWinsOverTheFileAndSettingsFillGaps) {
  UserValues user;
  user.f_number = 5.6;
  Settings settings;
  settings.defaults.f_number = 8;
  settings.defaults.focal_length_mm = 100;
  settings.defaults.iso_speed = 800;
  const Resolved resolved = resolve(recorded(), user, settings, kFrame);
  EXPECT_DOUBLE_EQ(resolved.capture.f_number->value, 5.6);
  EXPECT_EQ(resolved.capture.f_number->source, Source::user);
  EXPECT_DOUBLE_EQ(resolved.capture.focal_length_mm->value, 400);
  EXPECT_EQ(resolved.capture.focal_length_mm->source, Source::exif);
  EXPECT_DOUBLE_EQ(resolved.capture.iso_speed->value, 800);
  EXPECT_EQ(resolved.capture.iso_speed->source, Source::settings);
}

TEST(Resolve, OverridingSettingsWinOverTheFileAndNotOverTheUser) {
  Settings settings;
  settings.defaults.focal_length_mm = 100;
  settings.override_file = true;
  EXPECT_DOUBLE_EQ(resolve(recorded(), {}, settings, kFrame).setup->focal_length_mm, 100);
  UserValues user;
  user.focal_length_mm = 200;
  EXPECT_DOUBLE_EQ(resolve(recorded(), user, settings, kFrame).setup->focal_length_mm, 200);
}

TEST(Resolve, ABodyIsFoundBySerialBeforeItsName) {
  Settings settings;
  settings.bodies.resize(2);
  settings.bodies[0].model = "INVENTED one";                 // letter case does not count
  settings.bodies[0].baseline_px2 = Interval{1, 1, 1};
  settings.bodies[1].serial = "0042";
  settings.bodies[1].baseline_px2 = Interval{2, 2, 2};
  settings.bodies[1].clock_offset_s = 60;
  const Resolved by_serial = resolve(recorded(), {}, settings, kFrame);
  EXPECT_DOUBLE_EQ(by_serial.baseline.squared_disc_px2.value, 2);
  EXPECT_STREQ(by_serial.baseline.source, "settings");
  EXPECT_EQ(by_serial.capture.taken_at->value, "2026-06-14T15:03:11");
  EXPECT_EQ(by_serial.capture.taken_at->source, Source::settings);
  Capture other = recorded();
  other.body_serial->value = "0043";
  EXPECT_DOUBLE_EQ(resolve(other, {}, settings, kFrame).baseline.squared_disc_px2.value, 1);
}

TEST(Resolve, ATeleconverterMultipliesFocalLengthAndFNumber) {
  UserValues user;
  user.teleconverter = 1.4;
  const Resolved resolved = resolve(recorded(), user, {}, kFrame);
  EXPECT_DOUBLE_EQ(resolved.setup->focal_length_mm, 560);
  EXPECT_DOUBLE_EQ(resolved.setup->f_number, 2.8 * 1.4);
  EXPECT_DOUBLE_EQ(resolved.capture.focal_length_mm->value, 400);   // what the lens is marked with
}

TEST(Resolve, ASensorSizeGivesThePitchAlongTheLongSide) {
  UserValues user;
  user.sensor = SensorSize{36, 24};
  EXPECT_DOUBLE_EQ(resolve(recorded(), user, {}, kFrame).capture.pixel_pitch_um->value.value, 6);
  EXPECT_DOUBLE_EQ(resolve(recorded(), user, {}, {4000, 6000}).capture.pixel_pitch_um->value.value, 6);
}

TEST(Resolve, WithoutFNumberThereIsNoSetupAndTheIssueSaysWhatToGive) {
  Capture c = recorded();
  c.f_number.reset();
  const Resolved resolved = resolve(c, {}, {}, kFrame);
  EXPECT_FALSE(resolved.setup);
  ASSERT_TRUE(has_issue(resolved, "setup-incomplete"));
  EXPECT_THAT(resolved.issues[0].message, testing::HasSubstr("--f-number"));
}

TEST(Aim, IsTheUsersThenTheCamerasBestThenTheCentre) {
  Capture c = recorded();
  EXPECT_EQ(resolve(c, {}, {}, kFrame).aim.kind, FocusAreaKind::centre);
  EXPECT_FALSE(resolve(c, {}, {}, kFrame).aim_may_be_judged);
  UserValues trusting;
  trusting.trust_centre = true;
  EXPECT_TRUE(resolve(c, trusting, {}, kFrame).aim_may_be_judged);
  c.focus_areas = {{.box = {0.1, 0.1, 0.2, 0.2}, .kind = FocusAreaKind::subject_area, .source = Source::exif},
                   {.box = {0.5, 0.5, 0.2, 0.2}, .kind = FocusAreaKind::focus_area, .source = Source::maker_note}};
  EXPECT_EQ(resolve(c, {}, {}, kFrame).aim.kind, FocusAreaKind::focus_area);
  UserValues user;
  user.aim = UserAim{{0.2}, {0.3}, {0.4}, {0.5}};
  const Resolved resolved = resolve(c, user, {}, kFrame);
  EXPECT_EQ(resolved.aim.kind, FocusAreaKind::user);
  EXPECT_DOUBLE_EQ(resolved.aim.box.height, 0.5);
}

TEST(Aim, OutsideTheFrameIsSaidAndPassedOver) {
  UserValues user;
  user.aim = UserAim{{7000, true}, {0, true}, {100, true}, {100, true}};
  const Resolved resolved = resolve(recorded(), user, {}, kFrame);
  EXPECT_EQ(resolved.aim.kind, FocusAreaKind::centre);
  EXPECT_TRUE(has_issue(resolved, "aim-outside-frame"));
}

TEST(Aim, ThatIsTooSmallGrowsAboutItsCentreAndStaysInside) {
  const GrownBox middle = grow_aim({.x = 0.5, .y = 0.5, .width = 0, .height = 0}, kFrame);
  EXPECT_TRUE(middle.grown);
  EXPECT_DOUBLE_EQ(middle.box.width * 6000, kLeastAimPx);
  EXPECT_DOUBLE_EQ(middle.box.x + middle.box.width / 2, 0.5);
  const GrownBox corner = grow_aim({.x = 1, .y = 1, .width = 0, .height = 0}, kFrame);
  EXPECT_NEAR(corner.box.x + corner.box.width, 1, 1e-12);
  EXPECT_FALSE(grow_aim({.x = 0.1, .y = 0.1, .width = 0.3, .height = 0.3}, kFrame).grown);
  const GrownBox tiny_frame = grow_aim({.x = 0.4, .y = 0.4, .width = 0.1, .height = 0.1}, {100, 100});
  EXPECT_DOUBLE_EQ(tiny_frame.box.width, 1);
}

// Where a corner of the displayed picture lies in the stored one. Exif 2.32, tag 0x0112, names for each value which
// side of the picture the stored row 0 and column 0 are: 6 = right side, top; 8 = left side, bottom; and so on.
TEST(Orientation, MapsTheCornersAsExifSays) {
  struct Case {
    int orientation;
    FramePoint stored_of_top_left, stored_of_top_right;
  };
  const Case cases[] = {
      {1, {0, 0}, {1, 0}},   // row 0 top, column 0 left
      {2, {1, 0}, {0, 0}},   // top, right
      {3, {1, 1}, {0, 1}},   // bottom, right
      {4, {0, 1}, {1, 1}},   // bottom, left
      {5, {0, 0}, {0, 1}},   // row 0 left, column 0 top
      {6, {0, 1}, {0, 0}},   // row 0 right, column 0 top
      {7, {1, 1}, {1, 0}},   // row 0 right, column 0 bottom
      {8, {1, 0}, {1, 1}},   // row 0 left, column 0 bottom
  };
  for (const Case& c : cases) {
    const FramePoint left = unrotated_point({0, 0}, c.orientation), right = unrotated_point({1, 0}, c.orientation);
    EXPECT_EQ(left.x, c.stored_of_top_left.x) << c.orientation;
    EXPECT_EQ(left.y, c.stored_of_top_left.y) << c.orientation;
    EXPECT_EQ(right.x, c.stored_of_top_right.x) << c.orientation;
    EXPECT_EQ(right.y, c.stored_of_top_right.y) << c.orientation;
  }
}

TEST(Orientation, ForthAndBackIsTheSamePoint) {
  for (int orientation = 1; orientation <= 8; ++orientation) {
    const FramePoint back = displayed_point(unrotated_point({0.2, 0.7}, orientation), orientation);
    EXPECT_NEAR(back.x, 0.2, 1e-12) << orientation;
    EXPECT_NEAR(back.y, 0.7, 1e-12) << orientation;
  }
}

TEST(NearSide, IsTheLowerOneAsDisplayedUnlessSaid) {
  Capture c = recorded();
  c.orientation->value = 8;   // row 0 is the left side, column 0 the bottom: the bottom as displayed is stored left
  EXPECT_EQ(resolve(c, {}, {}, kFrame).near_side, NearSide::left);
  UserValues user;
  user.near_side = NearSide::top;
  EXPECT_EQ(resolve(c, user, {}, kFrame).near_side, NearSide::right);
  c.orientation.reset();
  const Resolved unknown = resolve(c, {}, {}, kFrame);
  EXPECT_FALSE(unknown.near_side);
  EXPECT_TRUE(has_issue(unknown, "orientation-unknown"));
}

TEST(AcceptableBlur, OfTheCommandLineWinsAsAWhole) {
  UserValues user;
  user.acceptable_blur_um = 20;
  Settings settings;
  settings.defaults.acceptable_blur_px = 3;
  const Resolved resolved = resolve(recorded(), user, settings, kFrame);
  EXPECT_DOUBLE_EQ(*resolved.setup->acceptable_blur_um, 20);
  EXPECT_FALSE(resolved.setup->acceptable_blur_px);
}

}  // namespace
}  // namespace focusfall
