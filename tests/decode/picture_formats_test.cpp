// JPEG, PNG and TIFF in all varieties: what the codec libraries wrote comes out code by code, or is refused in words.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <opencv2/imgproc.hpp>

#include "tests/decode/pictures.h"

namespace focusfall::test {
namespace {

double largest_difference(const cv::Mat& a, const cv::Mat& b) { return cv::norm(a, b, cv::NORM_INF); }

void expect_same(const Bytes& file, const cv::Mat& picture, const std::string& kind) {
  const Read read = read_picture(file);
  ASSERT_TRUE(read.result) << read.result.error().message;
  EXPECT_EQ(read.result->kind, kind);
  EXPECT_EQ(read.result->width_px, picture.cols);
  EXPECT_EQ(read.result->height_px, picture.rows);
  EXPECT_EQ(read.result->channels, picture.channels());
  EXPECT_EQ(read.result->bits, picture.depth() == CV_16U ? 16 : 8);
  EXPECT_EQ(read.sink.starts, 1);
  EXPECT_TRUE(read.sink.in_order);
  ASSERT_EQ(read.sink.picture.size(), picture.size());
  ASSERT_EQ(read.sink.picture.type(), picture.type());
  EXPECT_EQ(largest_difference(read.sink.picture, picture), 0);
}

constexpr int kTypes[] = {CV_8UC1, CV_8UC3, CV_16UC1, CV_16UC3};
// One pixel, one row, one column, sizes beside whole blocks and strips.
const cv::Size kSizes[] = {{1, 1}, {67, 1}, {1, 41}, {16, 16}, {129, 97}};

TEST(Png, DeliversEveryCode) {
  for (const int type : kTypes) {
    for (const cv::Size size : kSizes) {
      const cv::Mat picture = drawn_picture(size.width, size.height, type);
      expect_same(png_of(picture), picture, "PNG");
      expect_same(png_of(picture, {.interlaced = true}), picture, "PNG");
    }
  }
}

TEST(Png, LeavesAlphaOutAndSaysSo) {
  for (const int channels : {2, 4}) {
    const cv::Mat picture = drawn_picture(50, 40, CV_8UC(channels));
    const Read read = read_picture(png_of(picture));
    ASSERT_TRUE(read.result);
    EXPECT_EQ(read.result->channels, channels - 1);
    EXPECT_TRUE(has_note(*read.result, "alpha-dropped"));
    cv::Mat colour, kept;
    cv::extractChannel(picture, colour, 0);
    cv::extractChannel(read.sink.picture, kept, 0);
    EXPECT_EQ(largest_difference(colour, kept), 0);
  }
}

TEST(Png, ExpandsThePalette) {
  const std::vector<cv::Vec3b> palette = {{255, 0, 0}, {0, 128, 7}, {9, 9, 255}};
  cv::Mat indices(30, 20, CV_8UC1);
  for (int i = 0; i < 600; ++i) indices.data[i] = static_cast<std::uint8_t>(i % 3);
  const Read read = read_picture(palette_png(indices, palette));
  ASSERT_TRUE(read.result);
  for (int x = 0; x < 20; ++x) EXPECT_EQ(read.sink.picture.at<cv::Vec3b>(1, x), palette[indices.at<std::uint8_t>(1, x)]);
}

TEST(Tiff, DeliversEveryCode) {
  for (const int type : kTypes) {
    for (const cv::Size size : kSizes) {
      const cv::Mat picture = drawn_picture(size.width, size.height, type);
      for (const int compression : {1, 5, 8, 32773}) {   // none, LZW, deflate, PackBits
        expect_same(tiff_of(picture, {.compression = compression}), picture, "TIFF");
        expect_same(tiff_of(picture, {.compression = compression, .rows_per_strip = 7}), picture, "TIFF");
        expect_same(tiff_of(picture, {.compression = compression, .tile_px = 48}), picture, "TIFF");
        if (picture.channels() == 1) continue;
        expect_same(tiff_of(picture, {.compression = compression, .planes_apart = true}), picture, "TIFF");
        expect_same(tiff_of(picture, {.compression = compression, .tile_px = 32, .planes_apart = true}), picture, "TIFF");
      }
    }
  }
}

TEST(Tiff, TurnsWhiteIsZeroRound) {
  const cv::Mat picture = drawn_picture(70, 33, CV_16UC1);
  cv::Mat turned;
  cv::bitwise_not(picture, turned);
  expect_same(tiff_of(turned, {.photometric = 0}), picture, "TIFF");
}

TEST(Tiff, ExpandsThePalette) {
  const cv::Mat indices = drawn_picture(40, 20, CV_8UC1);
  const Read read = read_picture(tiff_of(indices, {.photometric = 3}));
  ASSERT_TRUE(read.result);
  EXPECT_EQ(read.result->channels, 3);
  for (int x = 0; x < 40; ++x) {
    const int index = indices.at<std::uint8_t>(11, x);
    EXPECT_EQ(read.sink.picture.at<cv::Vec3b>(11, x), cv::Vec3b(static_cast<std::uint8_t>(index), static_cast<std::uint8_t>(255 - index), 0x42));
  }
}

TEST(Tiff, LeavesAlphaOutAndSaysSo) {
  const cv::Mat picture = drawn_picture(33, 21, CV_16UC4);
  const Read read = read_picture(tiff_of(picture));
  ASSERT_TRUE(read.result);
  EXPECT_TRUE(has_note(*read.result, "alpha-dropped"));
  cv::Mat blue, kept;
  cv::extractChannel(picture, blue, 2);
  cv::extractChannel(read.sink.picture, kept, 2);
  EXPECT_EQ(largest_difference(blue, kept), 0);
}

TEST(Tiff, RefusesFloatingPointAndInksInWords) {
  const cv::Mat floats(20, 30, CV_32FC3, cv::Scalar::all(0.5));
  const Read number = read_picture(tiff_of(floats, {.sample_format = 3}));
  ASSERT_FALSE(number.result);
  EXPECT_EQ(number.result.error().code, "picture-unsupported");
  EXPECT_THAT(number.result.error().message, testing::HasSubstr("floating point"));
  EXPECT_EQ(number.sink.starts, 0);

  const Read inks = read_picture(tiff_of(drawn_picture(20, 20, CV_8UC4), {.photometric = 5}));
  ASSERT_FALSE(inks.result);
  EXPECT_THAT(inks.result.error().message, testing::HasSubstr("CMYK"));
}

// The reference is the picture before coding. At quality 100 every quantiser is 1, so that the coefficients are off by
// at most 1/2: the code of one pixel by at most a few (64 halves that all add up would make 4, they never do).
TEST(Jpeg, DeliversLumaNearTheOriginalInEverySampling) {
  cv::Mat luma;
  for (const cv::Size size : kSizes) {
    const cv::Mat picture = drawn_picture(size.width, size.height, CV_8UC3);
    cv::cvtColor(picture, luma, cv::COLOR_RGB2GRAY);
    for (const auto& [x, y] : {std::pair{1, 1}, {2, 1}, {1, 2}, {2, 2}, {4, 1}}) {
      for (const bool progressive : {false, true}) {
        const Read read = read_picture(jpeg_of(picture, {.quality = 100, .step_x = x, .step_y = y, .progressive = progressive}));
        ASSERT_TRUE(read.result) << read.result.error().message;
        EXPECT_TRUE(read.sink.in_order);
        ASSERT_EQ(read.sink.picture.size(), picture.size());
        EXPECT_LE(largest_difference(read.sink.picture, luma), 3) << x << "x" << y;
      }
    }
  }
}

TEST(Jpeg, DeliversGrey) {
  const cv::Mat picture = drawn_picture(131, 77, CV_8UC1);
  const Read read = read_picture(jpeg_of(picture, {.quality = 100}));
  ASSERT_TRUE(read.result);
  EXPECT_EQ(read.result->channels, 1);
  EXPECT_LE(largest_difference(read.sink.picture, picture), 3);
}

TEST(Jpeg, RefusesInksInWords) {
  const Read read = read_picture(jpeg_of(drawn_picture(40, 40, CV_8UC4), {.cmyk = true}));
  ASSERT_FALSE(read.result);
  EXPECT_EQ(read.result.error().code, "picture-unsupported");
  EXPECT_THAT(read.result.error().message, testing::HasSubstr("CMYK"));
}

}  // namespace
}  // namespace focusfall::test
