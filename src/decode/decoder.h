// From the bytes of a file to strips of pixels. The only folder that links a codec.
//
// A decoder never holds the whole picture in colour: it hands strips of rows to a sink, which keeps what it needs
// (the luma plane) and counts the rest (clipping, tone) on the way.
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <opencv2/core.hpp>
#include <optional>
#include <span>
#include <string>
#include <tl/expected.hpp>
#include <vector>

#include "analysis/measure/pixel_strips.h"

namespace focusfall {

// Largest picture that is decoded, pixels: four times the largest camera frames of today (judgement). A file that
// declares more is refused before any memory is taken for it.
inline constexpr std::int64_t kMaxPicturePixels = 400'000'000;

// Why a file could not be decoded: what was seen and what was expected, without the path.
// Codes: file-empty, not-a-picture, picture-empty (no pixels), picture-too-large, picture-unsupported,
// picture-truncated (ends early), picture-damaged (its data contradict themselves).
struct DecodeError {
  std::string code;
  std::string message;
};

template <class T>
using Decoded = tl::expected<T, DecodeError>;

// Something about a decoded picture that whoever reads its numbers should know. Codes: alpha-dropped, more-pictures,
// profile-unusable, profile-of-tables, gamma-stated, transfer-stated, orientation-from-container, crop-ignored,
// preview-small, preview-only, raw-damaged, raw-unknown-body.
struct DecodeNote {
  std::string code;
  std::string message;          // one sentence
};

// Where the pixels of a frame came from: a raw file holds no picture of its own.
enum class MeasuredFrom { picture, embedded_preview, half_size_development };
// What linearises the codes.
enum class Transfer { srgb_assumed, profile };

constexpr const char* measured_from_name(MeasuredFrom from) {
  switch (from) {
    case MeasuredFrom::picture: return "picture";
    case MeasuredFrom::embedded_preview: return "embedded preview";
    case MeasuredFrom::half_size_development: return "half-size development";
  }
  return "picture";
}
constexpr const char* transfer_name(Transfer transfer) {
  return transfer == Transfer::profile ? "profile" : "sRGB assumed";
}

// Everything but `remarks`, and notes about damage, is complete when StripSink::start() gets it.
struct PictureFormat {
  int width_px = 0;
  int height_px = 0;
  int bits = 8;                 // per channel as delivered: 8 or 16
  int channels = 3;             // 1 or 3
  std::string kind;             // "JPEG", "TIFF", ...
  int remarks = 0;              // oddities that the codec reported and that did not touch the pixels
  MeasuredFrom measured_from = MeasuredFrom::picture;
  Transfer transfer = Transfer::srgb_assumed;
  std::vector<float> linear_of_code{};     // for LumaPicture, 256 or 65536 entries; empty: the sRGB curve
  double coding_step_codes = 0;            // for LumaPicture: what the coding rounds low frequencies to; 0: lossless
  std::optional<int> orientation{};        // Exif 1..8 where the container states it and overrules Exif (HEIF)
  std::vector<DecodeNote> notes{};
};

// What receives a picture. start() comes once, before the first strip; the strips follow from top to bottom without
// gaps, all of one type. The planes are only borrowed: they hold until take() returns.
class StripSink {
 public:
  virtual ~StripSink() = default;
  virtual void start(const PictureFormat& format) = 0;
  virtual void take(const YccStrip& strip) = 0;
  virtual void take(const RgbStrip& strip) = 0;

  // A place for the luma of a YCbCr picture, so that the codec can write it there and nobody need copy it: CV_8UC1 of
  // at least this padded size. Asked once, after start(); strip.y then refers to its rows. Empty: no such place.
  virtual cv::Mat luma_destination(int padded_width, int padded_height) {
    static_cast<void>(padded_width);
    static_cast<void>(padded_height);
    return {};
  }
};

class JpegDecoder;

// What one worker keeps between frames: codec state and buffers. Not for two threads at once.
class DecodeWorkspace {
 public:
  DecodeWorkspace();
  ~DecodeWorkspace();
  DecodeWorkspace(DecodeWorkspace&&) noexcept;
  DecodeWorkspace& operator=(DecodeWorkspace&&) noexcept;

  JpegDecoder& jpeg();          // made on first use
  cv::Mat strip;                // for any codec: cv::Mat::create keeps the memory where size and type are the same

 private:
  std::unique_ptr<JpegDecoder> jpeg_;
};

// Chooses the decoder by content. A picture cut short is delivered as far as whole strips go and then reported as an
// error; so is a damaged one. Exceptions of the sink pass through.
Decoded<PictureFormat> decode_picture(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace);
Decoded<PictureFormat> decode_picture(std::span<const std::byte> file, StripSink& sink);

// Reads the size without decoding; refuses what decode_picture would refuse unseen (too large, no pixels, no picture).
Decoded<PictureFormat> picture_format(std::span<const std::byte> file, DecodeWorkspace& workspace);
Decoded<PictureFormat> picture_format(std::span<const std::byte> file);

}  // namespace focusfall
