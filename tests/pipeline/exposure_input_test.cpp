#include "src/pipeline/exposure_input.h"

#include <gtest/gtest.h>

#include "src/pipeline/clock.h"
#include "src/pipeline/picture_sink.h"
#include "tests/render/exposure_shoot.h"

namespace focusfall {
namespace {

// Counts by libjpeg's own conversion to RGB. Without subsampled chroma there is no interpolation in which the two
// could differ, so the counts must be equal, not near.
TEST(ExposureInput, ClippedFractionsEqualACountOverThePictureThatLibjpegMakes) {
  render::ShootSpec spec;
  spec.key = 21;
  spec.frames = 3;
  spec.bright_ev = 1.5;
  for (const render::ShootFrame& frame : render::render_shoot(spec).frames) {
    PictureSink sink;
    sink.set_aim({0.25, 0.25, 0.5, 0.5});
    DecodeWorkspace workspace;
    const auto& jpeg = frame.picture.jpeg;
    ASSERT_TRUE(decode_picture(std::as_bytes(std::span(jpeg)), sink, workspace));
    int red = 0, green = 0, blue = 0, any = 0, aim_any = 0, shadows = 0;
    const cv::Mat& rgb = frame.picture.rgb;
    for (int y = 0; y < rgb.rows; ++y) {
      for (int x = 0; x < rgb.cols; ++x) {
        const auto p = rgb.at<cv::Vec3b>(y, x);
        const bool clipped = p[0] == 255 || p[1] == 255 || p[2] == 255;
        red += p[0] == 255, green += p[1] == 255, blue += p[2] == 255, any += clipped;
        shadows += p == cv::Vec3b(0, 0, 0);
        const bool in_aim = x >= rgb.cols / 4 && x < 3 * rgb.cols / 4 && y >= rgb.rows / 4 && y < 3 * rgb.rows / 4;
        aim_any += clipped && in_aim;
      }
    }
    const double pixels = static_cast<double>(rgb.total());
    const Clipping found = sink.clipping();
    EXPECT_GT(any, 0);
    EXPECT_EQ(found.red, red / pixels);
    EXPECT_EQ(found.green, green / pixels);
    EXPECT_EQ(found.blue, blue / pixels);
    EXPECT_EQ(found.any, any / pixels);
    EXPECT_EQ(found.aim_any, aim_any / (pixels / 4));
    EXPECT_EQ(found.shadows_any, shadows / pixels);

    // The clipping level of the table of highlights is the same count, of all pixels: the picture is small.
    EXPECT_FLOAT_EQ(sink.highlights()->frame_share_above[0], static_cast<float>(any / pixels));

    const LevelGrid grid = sink.levels();
    EXPECT_EQ(grid.clipped.size(), grid.mean_linear.size());
    EXPECT_EQ(grid.rows * grid.columns, static_cast<int>(grid.mean_linear.size()));
  }
}

TEST(ExposureInput, FrameThatCouldNotBeDoneSaysNothing) {
  FrameRecord record;
  record.capture = Capture{};
  record.capture->f_number = {4, Source::exif};
  EXPECT_FALSE(exposure_frame(record).f_number);
  record.done = true;
  EXPECT_EQ(exposure_frame(record).f_number, 4);
  EXPECT_FALSE(exposure_frame(record).manual_exposure);
  record.capture->exposure_mode = {ExposureMode::bracket, Source::exif};
  EXPECT_EQ(exposure_frame(record).manual_exposure, false);
}

TEST(ExposureInput, GroupsTellBodiesAndPicturesApart) {
  FrameRecord one;
  one.capture = Capture{};
  one.done = true;
  one.capture->body_serial = {"1001", Source::exif};
  one.capture->width_px = 600;
  FrameRecord other = one;
  EXPECT_EQ(exposure_frame(one).group, exposure_frame(other).group);
  other.capture->width_px = 300;
  EXPECT_NE(exposure_frame(one).group, exposure_frame(other).group);
  other = one;
  other.capture->body_serial = {"1002", Source::exif};
  EXPECT_NE(exposure_frame(one).group, exposure_frame(other).group);
}

TEST(ExposureInput, FirmwareIsNoEditor) {
  Capture capture;
  EXPECT_FALSE(may_be_edited(capture));
  capture.camera = {"INVENTED One", Source::exif};
  for (const char* firmware : {"Ver.1.10", "1.0.2", "Invented One Ver 2", "Firmware Version 1.3", "V2.00"}) {
    capture.software = {firmware, Source::exif};
    EXPECT_FALSE(may_be_edited(capture)) << firmware;
  }
  capture.software = {"Some Darkroom 4.1", Source::exif};
  EXPECT_TRUE(may_be_edited(capture));
}

TEST(Clock, TimesOfOneCameraCompare) {
  const double at = *seconds_of_time("2026-06-14T11:00:00");
  EXPECT_NEAR(*seconds_of_time("2026-06-14T11:00:01.25") - at, 1.25, 1e-6);
  EXPECT_NEAR(*seconds_of_time("2026-06-15T11:00:00") - at, 86400, 1e-6);
  EXPECT_NEAR(*seconds_of_time("2026-06-14T13:00:00+02:00"), *seconds_of_time("2026-06-14T11:00:00Z"), 1e-6);
  EXPECT_NEAR(*seconds_of_time("1970-01-01T00:00:10Z"), 10, 1e-9);
  for (const char* wrong : {"", "2026", "2026-13-01T00:00:00", "2026-06-14T25:00:00", "2026-06-14T11:00:xx",
                            "2026-06-14T11:00:61.5"}) {
    EXPECT_FALSE(seconds_of_time(wrong)) << wrong;
  }
}

}  // namespace
}  // namespace focusfall
