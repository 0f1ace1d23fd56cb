// Strips of rows as a decoder hands them over: the picture passes by once, a few rows at a time.
#pragma once

#include <opencv2/core.hpp>

namespace focusfall {

// Planes of a JPEG strip as coded: luma at full size, chroma as sampled. A grey picture has empty cb and cr.
// The codes are full-range YCbCr after JFIF (ITU-T T.871). Chroma sample (x / chroma_step_x, y / chroma_step_y)
// belongs to luma sample (x, y), both counted from the top-left corner of the strip; the last chroma column and row
// may serve fewer luma samples than the others.
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

}  // namespace focusfall
