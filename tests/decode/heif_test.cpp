// HEIF written by libheif: lossless where its encoder allows it, so that codes can be compared.
#include <gtest/gtest.h>
#include <libheif/heif.h>

#include "tests/decode/pictures.h"

namespace focusfall::test {
namespace {

heif_error append(heif_context*, const void* data, std::size_t size, void* target) {
  auto& file = *static_cast<Bytes*>(target);
  const auto* bytes = static_cast<const std::byte*>(data);
  file.insert(file.end(), bytes, bytes + size);
  return {heif_error_Ok, heif_suberror_Unspecified, "ok"};
}

// picture: CV_8UC3, or CV_16UC3 with codes of `bits`. Empty where this machine has no encoder.
Bytes heif_of(const cv::Mat& picture, int bits) {
  heif_context* context = heif_context_alloc();
  heif_encoder* encoder = nullptr;
  if (heif_context_get_encoder_for_format(context, heif_compression_HEVC, &encoder).code != heif_error_Ok) {
    heif_context_free(context);
    return {};
  }
  heif_encoder_set_lossy_quality(encoder, 95);
  heif_encoder_set_parameter(encoder, "chroma", "444");
  heif_image* image = nullptr;
  heif_image_create(picture.cols, picture.rows, heif_colorspace_RGB,
                    bits > 8 ? heif_chroma_interleaved_RRGGBB_LE : heif_chroma_interleaved_RGB, &image);
  heif_image_add_plane(image, heif_channel_interleaved, picture.cols, picture.rows, bits);
  int step = 0;
  std::uint8_t* plane = heif_image_get_plane(image, heif_channel_interleaved, &step);
  picture.copyTo(cv::Mat(picture.rows, picture.cols, picture.type(), plane, static_cast<std::size_t>(step)));
  heif_context_encode_image(context, image, encoder, nullptr, nullptr);
  Bytes file;
  heif_writer writer{1, append};
  heif_context_write(context, &writer, &file);
  heif_image_release(image);
  heif_encoder_release(encoder);
  heif_context_free(context);
  return file;
}

// Slopes without edges: at quality 95 a code is off by a few at most (8-bit codes; the YCbCr conversion alone costs 1).
cv::Mat slope(int type, int most) {
  cv::Mat picture(96, 128, type);
  for (int y = 0; y < picture.rows; ++y) {
    for (int x = 0; x < picture.cols; ++x) {
      const int code = (x + y) * most / 222;
      if (CV_MAT_DEPTH(type) == CV_8U) {
        picture.at<cv::Vec3b>(y, x) = cv::Vec3b::all(static_cast<std::uint8_t>(code));
      } else {
        picture.at<cv::Vec3w>(y, x) = cv::Vec3w::all(static_cast<std::uint16_t>(code));
      }
    }
  }
  return picture;
}

TEST(Heif, DeliversEightBits) {
  const cv::Mat picture = slope(CV_8UC3, 255);
  const Bytes file = heif_of(picture, 8);
  if (file.empty()) GTEST_SKIP() << "libheif has no encoder here";
  const Read read = read_picture(file);
  ASSERT_TRUE(read.result) << read.result.error().message;
  EXPECT_EQ(read.result->kind, "HEIF");
  EXPECT_EQ(read.result->bits, 8);
  EXPECT_EQ(read.result->orientation, 1);
  ASSERT_EQ(read.sink.picture.size(), picture.size());
  EXPECT_LE(cv::norm(read.sink.picture, picture, cv::NORM_INF), 4);
}

TEST(Heif, KeepsTenBits) {
  const cv::Mat picture = slope(CV_16UC3, 1023);
  const Bytes file = heif_of(picture, 10);
  if (file.empty()) GTEST_SKIP() << "libheif has no encoder here";
  const Read read = read_picture(file);
  ASSERT_TRUE(read.result) << read.result.error().message;
  ASSERT_EQ(read.result->bits, 16);
  ASSERT_EQ(read.sink.picture.type(), CV_16UC3);
  // Back to ten bits: the slope has more than 256 levels, and each is where it was, within the same 4 of 255.
  double most = 0;
  std::vector<bool> levels(1024, false);
  for (int y = 0; y < picture.rows; ++y) {
    for (int x = 0; x < picture.cols; ++x) {
      const int code = read.sink.picture.at<cv::Vec3w>(y, x)[1] >> 6;
      most = std::max(most, static_cast<double>(std::abs(code - picture.at<cv::Vec3w>(y, x)[1])));
      levels[static_cast<std::size_t>(code)] = true;
    }
  }
  EXPECT_LE(most, 16);
  EXPECT_GT(std::count(levels.begin(), levels.end(), true), 256);
}

TEST(Heif, CutShortIsOneClearError) {
  const Bytes file = heif_of(slope(CV_8UC3, 255), 8);
  if (file.empty()) GTEST_SKIP() << "libheif has no encoder here";
  for (int cut = 1; cut < 20; ++cut) {
    const Read read = read_picture(first_part(file, file.size() * static_cast<std::size_t>(cut) / 20));
    ASSERT_FALSE(read.result) << cut;
    EXPECT_EQ(read.result.error().code, "picture-truncated") << read.result.error().message;
    EXPECT_EQ(read.sink.rows, 0);
  }
}

}  // namespace
}  // namespace focusfall::test
