// Canon notes: written with Exiv2, or word by word, with the numbers of real files where a file is named.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "metadata/remarks.h"
#include "tests/metadata/exif_file.h"

namespace focusfall {
namespace {

ExifFile canon_file(const char* model = "Canon EOS 1300D") {
  ExifFile file;
  file.set("Exif.Image.Make", "Canon").set("Exif.Image.Model", model);
  file.set("Exif.Photo.PixelXDimension", "5184").set("Exif.Photo.PixelYDimension", "3456");
  file.set("Exif.Photo.FocalLength", "36/1");
  file.decoded = {5184, 3456};
  return file;
}

ExifFile with_distances(int upper, int lower) {
  ExifFile file = canon_file();
  // The array's own length: 22 words, tags 0 to 0x15.
  file.set("Exif.CanonFi.0x0000", Exiv2::signedShort, "44");
  file.set("Exif.CanonFi.FocusDistanceUpper", Exiv2::signedShort, std::to_string(static_cast<std::int16_t>(upper)));
  file.set("Exif.CanonFi.FocusDistanceLower", Exiv2::signedShort, std::to_string(static_cast<std::int16_t>(lower)));
  return file;
}

TEST(CanonNote, TheFocusDistanceIsAnIntervalWithTheValueInItsDioptricMiddle) {
  const auto distance = with_distances(182, 113).read().capture.focus_distance;  // a real frame of an EOS 1300D
  ASSERT_TRUE(distance);
  EXPECT_EQ(distance->source, Source::maker_note);
  EXPECT_DOUBLE_EQ(distance->value.low_m, 1.13);
  EXPECT_DOUBLE_EQ(distance->value.high_m, 1.82);
  EXPECT_NEAR(1 / distance->value.value_m, (1 / 1.13 + 1 / 1.82) / 2, 1e-12);
}

TEST(CanonNote, TheTwoEndsAreSorted) {
  const auto distance = with_distances(113, 182).read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_LT(distance->value.low_m, distance->value.high_m);
}

TEST(CanonNote, TwoEqualEndsGiveThatDistance) {
  const auto distance = with_distances(182, 182).read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_EQ(distance->value.value_m, 1.82);  // exactly: 2/(1/1.82 + 1/1.82) is one unit in the last place above
}

TEST(CanonNote, DistancesAbove327MetresAreNotNegative) {
  const auto distance = with_distances(40000, 36000).read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.low_m, 360);
  EXPECT_DOUBLE_EQ(distance->value.high_m, 400);
}

TEST(CanonNote, TheSpecialDistancesAreInfinityAndUnknown) {
  const auto infinite = with_distances(65535, 8191).read().capture.focus_distance;
  ASSERT_TRUE(infinite);
  EXPECT_TRUE(std::isinf(infinite->value.value_m) && std::isinf(infinite->value.high_m));
  EXPECT_DOUBLE_EQ(infinite->value.low_m, 81.91);
  const auto half_open = with_distances(65535, 1000).read().capture.focus_distance;
  ASSERT_TRUE(half_open);
  EXPECT_DOUBLE_EQ(half_open->value.value_m, 20);  // twice the near end: the middle in 1/distance
  EXPECT_TRUE(std::isinf(half_open->value.high_m));
  EXPECT_FALSE(with_distances(0, 0).read().capture.focus_distance);
}

TEST(CanonNote, ManualFocusMakesTheDistanceDoubtful) {
  ExifFile file = with_distances(182, 113);
  EXPECT_FALSE(file.read().capture.focus_distance.value().value.stale);
  file.set("Exif.CanonCs.FocusMode", "3");
  file.set("Exif.CanonCs.0x0000", Exiv2::unsignedShort, "16");  // 8 words
  const Capture capture = file.read().capture;
  EXPECT_EQ(capture.focus_mode.value().value, FocusMode::manual);
  EXPECT_TRUE(capture.focus_distance.value().value.stale);
}

TEST(CanonNote, CloseUpTheUnknownOriginWidensTheInterval) {
  ExifFile file = with_distances(32, 30);
  file.exif["Exif.Photo.FocalLength"] = "100/1";  // 0.3 m is three focal lengths
  const auto distance = file.read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_NEAR(distance->value.low_m, 0.20, 1e-12);
  EXPECT_NEAR(distance->value.high_m, 0.42, 1e-12);
}

TEST(CanonNote, ANoteThatAnEditorMovedIsNotBelieved) {
  // The array of the distances starts with its own length, 44 bytes; moved, it starts with something else.
  std::vector<std::byte> jpeg = with_distances(182, 113).jpeg();
  const std::vector<std::byte> start = {std::byte{44}, std::byte{0}, std::byte{0}, std::byte{0}};
  const auto at = std::search(jpeg.begin(), jpeg.end(), start.begin(), start.end());
  ASSERT_NE(at, jpeg.end());
  ASSERT_TRUE(read_capture(jpeg, {5184, 3456}).capture.focus_distance);
  *at = std::byte{99};
  const CaptureReading reading = read_capture(jpeg, {5184, 3456});
  EXPECT_FALSE(reading.capture.focus_distance);
  EXPECT_TRUE(has_remark(reading, kMakerNoteUnusable));
}

ExifFile with_subject_distance(const char* model, const char* number) {
  ExifFile file = canon_file(model);
  file.set("Exif.CanonSi.0x0000", Exiv2::unsignedShort, "40");  // 20 words, tags 0 to 0x13
  file.set("Exif.CanonSi.SubjectDistance", Exiv2::unsignedShort, number);
  return file;
}

TEST(CanonNote, TheSubjectDistanceIsInCentimetresWithLittleTrust) {
  const auto distance = with_subject_distance("Canon DIGITAL IXUS 430", "521").read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.value_m, 5.21);
  EXPECT_GT(distance->value.high_m / distance->value.low_m, 1.5);
  EXPECT_FALSE(with_subject_distance("Canon DIGITAL IXUS 430", "0").read().capture.focus_distance);
  const auto infinite = with_subject_distance("Canon DIGITAL IXUS 430", "6553").read().capture.focus_distance;
  EXPECT_TRUE(infinite && std::isinf(infinite->value.value_m));
}

TEST(CanonNote, TheSubjectDistanceOfOldCompactsIsInMillimetres) {
  // A real frame of a DIGITAL IXUS 300: 1236 here, 1.236 m in Exif.
  ExifFile file = with_subject_distance("Canon DIGITAL IXUS 300", "1236");
  file.set("Exif.Photo.SubjectDistance", "1236/1000");
  const auto distance = file.read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.value_m, 1.236);
  EXPECT_EQ(distance->source, Source::exif);
}

// The 48 words of an EOS 1300D frame: nine points, the fifth in focus.
const char* kNinePoints =
    "96 2 9 9 5184 3456 5184 3456 181 129 129 129 222 129 129 129 181 117 172 172 172 224 172 172 172 117 "
    "0 64697 839 64142 0 1394 64697 839 0 743 393 393 0 0 0 65143 65143 64793 16 16 0 65535";

TEST(CanonNote, ThePointInFocusIsTheFocusArea) {
  const Capture capture = canon_file().set("Exif.Canon.AFInfo", Exiv2::unsignedShort, kNinePoints).read().capture;
  ASSERT_EQ(capture.focus_areas.size(), 1U);
  EXPECT_EQ(capture.focus_areas.front().kind, FocusAreaKind::focus_area);
  const FractionRect box = capture.focus_areas.front().box;
  EXPECT_NEAR(box.width, 222.0 / 5184, 1e-12);
  EXPECT_NEAR(box.x + box.width / 2, 0.5, 1e-12);
  EXPECT_NEAR(box.y + box.height / 2, 0.5, 1e-12);
}

// The same with another point in focus: the first, 743 units off the centre in y.
std::string with_first_point() {
  std::string words = kNinePoints;
  return words.replace(words.find("16 16 0 65535"), 5, "1 1");
}

TEST(CanonNote, EosBodiesCountUpwardsAndPowerShotBodiesDownwards) {
  const auto centre_y = [](const char* model) {
    const Capture capture =
        canon_file(model).set("Exif.Canon.AFInfo", Exiv2::unsignedShort, with_first_point()).read().capture;
    const FractionRect box = capture.focus_areas.at(0).box;
    return box.y + box.height / 2;
  };
  EXPECT_NEAR(centre_y("Canon EOS 1300D"), 0.5 - 743.0 / 3456, 1e-12);
  EXPECT_NEAR(centre_y("Canon PowerShot G7 X"), 0.5 + 743.0 / 3456, 1e-12);
}

TEST(CanonNote, FocusingByHandLeavesNoFocusArea) {
  std::string words = kNinePoints;
  words.replace(0, 4, "96 0");
  EXPECT_TRUE(canon_file().set("Exif.Canon.AFInfo", Exiv2::unsignedShort, words).read().capture.focus_areas.empty());
}

TEST(CanonNote, AnArrayThatEndsTooSoonGivesNoArea) {
  std::string words = kNinePoints;
  words.resize(words.find(" 743"));
  EXPECT_TRUE(canon_file().set("Exif.Canon.AFInfo", Exiv2::unsignedShort, words).read().capture.focus_areas.empty());
}

TEST(CanonNote, AxesOfTheAfSpaceScaleSeparately) {
  // One point of 409 x 38 in a space of 2272 x 212, as a DIGITAL IXUS 430 counts over a frame of 2272 x 1704.
  const char* words = "32 4 1 1 2272 1704 2272 212 409 38 65126 41 1 1";
  const Capture capture =
      canon_file("Canon DIGITAL IXUS 430").set("Exif.Canon.AFInfo", Exiv2::unsignedShort, words).read().capture;
  ASSERT_EQ(capture.focus_areas.size(), 1U);
  const FractionRect box = capture.focus_areas.front().box;
  EXPECT_NEAR(box.x + box.width / 2, 0.5 - 410.0 / 2272, 1e-12);
  EXPECT_NEAR(box.y + box.height / 2, 0.5 + 41.0 / 212, 1e-12);
  EXPECT_NEAR(box.height, 38.0 / 212, 1e-12);
}

TEST(CanonNote, ClusteredPointsAreOneAreaAndScatteredOnesAreSeveral) {
  // Four points of 10 x 10 in a space of 100 x 100: side by side, then in the corners.
  const char* cluster = "52 4 4 4 100 100 100 100 10 10 10 10 10 10 10 10 0 10 0 10 0 0 10 10 15 15";
  const char* corners = "52 4 4 4 100 100 100 100 10 10 10 10 10 10 10 10 65496 40 65496 40 65496 65496 40 41 15 15";
  const auto areas = [](const char* words) {
    return canon_file().set("Exif.Canon.AFInfo", Exiv2::unsignedShort, words).read().capture.focus_areas;
  };
  ASSERT_EQ(areas(cluster).size(), 1U);
  EXPECT_NEAR(areas(cluster).front().box.width, 0.2, 1e-12);
  EXPECT_EQ(areas(corners).size(), 4U);
}

TEST(CanonNote, TheOlderAfInformationIsReadForAnyNumberOfPoints) {
  // n, valid, size, AF space 1000 x 500, area 100 x 50, three x, three y, bits: the third point, up and to the right.
  ExifFile file = canon_file();
  const int words[] = {3, 3, 5184, 3456, 1000, 500, 100, 50, -200, 0, 200, 0, 0, 100, 4, 0};
  for (std::size_t i = 0; i < std::size(words); ++i) {
    Exiv2::UShortValue value;
    value.value_.push_back(static_cast<std::uint16_t>(words[i]));
    file.exif.add(Exiv2::ExifKey(static_cast<std::uint16_t>(i), "CanonPi"), &value);
  }
  const Capture capture = file.read().capture;
  ASSERT_EQ(capture.focus_areas.size(), 1U);
  const FractionRect box = capture.focus_areas.front().box;
  EXPECT_NEAR(box.x, 0.65, 1e-12);
  EXPECT_NEAR(box.y, 0.25, 1e-12);
  EXPECT_NEAR(box.width, 0.1, 1e-12);
}

TEST(CanonNote, TheActiveWidthOfTheSensorGivesThePitch) {
  ExifFile file = canon_file();
  file.set("Exif.Photo.FocalPlaneXResolution", "5184000/905").set("Exif.Photo.FocalPlaneResolutionUnit", "2");
  file.set("Exif.Canon.SensorInfo", Exiv2::unsignedShort, "34 5344 3516 1 1 152 56 5335 3511 0 0 0 0 0 0 0 0");
  const auto pitch = file.read().capture.pixel_pitch_um;
  ASSERT_TRUE(pitch);
  // 22.3 mm over 5184 px (maker's data sheet, from memory): 4.30 um. The bound is 3 %, and the truth is at its edge.
  EXPECT_NEAR(pitch->value.value, 4.30, 0.035 * 4.30);
  EXPECT_NEAR(pitch->value.high / pitch->value.value, 1.03, 1e-9);
}

TEST(CanonNote, ASmallerPictureByTheCamerasOwnSettingHasLargerPixels) {
  ExifFile file = canon_file();
  file.set("Exif.Photo.FocalPlaneXResolution", "5184000/905").set("Exif.Photo.FocalPlaneResolutionUnit", "2");
  const double large = file.read().capture.pixel_pitch_um.value().value.value;
  file.set("Exif.Photo.PixelXDimension", "2592").set("Exif.Photo.PixelYDimension", "1728");
  file.decoded = {2592, 1728};
  EXPECT_TRUE(has_remark(file.read(), kPitchUnknown));
  file.set("Exif.CanonCs.0x0000", Exiv2::unsignedShort, "22").set("Exif.CanonCs.ImageSize", "2");
  EXPECT_NEAR(file.read().capture.pixel_pitch_um.value().value.value, 2 * large, 1e-9);
}

TEST(CanonNote, StabiliserSerialLensAndSpeedAreRead) {
  ExifFile file = canon_file();
  file.set("Exif.CanonCs.0x0000", Exiv2::unsignedShort, "70")
      .set("Exif.CanonCs.ImageStabilization", Exiv2::unsignedShort, "256");
  file.set("Exif.Canon.SerialNumber", Exiv2::unsignedLong, "330100138");
  file.set("Exif.Canon.LensModel", Exiv2::asciiString, "EF400mm f/2.8L");
  file.set("Exif.CanonSi.0x0000", Exiv2::unsignedShort, "6").set("Exif.CanonSi.ISOSpeed", "143");
  file.set("Exif.CanonSi.AutoISO", "35");
  const Capture capture = file.read().capture;
  EXPECT_FALSE(capture.stabiliser_on.value().value);
  EXPECT_EQ(capture.body_serial.value().value, "0330100138");  // as engraved, ten digits
  EXPECT_EQ(capture.lens.value().value, "EF400mm f/2.8L");
  EXPECT_NEAR(capture.iso_speed.value().value, 148, 0.5);  // ExifTool's reading of the frame these numbers come from
  file.set("Exif.CanonCs.ImageStabilization", Exiv2::unsignedShort, "259");
  EXPECT_TRUE(file.read().capture.stabiliser_on.value().value);
  file.set("Exif.CanonCs.ImageStabilization", Exiv2::unsignedShort, "65535");
  EXPECT_FALSE(file.read().capture.stabiliser_on);
}

TEST(CanonNote, LongExposuresOfTheFirstRawFilesKeepTheirSign) {
  // A frame of an EOS D30: -76 as an unsigned word, 5.04 s to ExifTool; Exiv2 makes 1 s of it.
  ExifFile file = canon_file("Canon EOS D30");
  file.set("Exif.Photo.ExposureTime", "1/1").set("Exif.CanonSi.0x0000", Exiv2::unsignedShort, "46");
  file.set("Exif.CanonSi.ShutterSpeedValue", Exiv2::unsignedShort, "65460");
  EXPECT_NEAR(file.read().capture.exposure_time_s.value().value, 5.0397, 1e-4);
  file.set("Exif.Photo.ExifVersion", "48 50 51 48");  // a file with Exif of its own
  EXPECT_DOUBLE_EQ(file.read().capture.exposure_time_s.value().value, 1);
}

TEST(CanonNote, ALensNumberIsBelievedOnlyWithItsRange) {
  // 251 is a 70-200 mm to Exiv2; the lens of this frame is a 16-35 mm.
  ExifFile file = canon_file("Canon EOS D30");
  file.set("Exif.CanonCs.0x0000", Exiv2::unsignedShort, "52").set("Exif.CanonCs.LensType", "251");
  file.set("Exif.CanonCs.Lens", Exiv2::unsignedShort, "35 16 1");
  EXPECT_EQ(file.read().capture.lens.value().value, "16-35 mm");
  file.set("Exif.CanonCs.Lens", Exiv2::unsignedShort, "200 70 1");
  EXPECT_NE(file.read().capture.lens.value().value.find("70-200mm"), std::string::npos);
}

}  // namespace
}  // namespace focusfall
