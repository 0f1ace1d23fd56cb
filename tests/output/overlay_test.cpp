#include "src/output/overlay.h"

#include <gmock/gmock.h>

#include <cstdlib>
#include <fstream>
#include <opencv2/imgproc.hpp>

#include "src/output/sheet.h"
#include "tests/output/png_reader.h"
#include "tests/output/sample_record.h"

namespace focusfall {
namespace {

constexpr int kTilePx = 256;

// Blur that grows from the bottom of the frame to the top, 24 x 16 tiles of a 6000 x 4000 frame.
TileMap sloping_tiles() {
  TileMap tiles{.rows = 16, .columns = 24, .tile_px = kTilePx, .squared_disc_px2 = {}, .sigma_px = {}, .edges = {},
                .clipped = {}};
  for (int row = 0; row < tiles.rows; ++row) {
    for (int column = 0; column < tiles.columns; ++column) {
      const auto disc = static_cast<float>(1 + (tiles.rows - row) * 1.5);
      tiles.squared_disc_px2.push_back(disc * disc);
    }
  }
  return tiles;
}

OverlayPicture plain_picture(int width, int height) {
  OverlayPicture picture;
  picture.grey = cv::Mat(height, width, CV_8UC1, cv::Scalar(128));
  for (cv::Mat& plane : picture.clipped) plane = cv::Mat::zeros(height, width, CV_8UC1);
  return picture;
}

// The drawn picture without the legend.
cv::Mat drawn(const FrameRecord& record, const OverlayPicture& picture) {
  const ReadPng png = read_png(overlay_png(record, picture));
  return png.grey(cv::Rect(0, 0, picture.grey.cols, picture.grey.rows)).clone();
}

// The plain picture is 174 when lightened; a thin line that falls between two rows of pixels darkens both to about 90.
constexpr int kInk = 110;

int black_px(const cv::Mat& grey, const cv::Rect& box) { return cv::countNonZero(grey(box) < kInk); }

// Only the aim: what is black anywhere else comes from what a test adds.
FrameRecord bare_record() {
  FrameRecord record = sample_record();
  record.measurement->best.reset();
  record.measurement->plane.reset();
  record.measurement->motion.reset();
  record.measurement->background_motion.reset();
  return record;
}

TEST(Overlay, IsAGreyPngThatSaysWhoWroteIt) {
  FrameRecord record = sample_record();
  record.measurement->tiles = sloping_tiles();
  OverlayPicture picture = plain_picture(1500, 1000);
  cv::rectangle(picture.clipped[0], {100, 100, 200, 150}, 255, cv::FILLED);
  cv::rectangle(picture.clipped[1], {100, 100, 120, 150}, 255, cv::FILLED);
  const std::string bytes = overlay_png(record, picture);
  const ReadPng png = read_png(bytes);
  EXPECT_TRUE(png.is_grey);
  EXPECT_EQ(png.texts.at("Software"), kOverlayMark);
  EXPECT_TRUE(is_marked_png(bytes.substr(0, kMarkBytes), kOverlayMark));
  EXPECT_LE(std::max(png.grey.cols, png.grey.rows), kOverlayLongSidePx);
  // For looking at: FOCUSFALL_KEEP names a file.
  if (const char* keep = std::getenv("FOCUSFALL_KEEP")) std::ofstream(keep, std::ios::binary) << bytes;
}

TEST(Overlay, IsTheSameBytesEveryTime) {
  const OverlayPicture picture = plain_picture(900, 600);
  EXPECT_EQ(overlay_png(sample_record(), picture), overlay_png(sample_record(), picture));
}

TEST(Overlay, OutlinesTheAimWhereItIsDisplayed) {
  FrameRecord record = bare_record();
  record.measurement->aim.box = {0.1, 0.2, 0.2, 0.3};
  // Stored 1200 x 800. As it is: left border of the aim at x = 120, rows 160 to 400.
  EXPECT_GT(black_px(drawn(record, plain_picture(1200, 800)), {116, 200, 8, 160}), 300);
  // Turned 90 degrees clockwise for display (Exif 6): x' = 1 - y, y' = x. The aim spans x' .5 to .8, y' .1 to .3 of
  // 800 x 1200, so that its left border is at x' = 400, rows 120 to 360.
  record.capture->orientation = {6, Source::exif};
  const cv::Mat turned = drawn(record, plain_picture(800, 1200));
  EXPECT_GT(black_px(turned, {396, 140, 8, 200}), 380);
  EXPECT_EQ(black_px(turned, {116, 200, 8, 160}), 0);
}

TEST(Overlay, DrawsTheLineOfBestFocusWhereTheSignedBlurIsZero) {
  FrameRecord record = bare_record();
  record.measurement->aim.box = {0.45, 0.1, 0.1, 0.1};
  PlaneReading plane;
  plane.y_gradient_px = 80;
  plane.offset_px = -60;    // zero at y = .75
  record.measurement->plane = plane;
  const cv::Mat grey = drawn(record, plain_picture(1200, 800));
  // A dash of 22 in 27 px over the width, 2.6 px wide: about 2500 px.
  EXPECT_GT(black_px(grey, {10, 596, 1180, 8}), 1500);
  EXPECT_EQ(black_px(grey, {10, 400, 1180, 100}), 0);
  // The limits at +-3 px of blur: y = .75 +- .0375, 570 and 630.
  EXPECT_GT(black_px(grey, {10, 567, 1180, 6}), 300);
  EXPECT_GT(black_px(grey, {10, 627, 1180, 6}), 300);
}

TEST(Overlay, HatchesWhatIsClippedAndNothingElse) {
  OverlayPicture picture = plain_picture(1200, 800);
  cv::rectangle(picture.clipped[2], cv::Rect{100, 100, 300, 200}, 255, cv::FILLED);
  const cv::Mat grey = drawn(bare_record(), picture);
  const double share = black_px(grey, {110, 110, 280, 180}) / (280.0 * 180);
  // Lines of 2 in 10 px, and a letter.
  EXPECT_GT(share, 0.15);
  EXPECT_LT(share, 0.3);
  EXPECT_EQ(black_px(grey, {700, 100, 300, 200}), 0);
}

TEST(Overlay, DrawsOneContourForEachLevelThatTheMapReaches) {
  FrameRecord record = bare_record();
  record.prediction->baseline_px2.reset();
  record.measurement->aim.box = {0.8, 0.1, 0.1, 0.1};
  record.measurement->tiles = sloping_tiles();   // 2.5 to 25 px; the acceptable blur is 3 px: 3, 6, 12, 24
  const cv::Mat grey = drawn(record, plain_picture(1200, 800));
  int lines = 0;
  bool inside = false;
  for (int y = 0; y < grey.rows; ++y) {
    const bool black = grey.at<unsigned char>(y, 700) < kInk;
    if (black && !inside) ++lines;
    inside = black;
  }
  EXPECT_EQ(lines, 1 + 4);   // and the frame's border
}

TEST(Overlay, DoesWithoutAnythingMeasuredAtTheAim) {
  FrameRecord record = bare_record();
  record.measurement->aim_blur.estimate.reset();
  record.measurement->clipping.reset();
  record.prediction.reset();
  record.capture->orientation.reset();
  EXPECT_NO_THROW(static_cast<void>(read_png(overlay_png(record, plain_picture(300, 200)))));
}

TEST(Overlay, TakesNamesThatAreNoUtf8) {
  FrameRecord record = bare_record();
  record.path = "a/\xff\x1b[31m.jpg";
  EXPECT_NO_THROW(static_cast<void>(read_png(overlay_png(record, plain_picture(300, 200)))));
}

TEST(MarkedPng, IsNotRecognisedInOtherFiles) {
  EXPECT_FALSE(is_marked_png("", kOverlayMark));
  EXPECT_FALSE(is_marked_png("\x89PNG\r\n\x1a\n", kOverlayMark));
  std::string other = Sheet(8, 8).png("Another program");
  EXPECT_FALSE(is_marked_png(other, kOverlayMark));
}

}  // namespace
}  // namespace focusfall
