// Files that are cut short, lie about their size or are something else: a prefix or nothing, and one clear error.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <set>
#include <utility>

#include "tests/decode/pictures.h"

namespace focusfall::test {
namespace {

constexpr int kCuts = 20;

std::vector<std::pair<std::string, Bytes>> one_of_each() {
  const cv::Mat rgb = drawn_picture(150, 130, CV_8UC3), rgb16 = drawn_picture(150, 130, CV_16UC3);
  return {{"JPEG", jpeg_of(rgb, {.step_x = 2, .step_y = 2})},
          {"progressive JPEG", jpeg_of(rgb, {.progressive = true})},
          {"PNG", png_of(rgb16)},
          {"interlaced PNG", png_of(rgb, {.interlaced = true})},
          {"TIFF", tiff_of(rgb16)},
          {"LZW TIFF", tiff_of(rgb, {.compression = 5})},
          {"tiled TIFF", tiff_of(rgb, {.compression = 8, .tile_px = 32})}};
}

TEST(Truncation, DeliversAPrefixAndOneError) {
  for (const auto& [name, file] : one_of_each()) {
    const Read whole = read_picture(file);
    ASSERT_TRUE(whole.result) << name;
    for (int cut = 0; cut < kCuts; ++cut) {
      const std::size_t size = file.size() * static_cast<std::size_t>(cut) / kCuts;
      const Read read = read_picture(first_part(file, size));
      ASSERT_FALSE(read.result) << name << " cut to " << size;
      const std::set<std::string> codes = {"file-empty", "not-a-picture", "picture-truncated", "picture-damaged"};
      EXPECT_TRUE(codes.contains(read.result.error().code)) << name << ": " << read.result.error().code;
      if (size > 100) {
        EXPECT_EQ(read.result.error().code, "picture-truncated") << name << " cut to " << size;
      }
      EXPECT_EQ(read.result.error().message.find('\n'), std::string::npos);
      EXPECT_TRUE(read.sink.in_order);
      EXPECT_LE(read.sink.starts, 1);
      ASSERT_LT(read.sink.rows, whole.sink.rows) << name;
      if (read.sink.rows == 0) continue;
      EXPECT_EQ(cv::norm(read.sink.picture, whole.sink.picture.rowRange(0, read.sink.rows), cv::NORM_INF), 0) << name;
    }
  }
}

TEST(Truncation, OfAPictureInRowsDeliversWhatIsThere) {
  // Noise is coded evenly: 3/4 of the file hold about 3/4 of its rows.
  cv::Mat rgb(160, 300, CV_8UC3);
  cv::RNG(7).fill(rgb, cv::RNG::UNIFORM, 0, 256);
  for (const Bytes& file : {jpeg_of(rgb), png_of(rgb)}) {
    EXPECT_GT(read_picture(first_part(file, file.size() * 3 / 4)).sink.rows, 80);
  }
}

void put_big_endian(Bytes& file, std::size_t offset, unsigned value, int bytes) {
  for (int i = 0; i < bytes; ++i) {
    file[offset + static_cast<std::size_t>(i)] = static_cast<std::byte>((value >> (8 * (bytes - 1 - i))) & 0xFF);
  }
}

void set_jpeg_size(Bytes& file, unsigned width, unsigned height) {
  for (std::size_t i = 2; i + 9 < file.size(); ++i) {
    if (file[i] == std::byte{0xFF} && file[i + 1] == std::byte{0xC0}) {
      put_big_endian(file, i + 5, height, 2);
      put_big_endian(file, i + 7, width, 2);
      return;
    }
  }
  FAIL() << "no frame header";
}

void set_tiff_size(Bytes& file, unsigned width, unsigned height) {
  // Little-endian; entries of 12 bytes: tag, type, count, value (TIFF 6.0, section 2).
  const auto at = [&](std::size_t i) { return std::to_integer<unsigned>(file[i]); };
  const std::size_t directory = at(4) | at(5) << 8 | at(6) << 16 | at(7) << 24;
  for (std::size_t entry = directory + 2; entry < directory + 2 + 12 * (at(directory) | at(directory + 1) << 8); entry += 12) {
    const unsigned tag = at(entry) | at(entry + 1) << 8;
    if (tag != 256 && tag != 257) continue;
    const unsigned value = tag == 256 ? width : height;
    file[entry + 2] = std::byte{4};   // LONG
    for (std::size_t i = 0; i < 4; ++i) file[entry + 8 + i] = static_cast<std::byte>((value >> (8 * i)) & 0xFF);
  }
}

TEST(DeclaredSize, TooLargeIsRefusedBeforeAnythingIsDelivered) {
  const cv::Mat rgb = drawn_picture(64, 48, CV_8UC3);
  Bytes jpeg = jpeg_of(rgb), png = png_of(rgb), tiff = tiff_of(rgb);
  set_jpeg_size(jpeg, 65000, 65000);
  put_big_endian(png, 16, 60000, 4);
  put_big_endian(png, 20, 60000, 4);
  set_tiff_size(tiff, 60000, 60000);
  for (const Bytes& file : {jpeg, png, tiff}) {
    const Read read = read_picture(file);
    ASSERT_FALSE(read.result);
    EXPECT_EQ(read.result.error().code, "picture-too-large") << read.result.error().message;
    EXPECT_EQ(read.sink.starts, 0);
    EXPECT_FALSE(picture_format(file));
  }
}

TEST(DeclaredSize, LargerThanTheFileCanHoldIsRefused) {
  const cv::Mat rgb = drawn_picture(64, 48, CV_8UC3);
  Bytes jpeg = jpeg_of(rgb), png = png_of(rgb), tiff = tiff_of(rgb);
  set_jpeg_size(jpeg, 15000, 15000);
  put_big_endian(png, 16, 15000, 4);
  put_big_endian(png, 20, 15000, 4);
  set_tiff_size(tiff, 15000, 15000);
  for (const Bytes& file : {jpeg, png, tiff}) {
    const Read read = read_picture(file);
    ASSERT_FALSE(read.result);
    EXPECT_EQ(read.result.error().code, "picture-truncated") << read.result.error().message;
    EXPECT_EQ(read.sink.starts, 0);
  }
}

TEST(DeclaredSize, ZeroIsNoPicture) {
  const cv::Mat rgb = drawn_picture(64, 48, CV_8UC3);
  Bytes jpeg = jpeg_of(rgb), png = png_of(rgb), tiff = tiff_of(rgb);
  set_jpeg_size(jpeg, 0, 48);
  put_big_endian(png, 16, 0, 4);
  set_tiff_size(tiff, 0, 48);
  for (const Bytes& file : {jpeg, png, tiff}) {
    const Read read = read_picture(file);
    ASSERT_FALSE(read.result);
    EXPECT_EQ(read.result.error().code, "picture-empty") << read.result.error().message;
  }
}

TEST(Content, DecidesAndNotTheName) {
  EXPECT_EQ(read_picture({}).result.error().code, "file-empty");
  const Bytes text(200, std::byte{'x'});
  EXPECT_EQ(read_picture(text).result.error().code, "not-a-picture");
  EXPECT_THAT(read_picture(text).result.error().message, testing::HasSubstr("78 78 78 78"));
}

}  // namespace
}  // namespace focusfall::test
