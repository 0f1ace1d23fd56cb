// Camera raw: DNGs written with libtiff whose saturated photosites are known, and real files of a folder of one's own
// (FOCUSFALL_CAMERA_FILES), against LibRaw's data read without the code under test.
#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <libraw/libraw.h>
#include <tiffio.h>

#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>

#include "analysis/measure/mosaic_clipping.h"
#include "src/decode/mosaic.h"
#include "tests/decode/pictures.h"

namespace focusfall::test {
namespace {

class CountingSink final : public MosaicSink {
 public:
  void start(const MosaicFormat& format) override { counts.start(format, {.aim = FractionBox{0, 0, 0.5, 0.5}}); }
  void take(const MosaicStrip& strip) override { counts.take(strip); }
  MosaicAccumulator counts;
};

constexpr int kWidth = 400, kHeight = 300, kBlack = 512, kWhite = 15000;

// A mosaic R G / G B of moderate codes, in which the first `saturated[c]` photosites of a colour are at white.
cv::Mat mosaic_with(const std::array<int, 3>& saturated) {
  cv::Mat codes(kHeight, kWidth, CV_16UC1);
  std::array<int, 3> seen{};
  for (int y = 0; y < kHeight; ++y) {
    for (int x = 0; x < kWidth; ++x) {
      const auto channel = static_cast<std::size_t>(y % 2 + x % 2);
      const bool full = seen[channel]++ < saturated[channel];
      codes.at<std::uint16_t>(y, x) = static_cast<std::uint16_t>(full ? kWhite : kBlack + 100 + (x * 7 + y * 13) % 9000);
    }
  }
  return codes;
}

// DNG specification 1.4: the tags a reader needs. libtiff knows all of them.
Bytes dng_of(const cv::Mat& codes, const Bytes& preview = {}) {
  const bool linear = codes.channels() == 3;
  return tiff_in_memory([&](void* handle) {
    TIFF* tiff = static_cast<TIFF*>(handle);
    const float matrix[] = {1, 0, 0, 0, 1, 0, 0, 0, 1}, neutral[] = {1, 1, 1};
    const std::uint8_t version[] = {1, 4, 0, 0}, back[] = {1, 1, 0, 0};
    const std::uint16_t repeat[] = {2, 2}, black_repeat[] = {1, 1};
    const std::uint32_t whites[] = {kWhite, kWhite, kWhite};
    const float black[] = {kBlack, kBlack, kBlack};
    const int samples = codes.channels();
    TIFFSetField(tiff, TIFFTAG_SUBFILETYPE, 0);
    TIFFSetField(tiff, TIFFTAG_IMAGEWIDTH, codes.cols);
    TIFFSetField(tiff, TIFFTAG_IMAGELENGTH, codes.rows);
    TIFFSetField(tiff, TIFFTAG_BITSPERSAMPLE, 16);
    TIFFSetField(tiff, TIFFTAG_SAMPLESPERPIXEL, samples);
    TIFFSetField(tiff, TIFFTAG_PHOTOMETRIC, linear ? 34892 : 32803);
    TIFFSetField(tiff, TIFFTAG_COMPRESSION, COMPRESSION_NONE);
    TIFFSetField(tiff, TIFFTAG_PLANARCONFIG, PLANARCONFIG_CONTIG);
    TIFFSetField(tiff, TIFFTAG_ROWSPERSTRIP, 16);
    TIFFSetField(tiff, TIFFTAG_MAKE, "Focusfall");
    TIFFSetField(tiff, TIFFTAG_MODEL, "Drawn");
    TIFFSetField(tiff, TIFFTAG_UNIQUECAMERAMODEL, "Focusfall Drawn");
    TIFFSetField(tiff, TIFFTAG_DNGVERSION, version);
    TIFFSetField(tiff, TIFFTAG_DNGBACKWARDVERSION, back);
    if (!linear) {
      TIFFSetField(tiff, TIFFTAG_CFAREPEATPATTERNDIM, repeat);
      TIFFSetField(tiff, TIFFTAG_CFAPATTERN, 4, "\0\1\1\2");
    }
    TIFFSetField(tiff, TIFFTAG_BLACKLEVELREPEATDIM, black_repeat);
    TIFFSetField(tiff, TIFFTAG_BLACKLEVEL, samples, black);
    TIFFSetField(tiff, TIFFTAG_WHITELEVEL, samples, whites);
    TIFFSetField(tiff, TIFFTAG_COLORMATRIX1, 9, matrix);
    TIFFSetField(tiff, TIFFTAG_CALIBRATIONILLUMINANT1, 21);
    TIFFSetField(tiff, TIFFTAG_ASSHOTNEUTRAL, 3, neutral);
    for (int y = 0; y < codes.rows; ++y) {
      cv::Mat row = codes.row(y).clone();
      TIFFWriteScanline(tiff, row.data, static_cast<std::uint32_t>(y), 0);
    }
    if (preview.empty()) return;
    // A second directory that holds one JPEG, as the DNG specification describes for previews.
    TIFFWriteDirectory(tiff);
    TIFFSetField(tiff, TIFFTAG_SUBFILETYPE, 1);
    TIFFSetField(tiff, TIFFTAG_IMAGEWIDTH, codes.cols);
    TIFFSetField(tiff, TIFFTAG_IMAGELENGTH, codes.rows);
    TIFFSetField(tiff, TIFFTAG_BITSPERSAMPLE, 8);
    TIFFSetField(tiff, TIFFTAG_SAMPLESPERPIXEL, 3);
    TIFFSetField(tiff, TIFFTAG_PHOTOMETRIC, PHOTOMETRIC_YCBCR);
    TIFFSetField(tiff, TIFFTAG_COMPRESSION, COMPRESSION_JPEG);
    TIFFSetField(tiff, TIFFTAG_PLANARCONFIG, PLANARCONFIG_CONTIG);
    TIFFSetField(tiff, TIFFTAG_ROWSPERSTRIP, codes.rows);
    TIFFWriteRawStrip(tiff, 0, const_cast<std::byte*>(preview.data()), static_cast<tmsize_t>(preview.size()));
  });
}

TEST(Mosaic, FractionsPerChannelAreExact) {
  constexpr int sites = kWidth * kHeight / 4;
  const std::array<std::array<int, 3>, 3> cases = {{{0, 0, 0}, {300, 1200, 10}, {sites, 2 * sites, sites}}};
  for (const auto& saturated : cases) {
    CountingSink sink;
    const auto format = decode_mosaic(dng_of(mosaic_with(saturated)), sink);
    ASSERT_TRUE(format) << format.error().message;
    EXPECT_EQ(format->width_px, kWidth);
    EXPECT_EQ(format->height_px, kHeight);
    EXPECT_EQ(format->sites[0].black, static_cast<float>(kBlack));
    EXPECT_EQ(format->sites[0].white, static_cast<float>(kWhite));
    const MosaicCounts& counts = sink.counts.counts();
    const std::array<std::int64_t, 3> all = {sites, 2 * sites, sites};
    EXPECT_EQ(counts.photosites, all);
    for (std::size_t c = 0; c < 3; ++c) EXPECT_EQ(counts.saturated[c], saturated[c]);
    EXPECT_EQ(sink.counts.clipping().red, static_cast<double>(saturated[0]) / sites);
    EXPECT_EQ(sink.counts.clipping().measured_on, ClippedOn::mosaic);
  }
}

// Cells, patches and the aim by brute force over the codes.
TEST(Mosaic, CellsAreCountedAsAnObviousLoopCountsThem) {
  cv::Mat codes = mosaic_with({0, 0, 0});
  cv::RNG random(5);
  for (int i = 0; i < 3000; ++i) codes.at<std::uint16_t>(random.uniform(0, kHeight), random.uniform(0, kWidth)) = kWhite;
  codes(cv::Rect(40, 20, 8, 6)).setTo(kWhite + 3);
  codes(cv::Rect(200, 100, 10, 10)).setTo(kBlack);
  std::int64_t any = 0, two = 0, shadows = 0, aim_two = 0;
  for (int y = 0; y < kHeight; y += 2) {
    for (int x = 0; x < kWidth; x += 2) {
      const auto full = [&](int dy, int dx) { return codes.at<std::uint16_t>(y + dy, x + dx) >= kWhite; };
      const int colours = full(0, 0) + (full(0, 1) || full(1, 0)) + full(1, 1);
      any += colours >= 1;
      two += colours >= 2;
      aim_two += colours >= 2 && y < kHeight / 2 && x < kWidth / 2;
      double most = 0;
      cv::minMaxLoc(codes(cv::Rect(x, y, 2, 2)), nullptr, &most);
      shadows += most <= kBlack;
    }
  }
  CountingSink sink;
  ASSERT_TRUE(decode_mosaic(dng_of(codes), sink));
  const MosaicCounts& counts = sink.counts.counts();
  EXPECT_EQ(counts.any, any);
  EXPECT_EQ(counts.two_or_more, two);
  EXPECT_EQ(counts.shadows, shadows);
  EXPECT_EQ(counts.aim_two_or_more, aim_two);
  EXPECT_GE(counts.largest_patch, 12);   // the 4 x 3 cells set above
}

TEST(Mosaic, OfALinearDngIsCountedPixelByPixel) {
  cv::Mat codes(kHeight, kWidth, CV_16UC3, cv::Scalar(4000, 5000, 6000));
  codes(cv::Rect(0, 0, 50, 20)).setTo(cv::Scalar(kWhite, kWhite, 700));
  codes(cv::Rect(100, 0, 10, 20)).setTo(cv::Scalar(800, 900, kWhite));
  CountingSink sink;
  const auto format = decode_mosaic(dng_of(codes), sink);
  ASSERT_TRUE(format) << format.error().message;
  EXPECT_TRUE(format->linear_rgb);
  const MosaicCounts& counts = sink.counts.counts();
  EXPECT_EQ(counts.saturated, (std::array<std::int64_t, 3>{1000, 1000, 200}));
  EXPECT_EQ(counts.any, 1200);
  EXPECT_EQ(counts.two_or_more, 1000);
  EXPECT_EQ(counts.largest_patch, 1000);
}

// The picture clips the share of photosites whose level is above a quarter: two stops of headroom. The codes step by
// one, so that the level is known to 1 / (white - black) of it: .0001 stops; .01 leaves room for equal codes.
TEST(Mosaic, HeadroomIsTheLevelWhereThePictureClips) {
  constexpr double quarter = (kWhite - kBlack) / 4.0;
  const cv::Mat codes = mosaic_with({0, 0, 0});
  std::int64_t above = 0, green = 0;
  for (int y = 0; y < kHeight; ++y) {
    for (int x = 0; x < kWidth; ++x) {
      if (y % 2 + x % 2 != 1) continue;
      ++green;
      above += codes.at<std::uint16_t>(y, x) - kBlack >= quarter;
    }
  }
  CountingSink sink;
  ASSERT_TRUE(decode_mosaic(dng_of(codes), sink));
  Clipping picture;
  EXPECT_FALSE(sink.counts.headroom_ev(picture));
  picture.green = static_cast<double>(above) / static_cast<double>(green);
  EXPECT_NEAR(sink.counts.headroom_ev(picture).value_or(-1), 2.0, 0.01);
}

TEST(Raw, IsDevelopedAtHalfSizeWithoutAPreview) {
  const Read read = read_picture(dng_of(mosaic_with({0, 0, 0})));
  ASSERT_TRUE(read.result) << read.result.error().message;
  EXPECT_EQ(read.result->measured_from, MeasuredFrom::half_size_development);
  EXPECT_EQ(read.result->width_px, kWidth / 2);
  EXPECT_EQ(read.result->height_px, kHeight / 2);
  EXPECT_EQ(read.sink.rows, kHeight / 2);
}

// A single saturated cell must not touch its neighbours.
TEST(Raw, DevelopmentSpreadsNothing) {
  cv::Mat codes(kHeight, kWidth, CV_16UC1, cv::Scalar(kBlack));
  codes(cv::Rect(100, 50, 2, 2)).setTo(kWhite);
  const Read read = read_picture(dng_of(codes));
  ASSERT_TRUE(read.result);
  EXPECT_EQ(read.sink.picture.at<cv::Vec3w>(25, 50), cv::Vec3w(65535, 65535, 65535));
  EXPECT_EQ(cv::countNonZero(read.sink.picture.reshape(1)), 3);
}

TEST(Raw, AFullSizePreviewIsMeasuredThroughTheJpegPath) {
  const Bytes preview = jpeg_of(drawn_picture(kWidth, kHeight, CV_8UC3));
  const Read read = read_picture(dng_of(mosaic_with({0, 0, 0}), preview));
  const Read alone = read_picture(preview);
  ASSERT_TRUE(read.result) << read.result.error().message;
  EXPECT_EQ(read.result->measured_from, MeasuredFrom::embedded_preview);
  EXPECT_EQ(read.result->kind, "raw");
  ASSERT_EQ(read.sink.picture.size(), alone.sink.picture.size());
  EXPECT_EQ(cv::norm(read.sink.picture, alone.sink.picture, cv::NORM_INF), 0);
}

TEST(Raw, OfAnUnknownBodyFallsBackToItsPreview) {
  // The signature of a raw format, then nothing that LibRaw knows, then a JPEG.
  Bytes file(600, std::byte{0x11});
  const std::string signature("II\x1A\0\0\0HEAPCCDR", 14);
  for (std::size_t i = 0; i < signature.size(); ++i) file[i] = static_cast<std::byte>(signature[i]);
  const Bytes preview = jpeg_of(drawn_picture(90, 60, CV_8UC3));
  Bytes without = file;
  file.insert(file.end(), preview.begin(), preview.end());
  const Read read = read_picture(file);
  ASSERT_TRUE(read.result) << read.result.error().message;
  EXPECT_TRUE(has_note(*read.result, "raw-unknown-body"));
  EXPECT_EQ(read.result->width_px, 90);
  EXPECT_FALSE(read_picture(without).result);
}

TEST(Raw, CutShortIsSeen) {
  const Bytes file = dng_of(mosaic_with({5, 5, 5}));
  for (int cut = 0; cut < 20; ++cut) {
    const Bytes part = first_part(file, file.size() * static_cast<std::size_t>(cut) / 20);
    EXPECT_FALSE(read_picture(part).result) << cut;
    CountingSink sink;
    EXPECT_FALSE(decode_mosaic(part, sink)) << cut;
    EXPECT_EQ(sink.counts.counts().cells, 0) << cut;
  }
}

Bytes bytes_of_file(const std::filesystem::path& path) {
  std::ifstream stream(path, std::ios::binary);
  const std::string text((std::istreambuf_iterator<char>(stream)), {});
  const auto* data = reinterpret_cast<const std::byte*>(text.data());
  return {data, data + text.size()};
}

TEST(Raw, RealFilesCountAsLibRawsOwnDataSay) {
  const char* folder = std::getenv("FOCUSFALL_CAMERA_FILES");
  if (folder == nullptr) GTEST_SKIP() << "FOCUSFALL_CAMERA_FILES names no folder";
  int seen = 0;
  for (const auto& entry : std::filesystem::recursive_directory_iterator(folder)) {
    if (!entry.is_regular_file()) continue;
    const Bytes file = bytes_of_file(entry.path());
    if (!is_camera_raw(file)) continue;
    ++seen;
    SCOPED_TRACE(entry.path().filename());
    const auto before = std::filesystem::last_write_time(entry.path());
    const Read read = read_picture(file);
    EXPECT_TRUE(read.result) << (read.result ? "" : read.result.error().message);
    CountingSink sink;
    const auto format = decode_mosaic(file, sink);
    ASSERT_TRUE(format) << format.error().message;
    LibRaw raw;
    ASSERT_EQ(raw.open_file(entry.path().c_str()), LIBRAW_SUCCESS);
    ASSERT_EQ(raw.unpack(), LIBRAW_SUCCESS);
    const auto& sizes = raw.imgdata.sizes;
    std::array<std::int64_t, 3> photosites{}, saturated{};
    for (int y = 0; y < sizes.height; ++y) {
      for (int x = 0; x < sizes.width; ++x) {
        const auto channel = static_cast<std::size_t>(raw.COLOR(y, x) == 3 ? 1 : raw.COLOR(y, x));
        const auto at = static_cast<std::size_t>((y + sizes.top_margin) * sizes.raw_width + x + sizes.left_margin);
        ++photosites[channel];
        const int phase = y % format->period_y * format->period_x + x % format->period_x;
        saturated[channel] += static_cast<float>(raw.imgdata.rawdata.raw_image[at]) >= format->sites[static_cast<std::size_t>(phase)].white;
      }
    }
    EXPECT_EQ(sink.counts.counts().photosites, photosites);
    EXPECT_EQ(sink.counts.counts().saturated, saturated);
    EXPECT_EQ(std::filesystem::last_write_time(entry.path()), before);
    EXPECT_EQ(bytes_of_file(entry.path()), file);
  }
  if (seen == 0) GTEST_SKIP() << "no raw file there";
}

}  // namespace
}  // namespace focusfall::test
