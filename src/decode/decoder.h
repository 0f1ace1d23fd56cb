// From the bytes of a file to strips of pixels. The only folder that links a codec.
//
// A decoder never holds the whole picture in colour: it hands strips of rows to a sink, which keeps what it needs
// (the luma plane) and counts the rest (clipping, tone) on the way.
#pragma once

#include <cstddef>
#include <opencv2/core.hpp>
#include <span>
#include <string>
#include <tl/expected.hpp>

namespace focusfall {

// Why a file could not be decoded: what was seen and what was expected, without the path.
struct DecodeError {
  std::string code;
  std::string message;
};

template <class T>
using Decoded = tl::expected<T, DecodeError>;

struct PictureFormat {
  int width_px = 0;
  int height_px = 0;
  int bits = 8;                 // per channel as delivered: 8 or 16
  int channels = 3;             // 1 or 3
  std::string kind;             // "JPEG", "TIFF", ...
};

// Planes of a JPEG strip as coded: luma at full size, chroma as sampled. A grey picture has empty cb and cr.
// The codes are full-range YCbCr after JFIF (ITU-T T.871).
struct YccStrip {
  int first_row = 0;
  cv::Mat y;                    // CV_8UC1, rows x width
  cv::Mat cb, cr;               // CV_8UC1, subsampled
  int chroma_step_x = 1, chroma_step_y = 1;
};

// Interleaved strip of any other format: CV_8UC3 or CV_16UC3 in the order R, G, B, or one channel.
struct RgbStrip {
  int first_row = 0;
  cv::Mat rgb;
};

class StripSink {
 public:
  virtual ~StripSink() = default;
  virtual void start(const PictureFormat& format) = 0;
  virtual void take(const YccStrip& strip) = 0;
  virtual void take(const RgbStrip& strip) = 0;
};

// Chooses the decoder by content. A picture cut short is delivered as far as it goes and then reported as an error.
Decoded<PictureFormat> decode_picture(std::span<const std::byte> file, StripSink& sink);

// Reads the size without decoding.
Decoded<PictureFormat> picture_format(std::span<const std::byte> file);

}  // namespace focusfall
