#include "analysis/measure/measure_frame.h"

#include <gtest/gtest.h>

#include "tests/render/tile.h"

namespace focusfall {
namespace {

cv::Mat rendered(render::Texture texture, double disc_px, int size, std::uint64_t key) {
  render::TileSpec spec;
  spec.size_px = size;
  spec.texture = texture;
  spec.blur.disc_px = disc_px;
  spec.camera.iso_speed = 400;
  spec.camera.jpeg_quality = 92;
  spec.random_key = key;
  return render::render_tile(spec).luma;
}

// Four quarters of one frame: blur 2, 6, 12 and 20 px, the sharpest at the lower left.
LumaPicture quarters() {
  cv::Mat frame(1024, 1024, CV_8UC1);
  rendered(render::Texture::dead_leaves, 12, 512, 1).copyTo(frame(cv::Rect(0, 0, 512, 512)));
  rendered(render::Texture::dead_leaves, 6, 512, 2).copyTo(frame(cv::Rect(512, 0, 512, 512)));
  rendered(render::Texture::dead_leaves, 2, 512, 3).copyTo(frame(cv::Rect(0, 512, 512, 512)));
  rendered(render::Texture::dead_leaves, 20, 512, 4).copyTo(frame(cv::Rect(512, 512, 512, 512)));
  return {frame, srgb_linear_of_code(256)};
}

MeasureRequest at(double x, double y, double size = 0.25) {
  MeasureRequest request;
  request.aim.box = {x, y, size, size};
  return request;
}

TEST(MeasureFrame, ReadsEachQuarterAtItsOwnBlur) {
  const LumaPicture picture = quarters();
  FrameMeasurer measurer;
  for (const auto& [x, y, c] : {std::tuple{0.12, 0.12, 12.0}, {0.62, 0.12, 6.0}, {0.12, 0.62, 2.0}, {0.62, 0.62, 20.0}}) {
    const auto estimate = measurer.measure(picture, at(x, y)).aim_blur.estimate;
    ASSERT_TRUE(estimate);
    EXPECT_NEAR(blur_disc_px(estimate->squared_disc_px2), c, 0.08 * c + 0.2);
  }
}

TEST(MeasureFrame, FindsTheSharpestRegion) {
  const LumaPicture picture = quarters();
  FrameMeasurer measurer;
  const Measurement measurement = measurer.measure(picture, at(0.62, 0.12));
  ASSERT_TRUE(measurement.best);
  EXPECT_LT(measurement.best->box.x + measurement.best->box.width, 0.55);
  EXPECT_GT(measurement.best->box.y, 0.45);
  EXPECT_NEAR(blur_disc_px(measurement.best->reading.estimate->squared_disc_px2), 2, 0.4);
}

TEST(MeasureFrame, TilesFollowTheBlurOfTheirPlace) {
  const LumaPicture picture = quarters();
  FrameMeasurer measurer;
  const Measurement measurement = measurer.measure(picture, at(0.4, 0.4));
  ASSERT_TRUE(measurement.tiles);
  const TileMap& tiles = *measurement.tiles;
  EXPECT_EQ(tiles.columns * tiles.tile_px, 1024);
  std::vector<double> sharp, soft;
  for (int row = 1; row < tiles.rows / 2 - 1; ++row) {
    for (int column = 1; column < tiles.columns / 2 - 1; ++column) {
      const auto upper = tiles.squared_disc_px2[static_cast<std::size_t>(row * tiles.columns + column)];
      const auto lower = tiles.squared_disc_px2[static_cast<std::size_t>((row + tiles.rows / 2) * tiles.columns + column)];
      if (upper) soft.push_back(blur_disc_px(*upper));
      if (lower) sharp.push_back(blur_disc_px(*lower));
    }
  }
  ASSERT_GT(sharp.size(), 15U);
  ASSERT_GT(soft.size(), 5U);
  std::sort(sharp.begin(), sharp.end());
  std::sort(soft.begin(), soft.end());
  EXPECT_NEAR(sharp[sharp.size() / 2], 2, 0.4);
  // A tile of 64 px holds five blurs of 12 px: its edges crowd, and the map reads up to a quarter low there.
  EXPECT_NEAR(soft[soft.size() / 2], 12, 3);
}

TEST(MeasureFrame, TheAimAloneReadsAsInTheWholeFrame) {
  const LumaPicture picture = quarters();
  FrameMeasurer measurer;
  MeasureRequest request = at(0.6, 0.15);
  const auto whole = measurer.measure(picture, request).aim_blur.estimate;
  request.whole_frame = false;
  const auto alone = measurer.measure(picture, request).aim_blur.estimate;
  ASSERT_TRUE(whole && alone);
  EXPECT_NEAR(alone->squared_disc_px2, whole->squared_disc_px2, 1e-3 * whole->squared_disc_px2);
}

TEST(MeasureFrame, IsTheSameTwiceAndAfterAnotherFrame) {
  const LumaPicture picture = quarters();
  const LumaPicture other{rendered(render::Texture::gravel, 4, 700, 8), srgb_linear_of_code(256)};
  FrameMeasurer measurer;
  const Measurement first = measurer.measure(picture, at(0.12, 0.62));
  (void)measurer.measure(other, at(0.2, 0.2));
  const Measurement second = measurer.measure(picture, at(0.12, 0.62));
  ASSERT_TRUE(first.aim_blur.estimate && second.aim_blur.estimate);
  EXPECT_EQ(first.aim_blur.estimate->squared_disc_px2, second.aim_blur.estimate->squared_disc_px2);
  EXPECT_EQ(first.tiles->squared_disc_px2, second.tiles->squared_disc_px2);
}

TEST(MeasureFrame, AnAimOverTwoBlursIsMixedAndJudgedByTheSharperKeepingTheSofter) {
  // Left half of the aim at 2 px, right half softer: a part of the same subject, then a background. Nearer
  // to each other, 6 px beside 2 px, they are not told apart.
  for (const double softer : {8.0, 14.0}) {
    cv::Mat frame = rendered(render::Texture::dead_leaves, softer, 768, 5);
    rendered(render::Texture::dead_leaves, 2, 768, 6)(cv::Rect(0, 0, 384, 768)).copyTo(frame(cv::Rect(0, 0, 384, 768)));
    const LumaPicture picture{frame, srgb_linear_of_code(256)};
    FrameMeasurer measurer;
    const Measurement measurement = measurer.measure(picture, at(0.3, 0.3, 0.4));
    EXPECT_TRUE(measurement.aim.mixed) << softer;
    ASSERT_TRUE(measurement.aim_blur.estimate) << softer;
    EXPECT_NEAR(blur_disc_px(measurement.aim_blur.estimate->squared_disc_px2), 2, 0.4);
    // The other half keeps its own value, within the scatter that one region has (as above).
    ASSERT_TRUE(measurement.aim_softer_part) << softer;
    EXPECT_NEAR(blur_disc_px(measurement.aim_softer_part->squared_disc_px2), softer, 0.08 * softer + 0.2);
  }
}

TEST(MeasureFrame, OneBlurIsNotCalledMixed) {
  FrameMeasurer measurer;
  for (const double c : {2.0, 8.0, 20.0}) {
    for (std::uint64_t key = 0; key < 4; ++key) {
      const LumaPicture picture{rendered(render::Texture::mixed, c, 400, 60 + key), srgb_linear_of_code(256)};
      const Measurement measurement = measurer.measure(picture, at(0.2, 0.2, 0.6));
      EXPECT_FALSE(measurement.aim.mixed) << c << ' ' << key;
      EXPECT_FALSE(measurement.aim_softer_part) << c << ' ' << key;
    }
  }
}

TEST(MeasureFrame, TinyAndEmptyPicturesGiveNoEvidenceAndDoNotFail) {
  FrameMeasurer measurer;
  for (const cv::Size size : {cv::Size(1, 1), cv::Size(17, 9), cv::Size(300, 5), cv::Size(40, 500)}) {
    const LumaPicture picture{cv::Mat(size, CV_8UC1, cv::Scalar(90)), srgb_linear_of_code(256)};
    const Measurement measurement = measurer.measure(picture, at(0, 0, 1));
    EXPECT_FALSE(measurement.aim_blur.estimate);
    EXPECT_FALSE(measurement.best);
  }
}

}  // namespace
}  // namespace focusfall
