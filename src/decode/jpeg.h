// JPEG: libjpeg's state and the strips it writes into, kept from picture to picture. Included by src/decode alone.
#pragma once

// libjpeg's header needs these two before it.
#include <cstddef>
#include <cstdio>

#include <jpeglib.h>

#include <csetjmp>
#include <memory>
#include <opencv2/core.hpp>
#include <optional>
#include <span>

#include "src/decode/codec.h"

namespace focusfall {

class JpegDecoder {
 public:
  JpegDecoder();
  ~JpegDecoder();
  JpegDecoder(const JpegDecoder&) = delete;
  JpegDecoder& operator=(const JpegDecoder&) = delete;

  Decoded<PictureFormat> format(std::span<const std::byte> file);
  Decoded<PictureFormat> decode(std::span<const std::byte> file, StripSink& sink);

 private:
  struct Handler;
  template <class Step>
  bool guarded(Step step);
  Decoded<PictureFormat> open(std::span<const std::byte> file);
  void read_profile(PictureFormat& format);
  bool planes_are_simple() const;
  bool scans_are_complete() const;
  std::optional<DecodeError> deliver_planes(StripSink& sink);
  std::optional<DecodeError> deliver_rgb(StripSink& sink);
  DecodeError error() const;
  DecodeError row_error(unsigned row) const;
  double coding_step() const;

  std::unique_ptr<Handler> handler_;
  jpeg_decompress_struct codec_{};
  cv::Mat y_, cb_, cr_, rgb_;
};

}  // namespace focusfall
