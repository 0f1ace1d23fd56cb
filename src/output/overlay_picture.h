// The picture under an overlay: grey, reduced, turned as displayed, with the clipped parts of each channel.
#pragma once

#include <cstddef>
#include <opencv2/core.hpp>
#include <span>
#include <tl/expected.hpp>

#include "src/decode/decoder.h"

namespace focusfall {

struct OverlayPicture {
  cv::Mat grey;           // CV_8UC1, as displayed
  cv::Mat clipped[3];     // red, green, blue: CV_8UC1, 255 where at least half of what a pixel stands for is clipped
};

struct LargestSize {
  int width_px = 0;
  int height_px = 0;
};

// Decodes `file` once more: a record keeps no pixels. The picture keeps its shape and fits into `largest` after turning
// by `orientation` (Exif 1..8); a picture much smaller than that is enlarged at most four times.
tl::expected<OverlayPicture, DecodeError> read_overlay_picture(std::span<const std::byte> file, int orientation,
                                                               LargestSize largest, DecodeWorkspace& workspace);

}  // namespace focusfall
