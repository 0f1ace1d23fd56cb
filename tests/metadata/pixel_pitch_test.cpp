// The rules for the pixel pitch and the traps of the tags that it comes from.
#include "metadata/pixel_pitch.h"

#include <gtest/gtest.h>

#include "tests/metadata/exif_file.h"
#include "tests/metadata/note_bytes.h"

namespace focusfall {
namespace {

// A 36 mm wide sensor of 6000 x 4000 px: 6 um.
PitchEvidence full_frame() {
  PitchEvidence evidence;
  evidence.recorded = {6000, 4000};
  evidence.decoded = {6000, 4000};
  return evidence;
}

PitchEvidence with_plane(PitchEvidence evidence, Ratio resolution, int unit) {
  evidence.focal_plane_resolution = resolution;
  evidence.focal_plane_unit = unit;
  return evidence;
}

PitchEvidence with_equivalent(PitchEvidence evidence, double focal_length_mm, double equivalent_mm) {
  evidence.focal_length_mm = focal_length_mm;
  evidence.equivalent_mm = equivalent_mm;
  return evidence;
}

TEST(PixelPitch, EveryUnitOfTheFocalPlaneResolutionCounts) {
  Remarks remarks;
  const struct {
    Ratio resolution;
    int unit;
  } cases[] = {{{12'700'000, 3000}, 2}, {{5'000'000, 3000}, 3}, {{500'000, 3000}, 4}, {{500, 3000}, 5}};
  for (const auto& c : cases) {
    const auto pitch = pixel_pitch_um(with_plane(full_frame(), c.resolution, c.unit), remarks);
    ASSERT_TRUE(pitch) << c.unit;
    EXPECT_NEAR(pitch->value, 6.0, 1e-9) << c.unit;
  }
  EXPECT_TRUE(remarks.empty());
  EXPECT_FALSE(pixel_pitch_um(with_plane(full_frame(), {5'000'000, 3000}, 1), remarks));
}

TEST(PixelPitch, TheDiagonalGivesItFromTheEquivalentFocalLength) {
  Remarks remarks;
  const auto pitch = pixel_pitch_um(with_equivalent(full_frame(), 50, 50), remarks);
  ASSERT_TRUE(pitch);
  EXPECT_NEAR(pitch->value, 6.0, 0.001);
  EXPECT_NEAR(pitch->high / pitch->value, 1.04, 1e-9);
}

TEST(PixelPitch, AnAgreeingEquivalentConfirmsTheFocalPlane) {
  Remarks remarks;
  const auto alone = pixel_pitch_um(with_plane(full_frame(), {5'000'000, 3000}, 3), remarks);
  const auto confirmed =
      pixel_pitch_um(with_equivalent(with_plane(full_frame(), {5'000'000, 3000}, 3), 50, 51), remarks);
  ASSERT_TRUE(alone && confirmed);
  EXPECT_NEAR(confirmed->value, 6.0, 1e-9);
  EXPECT_LT(confirmed->high, alone->high);
}

TEST(PixelPitch, RulesThatContradictEachOtherMakeItUnknown) {
  Remarks remarks;
  EXPECT_FALSE(pixel_pitch_um(with_equivalent(with_plane(full_frame(), {5'000'000, 3000}, 3), 50, 60), remarks));
  ASSERT_EQ(remarks.size(), 1U);
  EXPECT_EQ(remarks.front().code, kPitchUnknown);
}

TEST(PixelPitch, AReducedPictureHasLargerPixels) {
  Remarks remarks;
  PitchEvidence evidence = with_plane(full_frame(), {5'000'000, 3000}, 3);
  evidence.decoded = {3000, 2000};  // also a raw file decoded at half size
  EXPECT_NEAR(pixel_pitch_um(evidence, remarks)->value, 12.0, 1e-9);
  evidence.decoded = {2000, 3000};  // turned by the decoder
  EXPECT_NEAR(pixel_pitch_um(evidence, remarks)->value, 12.0, 1e-9);
}

TEST(PixelPitch, ACroppedPictureIsUnknown) {
  Remarks remarks;
  PitchEvidence evidence = with_plane(full_frame(), {5'000'000, 3000}, 3);
  evidence.decoded = {4000, 4000};
  EXPECT_FALSE(pixel_pitch_um(evidence, remarks));
  EXPECT_EQ(remarks.size(), 1U);
}

TEST(PixelPitch, DigitalZoomMakesItUnknown) {
  Remarks remarks;
  PitchEvidence evidence = with_equivalent(full_frame(), 50, 100);
  evidence.digital_zoom = 0.0;  // "not used"
  EXPECT_NEAR(pixel_pitch_um(evidence, remarks)->value, 3.0, 0.001);
  EXPECT_TRUE(remarks.empty());
  evidence.digital_zoom = 2.0;
  EXPECT_FALSE(pixel_pitch_um(evidence, remarks));
  EXPECT_EQ(remarks.size(), 1U);
}

TEST(PixelPitch, ForUnusualShapesTheEquivalentMayMeanTheWidth) {
  Remarks remarks;
  // A phone of 2014: 4.15 mm, equivalent 39 mm for the square frame of 2448 px; its pixels are 1.5 um (maker's data
  // sheet, from memory). The diagonal alone gives 1.33 um.
  PitchEvidence evidence = with_equivalent(full_frame(), 4.15, 39);
  evidence.recorded = evidence.decoded = {2448, 2448};
  const auto pitch = pixel_pitch_um(evidence, remarks);
  ASSERT_TRUE(pitch);
  EXPECT_LT(pitch->low, 1.33);
  EXPECT_GT(pitch->high, 1.5);
}

TEST(PixelPitch, AnUnknownEquivalentIsNone) {
  Remarks remarks;
  EXPECT_FALSE(pixel_pitch_um(with_equivalent(full_frame(), 50, 0), remarks));
  EXPECT_FALSE(pixel_pitch_um(full_frame(), remarks));
  EXPECT_TRUE(remarks.empty());
}

TEST(PixelPitch, AnEosFractionBelongsToTheNativeWidth) {
  Remarks remarks;
  // EOS 5D: 4368000/1415, sensor 35.8 mm wide with 4368 px, 8.2 um (maker's data sheet, from memory).
  PitchEvidence evidence;
  evidence.recorded = evidence.decoded = {4368, 2912};
  evidence.focal_plane_resolution = Ratio{4368000, 1415};
  EXPECT_NEAR(pixel_pitch_um(evidence, remarks)->value, 8.2, 0.03 * 8.2);
  // A smaller picture of the whole sensor by the camera's own setting.
  evidence.recorded = evidence.decoded = {2184, 1456};
  evidence.reduced_by_camera = true;
  EXPECT_NEAR(pixel_pitch_um(evidence, remarks)->value, 16.4, 0.03 * 16.4);
  EXPECT_TRUE(remarks.empty());
  // The same size with the camera set to large: an editor changed it, reduced or cropped nobody knows.
  evidence.reduced_by_camera = false;
  EXPECT_FALSE(pixel_pitch_um(evidence, remarks));
  EXPECT_EQ(remarks.size(), 1U);
}

TEST(PixelPitch, CaptureDataWrittenAnewByAnotherProgramAreNotBelieved) {
  // A reduced frame of an EOS REBEL T2i: 5728 px per inch as the camera wrote, beside a width of 640 px; no maker note.
  const auto reading = [](const char* make) {
    ExifFile file;
    file.set("Exif.Image.Make", make).set("Exif.Photo.FocalLength", "36/1");
    file.set("Exif.Photo.PixelXDimension", "640").set("Exif.Photo.PixelYDimension", "427");
    file.set("Exif.Photo.FocalPlaneXResolution", "97379/17").set("Exif.Photo.FocalPlaneResolutionUnit", "2");
    file.decoded = {640, 427};
    return file.read();
  };
  EXPECT_FALSE(reading("Canon").capture.pixel_pitch_um);
  EXPECT_TRUE(has_remark(reading("Canon"), kPitchUnknown));
  EXPECT_TRUE(reading("A maker of no notes").capture.pixel_pitch_um);
}

TEST(PixelPitch, ARawFileDecodedAtHalfSizeCountsItsFullPicture) {
  // First a preview of 160 x 120, then the mosaic of 6000 x 4000, then Exif: 5000 px a mm / 3 = 6 um.
  const Bytes raw = tiff_file({longs(0x00fe, {1}), longs(0x0100, {160}), longs(0x0101, {120})},
                              {{0x014a, {longs(0x00fe, {0}), longs(0x0100, {6000}), longs(0x0101, {4000})}},
                               {0x8769, {rationals(0xa20e, 5, {5'000'000, 3000}), shorts(0xa210, {3})}}});
  const std::span bytes = std::as_bytes(std::span(raw));
  EXPECT_NEAR(read_capture(bytes, {6000, 4000}).capture.pixel_pitch_um.value().value.value, 6, 1e-9);
  EXPECT_NEAR(read_capture(bytes, {3000, 2000}).capture.pixel_pitch_um.value().value.value, 12, 1e-9);
  EXPECT_NEAR(read_capture(bytes, {1620, 1080}).capture.pixel_pitch_um.value().value.value, 6 * 6000 / 1620.0, 1e-9);
}

TEST(PixelPitch, ThePitchOfAFileIsDerivedFromItsTags) {
  ExifFile file;
  file.set("Exif.Photo.PixelXDimension", "6000").set("Exif.Photo.PixelYDimension", "4000");
  file.set("Exif.Photo.FocalPlaneXResolution", "5000000/3000").set("Exif.Photo.FocalPlaneResolutionUnit", "3");
  const auto pitch = file.read().capture.pixel_pitch_um;
  ASSERT_TRUE(pitch);
  EXPECT_NEAR(pitch->value.value, 6.0, 1e-9);
  EXPECT_EQ(pitch->source, Source::derived);
}

}  // namespace
}  // namespace focusfall
