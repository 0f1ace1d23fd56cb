// Files of every kind, made in memory by the codec libraries themselves, and what came out of decoding them.
#pragma once

#include <cstddef>
#include <cstdint>
#include <functional>
#include <opencv2/core.hpp>
#include <optional>
#include <string>
#include <vector>

#include "src/decode/decoder.h"

namespace focusfall::test {

using Bytes = std::vector<std::byte>;

// Slopes of all channels and a few hard edges; every code of the range occurs where the picture is large enough.
// type: CV_8UC1, CV_8UC3, CV_16UC1 or CV_16UC3, channels in the order R, G, B.
cv::Mat drawn_picture(int width, int height, int type);

struct PngOptions {
  bool interlaced = false;
  double gamma = 0;               // 0: no gAMA chunk
  Bytes profile{};                // empty: none
};
Bytes png_of(const cv::Mat& picture, const PngOptions& options = {});   // 1 to 4 channels, 8 or 16 bits
Bytes palette_png(const cv::Mat& indices, const std::vector<cv::Vec3b>& palette);

struct TiffOptions {
  int compression = 1;            // of the TIFF specification
  int photometric = -1;           // -1: grey or RGB by the channels
  int sample_format = 1;          // 1 unsigned, 3 floating point
  int tile_px = 0;                // 0: strips
  int rows_per_strip = 16;
  bool planes_apart = false;
  Bytes profile{};
};
Bytes tiff_of(const cv::Mat& picture, const TiffOptions& options = {});

// Lets a test set further tags before the pixels are written; `tiff` is a TIFF*.
Bytes tiff_in_memory(const std::function<void(void* tiff)>& write);

struct JpegOptions {
  int quality = 95;
  int step_x = 1, step_y = 1;     // of the chroma samples
  bool progressive = false;
  bool cmyk = false;              // four channels
  Bytes profile{};
};
Bytes jpeg_of(const cv::Mat& picture, const JpegOptions& options = {});   // 8 bits

// sRGB's primaries with a pure power as tone curve; grey: the curve alone.
Bytes gamma_profile(double gamma, bool grey);

// Keeps everything that a decoder delivers, and checks that the strips follow one another.
class KeepingSink final : public StripSink {
 public:
  void start(const PictureFormat& format) override;
  void take(const YccStrip& strip) override;
  void take(const RgbStrip& strip) override;

  std::optional<PictureFormat> format;
  int starts = 0;
  int rows = 0;                   // delivered so far
  bool in_order = true;
  cv::Mat picture;                // what came as RGB or grey; luma where it came as YCbCr
};

// Decodes and keeps; the error, if any, beside it.
struct Read {
  KeepingSink sink;
  Decoded<PictureFormat> result;
};
Read read_picture(const Bytes& file);

Bytes first_part(const Bytes& file, std::size_t size);
bool has_note(const PictureFormat& format, const std::string& code);

}  // namespace focusfall::test
