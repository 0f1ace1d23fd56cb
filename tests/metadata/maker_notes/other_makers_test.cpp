// Notes of the makers that keep few values: one or two tests each.
#include <gtest/gtest.h>

#include <cmath>

#include "metadata/remarks.h"
#include "tests/metadata/exif_file.h"
#include "tests/metadata/note_bytes.h"

namespace focusfall {
namespace {

ExifFile file_of(const char* make, const char* model) {
  ExifFile file;
  file.set("Exif.Image.Make", make).set("Exif.Image.Model", model);
  file.set("Exif.Photo.PixelXDimension", "6000").set("Exif.Photo.PixelYDimension", "4000");
  file.set("Exif.Photo.FocalLength", "20/1");
  return file;
}

// ---- Olympus --------------------------------------------------------------------------------------------------------

constexpr std::uint16_t kEquipment = 0x2010, kCameraSettings = 0x2020, kFocusInfo = 0x2050;

ExifFile olympus_file(const std::vector<SubDirectory>& parts, int width_px = 6000, int height_px = 4000) {
  ExifFile file = file_of("OLYMPUS CORPORATION", "E-M1");
  file.set("Exif.Photo.PixelXDimension", std::to_string(width_px));
  file.set("Exif.Photo.PixelYDimension", std::to_string(height_px));
  file.set_bytes("Exif.Photo.MakerNote", olympus_note(parts));
  file.decoded = {width_px, height_px};
  return file;
}

ExifFile with_olympus_distance(std::uint32_t numerator, std::uint32_t denominator) {
  return olympus_file({{kFocusInfo, {rationals(0x0305, 5, {numerator, denominator})}}});
}

TEST(OlympusNote, TheNumeratorOfTheDistanceIsInMillimetres) {
  const auto distance = with_olympus_distance(2500, 10).read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.value_m, 2.5);
  EXPECT_EQ(distance->source, Source::maker_note);
  EXPECT_FALSE(with_olympus_distance(4294967295U, 10).read().capture.focus_distance);
  EXPECT_FALSE(with_olympus_distance(4294967280U, 1).read().capture.focus_distance);
  EXPECT_FALSE(with_olympus_distance(0, 10).read().capture.focus_distance);
}

TEST(OlympusNote, TheNoteOfTheSuccessorIsReadAlike) {
  ExifFile file = file_of("OM Digital Solutions", "OM-1");
  file.set_bytes("Exif.Photo.MakerNote", om_system_note({{kFocusInfo, {rationals(0x0305, 5, {2500, 10})}}}));
  const auto distance = file.read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.value_m, 2.5);
}

// The numbers of a real frame: (113,107)-(142,145) in 255ths.
NoteEntry one_area() {
  NoteEntry areas = longs(0x0304, {1902874257U});
  areas.data.resize(64 * 4, 0);
  areas.count = 64;
  return areas;
}

TEST(OlympusNote, TheAreaGivesTheSelectedPointItsExtent) {
  const auto inside = rationals(0x0305, 10, {0, 0, 255, 510, 252, 510, 255, 510, 252, 510});
  const auto areas = olympus_file({{kCameraSettings, {one_area(), inside}}}).read().capture.focus_areas;
  ASSERT_EQ(areas.size(), 1U);
  EXPECT_NEAR(areas.front().box.x, 113.0 / 255, 1e-12);
  EXPECT_NEAR(areas.front().box.height, 38.0 / 255, 1e-12);
}

TEST(OlympusNote, ASelectedPointElsewhereIsAPointAndZeroOverZeroNone) {
  const auto elsewhere = rationals(0x0305, 10, {0, 0, 1, 10, 1, 10, 1, 10, 1, 10});
  const auto point = olympus_file({{kCameraSettings, {one_area(), elsewhere}}}).read().capture.focus_areas;
  ASSERT_EQ(point.size(), 1U);
  EXPECT_DOUBLE_EQ(point.front().box.x, 0.1);
  EXPECT_DOUBLE_EQ(point.front().box.width, 0);
  const auto none = rationals(0x0305, 10, {0, 0, 0, 0, 0, 0, 0, 0, 0, 0});
  EXPECT_TRUE(olympus_file({{kCameraSettings, {none}}}).read().capture.focus_areas.empty());
}

TEST(OlympusNote, TheDiagonalOfTheSensorGivesThePitch) {
  const SubDirectory equipment{kEquipment, {rationals(0x0103, 5, {2160, 100})}};
  // 4:3, then 16:9, which keeps the width of the sensor, then 1:1, which keeps its height: 17.28 mm / 4608.
  const int sizes[][2] = {{4608, 3456}, {4608, 2592}, {3456, 3456}};
  for (const auto& size : sizes) {
    const auto pitch = olympus_file({equipment}, size[0], size[1]).read().capture.pixel_pitch_um;
    ASSERT_TRUE(pitch) << size[0] << " x " << size[1];
    EXPECT_NEAR(pitch->value.value, 3.75, 0.001) << size[0] << " x " << size[1];
  }
}

TEST(OlympusNote, ModeStabiliserBurstAndIdentityAreRead) {
  const Capture capture =
      olympus_file({{kEquipment,
                     {text(0x0101, "B9U505495                       "), text(0x0202, "AC1205545"),
                      text(0x0203, "OLYMPUS M.17mm F1.8             ")}},
                    {kCameraSettings, {shorts(0x0301, {10, 0}), shorts(0x0600, {5, 7, 0}), longs(0x0604, {0})}}})
          .read()
          .capture;
  EXPECT_EQ(capture.focus_mode.value().value, FocusMode::manual);
  EXPECT_FALSE(capture.stabiliser_on.value().value);
  EXPECT_EQ(capture.sequence.value().value, 7);
  EXPECT_EQ(capture.lens.value().value, "OLYMPUS M.17mm F1.8");
  EXPECT_EQ(capture.lens_serial.value().value, "AC1205545");
  EXPECT_EQ(capture.body_serial.value().value, "B9U505495");
}

// ---- Sony -----------------------------------------------------------------------------------------------------------

TEST(SonyNote, TheFocusLocationHasTheSizeOfItsFrame) {
  ExifFile file = file_of("SONY", "ILCE-6300");
  file.set("Exif.Sony1.0x2027", Exiv2::unsignedShort, "6000 4000 1500 1000");
  file.set("Exif.Sony1.0x2037", Exiv2::unsignedShort, "600 400 257");
  auto areas = file.read().capture.focus_areas;
  ASSERT_EQ(areas.size(), 1U);
  EXPECT_DOUBLE_EQ(areas.front().box.x, 0.2);
  EXPECT_DOUBLE_EQ(areas.front().box.width, 0.1);
  // The centre without a frame is what is written when the place is not known.
  file.set("Exif.Sony1.0x2027", Exiv2::unsignedShort, "6000 4000 3000 2000");
  file.set("Exif.Sony1.0x2037", Exiv2::unsignedShort, "0 0 0");
  EXPECT_TRUE(file.read().capture.focus_areas.empty());
  // A picture of another shape: the note was moved and reads as nonsense.
  file.set("Exif.Sony1.0x2027", Exiv2::unsignedShort, "300 4000 150 1000");
  EXPECT_TRUE(file.read().capture.focus_areas.empty());
}

TEST(SonyNote, NotesWithoutASignatureAreReadAlike) {
  ExifFile file = file_of("SONY", "ILCE-6300");
  file.set("Exif.Sony2.0x2027", Exiv2::unsignedShort, "6000 4000 1500 1000");
  file.set("Exif.Sony2.0x2037", Exiv2::unsignedShort, "600 400 257").set("Exif.Sony2.0x201b", Exiv2::unsignedByte, "3");
  const Capture capture = file.read().capture;
  ASSERT_EQ(capture.focus_areas.size(), 1U);
  EXPECT_DOUBLE_EQ(capture.focus_areas.front().box.width, 0.1);
  EXPECT_EQ(capture.focus_mode.value().value, FocusMode::continuous);
}

TEST(SonyNote, TheFlexibleSpotCountsOnlyWhereTheCameraFocusedWithIt) {
  const auto areas = [](const char* area_mode, const char* focus_mode) {
    return file_of("SONY", "ILCE-6000")
        .set("Exif.Sony1.0x201b", Exiv2::unsignedByte, focus_mode)
        .set("Exif.Sony1.0x201c", Exiv2::unsignedByte, area_mode)
        .set("Exif.Sony1.0x201d", Exiv2::unsignedShort, "160 120")
        .read()
        .capture.focus_areas;
  };
  ASSERT_EQ(areas("3", "2").size(), 1U);
  EXPECT_DOUBLE_EQ(areas("3", "2").front().box.x, 0.25);
  EXPECT_TRUE(areas("3", "0").empty());  // by hand
  EXPECT_TRUE(areas("0", "2").empty());  // another area mode
}

TEST(SonyNote, CompactsDoNotMeanTheFocusModeTheyWrite) {
  const auto mode = [](const char* model, const char* code) {
    return file_of("SONY", model).set("Exif.Sony1.0x201b", Exiv2::unsignedByte, code).read().capture.focus_mode;
  };
  EXPECT_EQ(mode("ILCE-6300", "0").value().value, FocusMode::manual);
  EXPECT_EQ(mode("ILCE-6300", "3").value().value, FocusMode::continuous);
  EXPECT_FALSE(mode("DSC-RX100M3", "0"));
  EXPECT_EQ(mode("DSC-RX100M7", "2").value().value, FocusMode::single);
}

// The block is enciphered byte by byte by b -> b^3 mod 249 (ExifTool's tables); Exiv2 reads it and cannot write it.
ExifFile with_focus_position(const char* model, int position) {
  ExifFile file = file_of("SONY", model);
  std::vector<std::uint8_t> block(0x2e + 1, 0);
  block[0x02] = 0xff;
  block[0x2d] = static_cast<std::uint8_t>(position);
  for (std::uint8_t& byte : block) {
    const unsigned b = byte;
    if (b < 249) byte = static_cast<std::uint8_t>(b * b % 249 * b % 249);
  }
  file.set_bytes("Exif.Sony1.0x9402", block);
  file.set("Exif.Photo.FocalLengthIn35mmFilm", "30");
  return file;
}

TEST(SonyNote, TheFocusPositionIsADistanceOfRoughTrustOnTheEMount) {
  const auto distance = with_focus_position("ILCE-6300", 128).read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_NEAR(distance->value.value_m, (8 + 1) * 0.030, 1e-9);  // 2^(128/16 - 5) = 8
  const auto infinite = with_focus_position("ILCE-6300", 255).read().capture.focus_distance;
  ASSERT_TRUE(infinite);
  EXPECT_TRUE(std::isinf(infinite->value.value_m));
  EXPECT_FALSE(with_focus_position("ILCE-6300", 15).read().capture.focus_distance);
  EXPECT_FALSE(with_focus_position("SLT-A77", 128).read().capture.focus_distance);
}

TEST(SonyNote, StabiliserAndSequenceAreRead) {
  ExifFile file = file_of("SONY", "ILCE-6300");
  file.set("Exif.Sony1.ImageStabilization", Exiv2::unsignedLong, "0");
  file.set("Exif.Sony1.SequenceNumber", Exiv2::unsignedShort, "12");
  EXPECT_FALSE(file.read().capture.stabiliser_on.value().value);
  EXPECT_EQ(file.read().capture.sequence.value().value, 12);
  file.set("Exif.Sony1.SequenceNumber", Exiv2::unsignedShort, "65535");
  EXPECT_FALSE(file.read().capture.sequence);
}

// ---- Fujifilm -------------------------------------------------------------------------------------------------------

TEST(FujifilmNote, TheFocusPixelIsAPointInRecordedPixels) {
  ExifFile file = file_of("FUJIFILM", "X-T2");
  file.set("Exif.Fujifilm.0x1023", Exiv2::unsignedShort, "1500 3000");
  const auto areas = file.read().capture.focus_areas;
  ASSERT_EQ(areas.size(), 1U);
  EXPECT_DOUBLE_EQ(areas.front().box.x, 0.25);
  EXPECT_DOUBLE_EQ(areas.front().box.y, 0.75);
  file.set("Exif.Fujifilm.0x1023", Exiv2::unsignedShort, "6001 3000");
  EXPECT_TRUE(file.read().capture.focus_areas.empty());
}

TEST(FujifilmNote, ModeStabiliserSequenceAndSerialAreRead) {
  ExifFile file = file_of("FUJIFILM", "X-T2");
  file.set("Exif.Fujifilm.0x102d", Exiv2::unsignedLong, "274").set("Exif.Fujifilm.FocusMode", "1");  // 0x112
  file.set("Exif.Fujifilm.0x1422", Exiv2::unsignedShort, "2 0 0");
  file.set("Exif.Fujifilm.SequenceNumber", "3").set("Exif.Fujifilm.SerialNumber", "FC  A3115393  ");
  const Capture capture = file.read().capture;
  EXPECT_EQ(capture.focus_mode.value().value, FocusMode::continuous);
  EXPECT_FALSE(capture.stabiliser_on.value().value);
  EXPECT_EQ(capture.sequence.value().value, 3);
  EXPECT_EQ(capture.body_serial.value().value, "FC  A3115393");
}

// ---- Panasonic ------------------------------------------------------------------------------------------------------

TEST(PanasonicNote, ThePointIsAFractionAndALargeNumberNone) {
  ExifFile file = file_of("Panasonic", "DMC-G9");
  file.set("Exif.Panasonic.AFPointPosition", Exiv2::unsignedRational, "64/256 192/256");
  const auto areas = file.read().capture.focus_areas;
  ASSERT_EQ(areas.size(), 1U);
  EXPECT_DOUBLE_EQ(areas.front().box.x, 0.25);
  EXPECT_DOUBLE_EQ(areas.front().box.y, 0.75);
  file.set("Exif.Panasonic.AFPointPosition", Exiv2::unsignedRational, "16777216/1 16777216/1");
  EXPECT_TRUE(file.read().capture.focus_areas.empty());
}

TEST(PanasonicNote, ANoteThatAnEditorMovedIsNotBelieved) {
  ExifFile file = file_of("Panasonic", "DMC-G9");
  file.set("Exif.Panasonic.AFPointPosition", Exiv2::unsignedRational, "64/256 192/256");
  file.set("Exif.Panasonic.LensType", Exiv2::asciiString, "LUMIX G 20/F1.7");
  // The note as it stands, in a file that has more in front of it: the offsets in it point to other places.
  Exiv2::Blob tiff;
  Exiv2::ExifParser::encode(tiff, Exiv2::littleEndian, file.exif);
  Exiv2::ExifData decoded;
  Exiv2::ExifParser::decode(decoded, tiff.data(), static_cast<std::uint32_t>(tiff.size()));
  const auto note = decoded.findKey(Exiv2::ExifKey("Exif.Photo.MakerNote"));
  ASSERT_NE(note, decoded.end());
  std::vector<std::uint8_t> bytes(static_cast<std::size_t>(note->size()));
  note->copy(bytes.data(), Exiv2::littleEndian);

  ExifFile moved = file_of("Panasonic", "DMC-G9");
  moved.set("Exif.Image.Software", std::string(200, 'x'));
  moved.set_bytes("Exif.Photo.MakerNote", bytes);
  const CaptureReading reading = moved.read();
  EXPECT_TRUE(has_remark(reading, kMakerNoteUnusable));
  EXPECT_TRUE(reading.capture.focus_areas.empty());
  EXPECT_FALSE(reading.capture.lens);
}

TEST(PanasonicNote, ModeStabiliserSequenceAndLensAreRead) {
  ExifFile file = file_of("Panasonic", "DMC-G9");
  file.set("Exif.Panasonic.FocusMode", Exiv2::unsignedShort, "6");
  file.set("Exif.Panasonic.ImageStabilization", Exiv2::unsignedShort, "3");
  file.set("Exif.Panasonic.SequenceNumber", Exiv2::unsignedLong, "4");
  file.set("Exif.Panasonic.LensType", Exiv2::asciiString, "LUMIX G 20/F1.7");
  file.set("Exif.Panasonic.LensSerialNumber", Exiv2::asciiString, "09JG1201234");
  const Capture capture = file.read().capture;
  EXPECT_EQ(capture.focus_mode.value().value, FocusMode::single);
  EXPECT_FALSE(capture.stabiliser_on.value().value);
  EXPECT_EQ(capture.sequence.value().value, 4);
  EXPECT_EQ(capture.lens.value().value, "LUMIX G 20/F1.7");
  EXPECT_EQ(capture.lens_serial.value().value, "09JG1201234");
}

// ---- Pentax, Minolta, Casio -----------------------------------------------------------------------------------------

TEST(PentaxNote, FocusModeAndStabiliserAreRead) {
  ExifFile file = file_of("PENTAX", "K-5");
  file.set("Exif.Pentax.Focus", Exiv2::unsignedShort, "3");
  file.set_bytes("Exif.Pentax.ShakeReduction", {0, 1, 0, 0});
  EXPECT_EQ(file.read().capture.focus_mode.value().value, FocusMode::manual);
  EXPECT_TRUE(file.read().capture.stabiliser_on.value().value);
  file.set("Exif.Pentax.Focus", Exiv2::unsignedShort, "18");
  EXPECT_FALSE(file.read().capture.focus_mode);
}

TEST(MinoltaNote, TheDistanceIsInMillimetresAndZeroIsInfinity) {
  ExifFile file = file_of("Minolta Co., Ltd.", "DiMAGE 7Hi");
  file.set("Exif.MinoltaCsNew.FocusDistance", Exiv2::unsignedLong, "7000");
  EXPECT_DOUBLE_EQ(file.read().capture.focus_distance.value().value.value_m, 7);
  file.set("Exif.MinoltaCsNew.FocusDistance", Exiv2::unsignedLong, "0");
  EXPECT_TRUE(std::isinf(file.read().capture.focus_distance.value().value.value_m));
}

TEST(CasioNote, TheDistanceIsInMillimetresAndALargeNumberNone) {
  ExifFile file = file_of("CASIO COMPUTER CO.,LTD.", "EX-Z1050");
  file.set("Exif.Casio2.ObjectDistance", Exiv2::unsignedLong, "1790");
  EXPECT_DOUBLE_EQ(file.read().capture.focus_distance.value().value.value_m, 1.79);
  file.set("Exif.Casio2.ObjectDistance", Exiv2::unsignedLong, "536870912");
  EXPECT_FALSE(file.read().capture.focus_distance);
}

TEST(MakerNotes, ARoughDistanceGivesWayToTheOneInExif) {
  ExifFile file = file_of("Minolta Co., Ltd.", "DiMAGE 7Hi");
  file.set("Exif.MinoltaCsNew.FocusDistance", Exiv2::unsignedLong, "7000").set("Exif.Photo.SubjectDistance", "65/10");
  EXPECT_DOUBLE_EQ(file.read().capture.focus_distance.value().value.value_m, 6.5);
  ExifFile good = with_olympus_distance(7000, 1);
  good.set("Exif.Photo.SubjectDistance", "65/10");
  EXPECT_DOUBLE_EQ(good.read().capture.focus_distance.value().value.value_m, 7);
}

// ---- Apple ----------------------------------------------------------------------------------------------------------

// "Apple iOS", version 1, "MM", one entry: tag 0x000c, two signed rationals at offset 32.
std::vector<std::uint8_t> apple_note(int a_mm, int b_mm) {
  std::vector<std::uint8_t> note = {'A', 'p', 'p', 'l', 'e', ' ', 'i', 'O', 'S', 0, 0, 1, 'M', 'M'};
  const auto two = [&](unsigned v) {
    note.push_back(static_cast<std::uint8_t>(v >> 8));
    note.push_back(static_cast<std::uint8_t>(v));
  };
  const auto four = [&](unsigned v) { two(v >> 16), two(v & 0xFFFF); };
  two(1);
  two(0x000c), two(10), four(2), four(32);
  four(0);
  four(static_cast<unsigned>(a_mm)), four(1000), four(static_cast<unsigned>(b_mm)), four(1000);
  return note;
}

TEST(AppleNote, TheRangeInFocusIsSorted) {
  ExifFile file = file_of("Apple", "iPhone 12");
  file.set_bytes("Exif.Photo.MakerNote", apple_note(542, 345));
  const auto distance = file.read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.low_m, 0.345);
  EXPECT_DOUBLE_EQ(distance->value.high_m, 0.542);
  EXPECT_EQ(distance->source, Source::maker_note);
}

TEST(AppleNote, ANoteThatEndsTooSoonOrGivesNoDistanceIsNone) {
  auto cut = apple_note(542, 345);
  for (std::size_t size = 9; size < cut.size(); ++size) {
    ExifFile file = file_of("Apple", "iPhone 12");
    file.set_bytes("Exif.Photo.MakerNote", {cut.begin(), cut.begin() + static_cast<long>(size)});
    EXPECT_FALSE(file.read().capture.focus_distance) << size;
  }
  ExifFile file = file_of("Apple", "iPhone 12");
  file.set_bytes("Exif.Photo.MakerNote", apple_note(-1, 0));
  EXPECT_FALSE(file.read().capture.focus_distance);
}

}  // namespace
}  // namespace focusfall
