// Nikon notes: Exiv2 encrypts the lens data with the serial number and the shutter count as the bodies do.
#include <gtest/gtest.h>

#include <cmath>

#include "tests/metadata/exif_file.h"

namespace focusfall {
namespace {

ExifFile nikon_file() {
  ExifFile file;
  file.set("Exif.Image.Make", "NIKON CORPORATION").set("Exif.Image.Model", "NIKON D90");
  file.set("Exif.Photo.PixelXDimension", "4288").set("Exif.Photo.PixelYDimension", "2848");
  file.set("Exif.Photo.FocalLength", "24/1");
  file.set("Exif.Nikon3.Version", "48 50 49 48").set("Exif.Nikon3.SerialNumber", "2188172");
  file.set("Exif.Nikon3.ShutterCount", Exiv2::unsignedLong, "4044");
  file.decoded = {4288, 2848};
  return file;
}

ExifFile with_distance(int code) {
  ExifFile file = nikon_file();
  file.set("Exif.NikonLd3.Version", "48 50 48 52").set("Exif.NikonLd3.FocalLength", "55");
  file.set("Exif.NikonLd3.LensIDNumber", "54").set("Exif.NikonLd3.FocusDistance", std::to_string(code));
  return file;
}

TEST(NikonNote, TheFocusDistanceComesInStepsOfSixPercent) {
  const auto distance = with_distance(68).read().capture.focus_distance;  // a real frame of a D90: 0.50 m
  ASSERT_TRUE(distance);
  EXPECT_NEAR(distance->value.value_m, 0.5012, 0.0001);
  // The interval reaches half way to the neighbouring steps.
  EXPECT_LT(distance->value.low_m, 0.01 * std::pow(10, 67.5 / 40) + 1e-3);
  EXPECT_GT(distance->value.high_m, 0.01 * std::pow(10, 68.5 / 40) - 1e-3);
}

TEST(NikonNote, ZeroIsInfinity) {
  const auto distance = with_distance(0).read().capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_TRUE(std::isinf(distance->value.value_m) && std::isfinite(distance->value.low_m));
  EXPECT_GT(distance->value.low_m, 1);
}

TEST(NikonNote, LensDataThatDoNotDecryptToTheFocalLengthAreNotBelieved) {
  ExifFile file = with_distance(68);
  file.exif["Exif.Photo.FocalLength"] = "60/1";
  EXPECT_FALSE(file.read().capture.focus_distance);
}

TEST(NikonNote, TheLensNumberNamesTheLensWhereTheLensDataAreReadable) {
  // The bytes of a D90 frame with a 24 mm f/2.8.
  ExifFile file = with_distance(68);
  file.set("Exif.NikonLd3.LensFStops", "72").set("Exif.NikonLd3.MinFocalLength", "55");
  file.set("Exif.NikonLd3.MaxFocalLength", "55").set("Exif.NikonLd3.MaxApertureAtMinFocal", "36");
  file.set("Exif.NikonLd3.MaxApertureAtMaxFocal", "36").set("Exif.NikonLd3.MCUVersion", "52");
  file.set("Exif.NikonLd3.EffectiveMaxAperture", "36").set("Exif.Nikon3.LensType", "2");
  EXPECT_EQ(file.read().capture.lens.value().value, "Nikon AF Nikkor 24mm f/2.8D");
  file.exif["Exif.Photo.FocalLength"] = "60/1";
  EXPECT_FALSE(file.read().capture.lens);
}

// Lens data of the newest mount: 0x35 native lens, 0x3c focal length, 0x4c, 0x4e the fine distance.
ExifFile with_fine_distance(int range_width, int fraction, int steps, int mount = 1) {
  ExifFile file = nikon_file();
  file.set("Exif.Image.Model", "NIKON Z 6");
  const auto byte = [&](std::uint16_t tag, int value) {
    Exiv2::DataValue data(Exiv2::unsignedByte);
    data.read(std::to_string(value));
    file.exif.add(Exiv2::ExifKey(tag, "NikonLd4"), &data);
  };
  file.set("Exif.NikonLd4.Version", "48 56 48 48");
  byte(0x35, mount);
  Exiv2::UShortValue focal_length;
  focal_length.value_.push_back(24);
  file.exif.add(Exiv2::ExifKey(0x3c, "NikonLd4"), &focal_length);
  byte(0x4c, range_width);
  byte(0x4e, fraction);
  byte(0x4f, steps);
  byte(0x58, 0);
  return file;
}

TEST(NikonNote, LensesOfTheNewMountGiveFinerSteps) {
  for (const auto order : {Exiv2::littleEndian, Exiv2::bigEndian}) {
    const auto distance = with_fine_distance(4, 128, 80).read(order).capture.focus_distance;
    ASSERT_TRUE(distance) << order;
    EXPECT_NEAR(distance->value.value_m, 0.01 * std::pow(10, 80.5 / 40), 1e-9) << order;
  }
  const auto infinite = with_fine_distance(0, 128, 80).read().capture.focus_distance;
  ASSERT_TRUE(infinite);
  EXPECT_TRUE(std::isinf(infinite->value.value_m));
  EXPECT_FALSE(with_fine_distance(4, 128, 80, 0).read().capture.focus_distance);  // adapted lens
}

// The AF structure byte by byte: version, kind of detection, then the sizes at the offset of the version.
std::vector<std::uint8_t> af_structure(const char* version, int detection, std::size_t offset, std::size_t size) {
  std::vector<std::uint8_t> bytes(size, 0);
  for (std::size_t i = 0; i < 4; ++i) bytes[i] = static_cast<std::uint8_t>(version[i]);
  bytes[4] = static_cast<std::uint8_t>(detection);
  const int values[] = {4000, 3000, 1000, 600, 400, 300};  // W, H, centre x, centre y, w, h
  for (std::size_t i = 0; i < 6; ++i) {
    bytes[offset + 2 * i] = static_cast<std::uint8_t>(values[i] & 0xFF);
    bytes[offset + 2 * i + 1] = static_cast<std::uint8_t>(values[i] >> 8);
  }
  return bytes;
}

TEST(NikonNote, TheAreaOfContrastDetectionIsFoundInEveryVersion) {
  const struct {
    const char* version;
    int detection;
    std::size_t offset;
    std::size_t size;
    bool expected;
  } cases[] = {
      {"0100", 1, 0x10, 0x1e, true}, {"0100", 0, 0x10, 0x1e, false}, {"0101", 1, 0x46, 0x54, true},
      {"0300", 2, 0x2a, 0x54, true}, {"0300", 1, 0x2a, 0x54, false}, {"0301", 1, 0x2a, 0x54, true},
      {"0400", 0, 0x3e, 0x54, true},
  };
  for (const auto& c : cases) {
    ExifFile file = nikon_file();
    file.set_bytes("Exif.Nikon3.0x00b7", af_structure(c.version, c.detection, c.offset, c.size));
    const auto areas = file.read().capture.focus_areas;
    ASSERT_EQ(areas.size(), c.expected ? 1U : 0U) << c.version << " " << c.detection;
    if (!c.expected) continue;
    EXPECT_DOUBLE_EQ(areas.front().box.x, 0.2) << c.version;
    EXPECT_DOUBLE_EQ(areas.front().box.y, 0.15) << c.version;
    EXPECT_DOUBLE_EQ(areas.front().box.width, 0.1) << c.version;
    EXPECT_DOUBLE_EQ(areas.front().box.height, 0.1) << c.version;
  }
}

TEST(NikonNote, TheAreaIsReadInTheByteOrderOfTheNote) {
  auto bytes = af_structure("0100", 1, 0x10, 0x1e);
  for (std::size_t i = 0x10; i + 1 < bytes.size(); i += 2) std::swap(bytes[i], bytes[i + 1]);
  ExifFile file = nikon_file();
  file.set_bytes("Exif.Nikon3.0x00b7", bytes);
  const auto areas = file.read(Exiv2::bigEndian).capture.focus_areas;
  ASSERT_EQ(areas.size(), 1U);
  EXPECT_DOUBLE_EQ(areas.front().box.x, 0.2);
  EXPECT_DOUBLE_EQ(areas.front().box.height, 0.1);
}

TEST(NikonNote, AnUnknownPlaceIsNoArea) {
  auto bytes = af_structure("0100", 1, 0x10, 0x1e);
  for (std::size_t i = 0x14; i < 0x1e; ++i) bytes[i] = 0;
  EXPECT_TRUE(nikon_file().set_bytes("Exif.Nikon3.0x00b7", bytes).read().capture.focus_areas.empty());
}

TEST(NikonNote, FocusModeStabiliserCounterAndLensAreRead) {
  ExifFile file = nikon_file();
  file.set("Exif.Nikon3.Focus", "AF-C  ").set("Exif.NikonVr.Version", "48 49 48 48");
  file.set("Exif.NikonVr.VibrationReduction", "2").set("Exif.Nikon3.Lens", "180/10 550/10 35/10 56/10");
  Capture capture = file.read().capture;
  EXPECT_EQ(capture.focus_mode.value().value, FocusMode::continuous);
  EXPECT_FALSE(capture.stabiliser_on.value().value);
  EXPECT_EQ(capture.sequence.value().value, 4044);
  EXPECT_EQ(capture.body_serial.value().value, "2188172");
  EXPECT_NE(capture.lens.value().value.find("18-55mm"), std::string::npos);
  file.set("Exif.NikonVr.VibrationReduction", "1").set("Exif.Nikon3.Focus", "AF-A  ");
  capture = file.read().capture;
  EXPECT_TRUE(capture.stabiliser_on.value().value);
  EXPECT_FALSE(capture.focus_mode);  // the body chose, and does not say what
}

}  // namespace
}  // namespace focusfall
