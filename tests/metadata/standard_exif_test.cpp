// The tags of the Exif standard (CIPA DC-008-2019, Exif 2.32), and what real files do to them.
#include "metadata/standard_exif.h"

#include <gtest/gtest.h>

#include <cmath>

#include "tests/metadata/exif_file.h"

namespace focusfall {
namespace {

ExifFile plain_file() {
  ExifFile file;
  file.set("Exif.Image.Make", "NIKON CORPORATION").set("Exif.Image.Model", "NIKON D90");
  file.set("Exif.Photo.PixelXDimension", "6000").set("Exif.Photo.PixelYDimension", "4000");
  return file;
}

TEST(StandardExif, ValuesOfAnOrdinaryFileAreRead) {
  ExifFile file = plain_file();
  file.set("Exif.Photo.FocalLength", "4000/10").set("Exif.Photo.FNumber", "28/10");
  file.set("Exif.Photo.ExposureTime", "1/2000").set("Exif.Photo.ISOSpeedRatings", "800");
  file.set("Exif.Photo.ExposureBiasValue", "-2/3").set("Exif.Photo.Flash", "25").set("Exif.Image.Orientation", "6");
  file.set("Exif.Photo.LensModel", " 400mm f/2.8 ").set("Exif.Photo.LensSerialNumber", "L 12");
  file.set("Exif.Photo.BodySerialNumber", "B34").set("Exif.Photo.SubjectDistance", "305/10");
  const CaptureReading reading = file.read();
  const Capture& capture = reading.capture;
  EXPECT_EQ(capture.camera.value().value, "NIKON D90");
  EXPECT_EQ(capture.lens.value().value, "400mm f/2.8");
  EXPECT_EQ(capture.lens_serial.value().value, "L 12");
  EXPECT_EQ(capture.body_serial.value().value, "B34");
  EXPECT_DOUBLE_EQ(capture.focal_length_mm.value().value, 400);
  EXPECT_DOUBLE_EQ(capture.f_number.value().value, 2.8);
  EXPECT_DOUBLE_EQ(capture.exposure_time_s.value().value, 0.0005);
  EXPECT_DOUBLE_EQ(capture.iso_speed.value().value, 800);
  EXPECT_DOUBLE_EQ(capture.exposure_bias_ev.value().value, -2.0 / 3);
  EXPECT_TRUE(capture.flash_fired.value().value);
  EXPECT_EQ(capture.orientation.value().value, 6);
  EXPECT_DOUBLE_EQ(capture.focus_distance.value().value.value_m, 30.5);
  EXPECT_EQ(capture.width_px, 6000);
  EXPECT_EQ(capture.f_number.value().source, Source::exif);
  EXPECT_TRUE(reading.remarks.empty());
}

TEST(StandardExif, AFileWithoutCaptureDataGivesNothingAndNoRemark) {
  const CaptureReading reading = read_capture(jpeg_around({}, ""), {100, 100});
  EXPECT_FALSE(reading.capture.camera || reading.capture.f_number || reading.capture.taken_at);
  EXPECT_TRUE(reading.remarks.empty());
}

TEST(StandardExif, AbsurdValuesAreAbsentAndRemarked) {
  const struct {
    const char* key;
    const char* value;
  } cases[] = {
      {"Exif.Photo.FNumber", "0/10"},
      {"Exif.Photo.FNumber", "0/0"},
      {"Exif.Photo.FocalLength", "0/1"},
      {"Exif.Photo.FocalLength", "50/0"},
      {"Exif.Photo.ExposureTime", "0/1"},
      {"Exif.Photo.ExposureTime", "0/0"},
      {"Exif.Photo.SubjectDistance", "4294967294/1"},
      {"Exif.Photo.DateTimeOriginal", "1900:01:01 00:00:00"},
      {"Exif.Photo.DateTimeOriginal", "2026:13:41 27:00:00"},
      {"Exif.Photo.ExposureBiasValue", "900/1"},
  };
  for (const auto& [key, value] : cases) {
    const CaptureReading reading = plain_file().set(key, value).read();
    const Capture& c = reading.capture;
    EXPECT_FALSE(c.f_number || c.focal_length_mm || c.exposure_time_s || c.focus_distance || c.taken_at ||
                 c.exposure_bias_ev)
        << key << " " << value;
    EXPECT_TRUE(has_remark(reading, kValueAbsurd)) << key << " " << value;
  }
}

TEST(StandardExif, UnknownSubjectDistanceIsAbsentAndInfinityInfinite) {
  EXPECT_FALSE(plain_file().set("Exif.Photo.SubjectDistance", "0/0").read().capture.focus_distance);
  EXPECT_FALSE(plain_file().set("Exif.Photo.SubjectDistance", "0/10").read().capture.focus_distance);
  const auto infinite = plain_file().set("Exif.Photo.SubjectDistance", "4294967295/1").read().capture.focus_distance;
  ASSERT_TRUE(infinite);
  EXPECT_TRUE(std::isinf(infinite->value.value_m) && std::isinf(infinite->value.high_m));
  EXPECT_TRUE(std::isfinite(infinite->value.low_m));
}

TEST(StandardExif, TheFNumberFollowsFromTheApertureValue) {
  // Av = 5 is f/5.657 (APEX, N^2 = 2^Av).
  const auto reading = plain_file().set("Exif.Photo.FNumber", "0/1").set("Exif.Photo.ApertureValue", "5/1").read();
  ASSERT_TRUE(reading.capture.f_number);
  EXPECT_NEAR(reading.capture.f_number.value().value, 5.656854, 1e-6);
}

TEST(StandardExif, TheExposureTimeFollowsFromTheShutterSpeedValueUnlessThatIsAbsurd) {
  const auto reading = plain_file().set("Exif.Photo.ShutterSpeedValue", "10/1").read();
  ASSERT_TRUE(reading.capture.exposure_time_s);
  EXPECT_DOUBLE_EQ(reading.capture.exposure_time_s.value().value, 1.0 / 1024);
  const auto absurd = plain_file().set("Exif.Photo.ShutterSpeedValue", "-2147483648/1").read();
  EXPECT_FALSE(absurd.capture.exposure_time_s);
  EXPECT_TRUE(has_remark(absurd, kValueAbsurd));
}

TEST(StandardExif, SpeedsBesideAZeroAndBeyondSixteenBitsAreFound) {
  const auto iso = [](ExifFile file) { return file.read().capture.iso_speed.value_or(Sourced<double>{-1}).value; };
  const char* key = "Exif.Photo.ISOSpeedRatings";
  EXPECT_EQ(iso(plain_file().set(key, "200 0")), 200);
  EXPECT_EQ(iso(plain_file().set(key, "0 200")), 200);
  const auto beyond = [&](const char* type) {
    return plain_file()
        .set(key, "65535")
        .set("Exif.Photo.SensitivityType", type)
        .set("Exif.Photo.StandardOutputSensitivity", "102400")
        .set("Exif.Photo.RecommendedExposureIndex", "204800")
        .set("Exif.Photo.ISOSpeed", "409600");
  };
  EXPECT_EQ(iso(beyond("1")), 102400);
  EXPECT_EQ(iso(beyond("2")), 204800);
  EXPECT_EQ(iso(beyond("3")), 409600);
  EXPECT_EQ(iso(beyond("4")), 102400);
  EXPECT_EQ(iso(beyond("6")), 204800);
}

TEST(StandardExif, TheTimeKeepsItsFractionAndZone) {
  EXPECT_EQ(iso_time("2026:06:20 14:03:07", "", ""), "2026-06-20T14:03:07");
  EXPECT_EQ(iso_time("2026:06:20 14:03:07", "050 ", "+02:00"), "2026-06-20T14:03:07.050+02:00");
  EXPECT_EQ(iso_time("2026:06:20 14:03:07", "x", "   :  "), "2026-06-20T14:03:07");
  EXPECT_FALSE(iso_time("2026:02:29 14:03:07", "", ""));  // no leap year
  const auto reading = plain_file()
                           .set("Exif.Photo.DateTimeOriginal", "    :  :     :  :  ")
                           .set("Exif.Photo.DateTimeDigitized", "2026:06:20 14:03:07")
                           .set("Exif.Photo.SubSecTimeDigitized", "7")
                           .read();
  ASSERT_TRUE(reading.capture.taken_at);
  EXPECT_EQ(reading.capture.taken_at.value().value, "2026-06-20T14:03:07.7");
  EXPECT_TRUE(reading.remarks.empty());
}

TEST(StandardExif, SubjectAreasArePointsCirclesAndBoxesAboutTheirCentre) {
  const auto area = [](const char* value) {
    const Capture capture = plain_file().set("Exif.Photo.SubjectArea", value).read().capture;
    return capture.focus_areas.empty() ? FractionRect{-1, -1, -1, -1} : capture.focus_areas.front().box;
  };
  const FractionRect point = area("3000 1000"), circle = area("3000 1000 600"), box = area("3000 1000 600 400");
  EXPECT_DOUBLE_EQ(point.x, 0.5);
  EXPECT_DOUBLE_EQ(point.y, 0.25);
  EXPECT_DOUBLE_EQ(point.width, 0);
  EXPECT_DOUBLE_EQ(circle.width, 0.1);
  EXPECT_DOUBLE_EQ(circle.height, 0.15);
  EXPECT_DOUBLE_EQ(box.x, 0.45);
  EXPECT_DOUBLE_EQ(box.y, 0.2);
  EXPECT_DOUBLE_EQ(box.height, 0.1);
  // Outside the frame.
  EXPECT_EQ(area("9000 2000 300 300").x, -1);
}

TEST(StandardExif, TheBoxThatPhonesWriteByDefaultIsNoSubjectArea) {
  const auto areas = [](const char* make, const char* size_x, const char* size_y, const char* area) {
    ExifFile file;
    file.set("Exif.Image.Make", make)
        .set("Exif.Photo.PixelXDimension", size_x)
        .set("Exif.Photo.PixelYDimension", size_y);
    file.decoded = {std::stoi(size_x), std::stoi(size_y)};
    return file.set("Exif.Photo.SubjectArea", area).read().capture.focus_areas.size();
  };
  EXPECT_EQ(areas("Apple", "4032", "3024", "2015 1511 2217 1330"), 0U);  // 55 % x 44 %
  EXPECT_EQ(areas("other", "2448", "2448", "1223 1223 1795 1077"), 0U);  // the same of a square cut out of 3264 x 2448
  EXPECT_EQ(areas("Apple", "3264", "2448", "1631 1223 881 881"), 0U);    // an older one
  EXPECT_EQ(areas("Apple", "3264", "2448", "1000 1223 881 881"), 1U);    // somebody chose
  EXPECT_EQ(areas("Camera", "3264", "2448", "1631 1223 881 881"), 1U);   // the middle point of a camera
}

TEST(StandardExif, TheSubjectAreaCountsInRecordedPixelsWhenThePictureWasReduced) {
  ExifFile file = plain_file().set("Exif.Photo.SubjectArea", "3000 1000");
  file.decoded = {1500, 1000};
  ASSERT_EQ(file.read().capture.focus_areas.size(), 1U);
  EXPECT_DOUBLE_EQ(file.read().capture.focus_areas.front().box.x, 0.5);
}

TEST(StandardExif, MinusOneIsAnExposureBiasAndAllBitsSetNoBrightness) {
  EXPECT_DOUBLE_EQ(
      plain_file().set("Exif.Photo.ExposureBiasValue", "-1/1").read().capture.exposure_bias_ev.value().value, -1);
  EXPECT_DOUBLE_EQ(
      plain_file().set("Exif.Photo.BrightnessValue", "-205/100").read().capture.brightness_apex.value().value, -2.05);
  const auto unknown = plain_file().set("Exif.Photo.BrightnessValue", "-1/1").read();  // FFFFFFFF.H, read as signed
  EXPECT_FALSE(unknown.capture.brightness_apex);
  EXPECT_TRUE(unknown.remarks.empty());
}

TEST(StandardExif, NamesAndNumbersThatStandForNoneAreNone) {
  ExifFile file = plain_file();
  file.set("Exif.Photo.LensModel", "----").set("Exif.Photo.LensSerialNumber", "0000000000");
  file.set("Exif.Photo.BodySerialNumber", "0").set("Exif.Photo.LensSpecification", "0/0 0/0 0/0 0/0");
  const Capture capture = file.read().capture;
  EXPECT_FALSE(capture.lens || capture.lens_serial || capture.body_serial);
  file.set("Exif.Photo.LensSpecification", "18/1 55/1 35/10 56/10");
  EXPECT_EQ(file.read().capture.lens.value().value, "18-55 mm f/3.5-5.6");
}

TEST(StandardExif, TheModeOfExposureIsFoundInEitherTag) {
  const auto mode = [](const char* key, const char* value) {
    return plain_file().set(key, value).read().capture.exposure_mode;
  };
  EXPECT_EQ(mode("Exif.Photo.ExposureMode", "0").value().value, ExposureMode::automatic);
  EXPECT_EQ(mode("Exif.Photo.ExposureMode", "1").value().value, ExposureMode::manual);
  EXPECT_EQ(mode("Exif.Photo.ExposureMode", "2").value().value, ExposureMode::bracket);
  EXPECT_EQ(mode("Exif.Photo.ExposureProgram", "1").value().value, ExposureMode::manual);
  EXPECT_EQ(mode("Exif.Photo.ExposureProgram", "3").value().value, ExposureMode::automatic);
  EXPECT_FALSE(mode("Exif.Photo.ExposureProgram", "0"));
}

TEST(StandardExif, TheMakeIsNotRepeatedAndCompanyWordsAreLeftAway) {
  const auto name = [](const char* make, const char* model) {
    return plain_file().set("Exif.Image.Make", make).set("Exif.Image.Model", model).read().capture.camera.value().value;
  };
  EXPECT_EQ(name("Canon", "Canon EOS 5D"), "Canon EOS 5D");
  EXPECT_EQ(name("SONY", "DSC-H9"), "SONY DSC-H9");
  EXPECT_EQ(name("OLYMPUS IMAGING CORP.  ", "E-P3            "), "OLYMPUS E-P3");
  EXPECT_EQ(name("LEICA CAMERA AG", "LEICA T (Typ 701)"), "LEICA T (Typ 701)");
}

}  // namespace
}  // namespace focusfall
