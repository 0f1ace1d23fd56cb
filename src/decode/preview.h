// Small upright pictures of a frame for the page: the whole, and the aim at one picture pixel for one pixel.
#pragma once

#include <cstddef>
#include <span>
#include <string>

#include "analysis/conventions.h"
#include "src/decode/decoder.h"

namespace focusfall {

struct PreviewOptions {
  FractionBox aim;                        // fractions of the unrotated frame; empty: no picture of the aim
  int orientation = 1;                    // Exif 1..8: how the unrotated frame is turned to be upright
  int whole_side_px = 360;                // longer side of the whole at most
  int aim_side_px = 176;                  // longest side of the piece cut out of the middle of the aim
  std::size_t whole_bytes = 8200;         // at most: the quality, then the size, gives way
  std::size_t aim_bytes = 2900;
};

// JPEG octets; `aim` empty where no aim was given.
struct Previews {
  std::string whole;
  std::string aim;
};

// Decodes the file once more. What fails is said as decode_picture() says it.
Decoded<Previews> make_previews(std::span<const std::byte> file, const PreviewOptions& options);

// Baseline JPEG, 4:2:0, of an 8-bit RGB or grey picture. Quality 1..100. Empty where libjpeg gives up.
std::string encode_jpeg(const cv::Mat& picture, int quality);

}  // namespace focusfall
