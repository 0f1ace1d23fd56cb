// The picture as the estimators see it: one plane of luma codes and the curve that linearises them.
#pragma once

#include <opencv2/core.hpp>
#include <vector>

namespace focusfall {

// Codes as delivered, CV_8UC1 or CV_16UC1, unrotated frame, and their linear value (1.0 = clipping level):
// linear_of_code has 256 or 65536 entries and never decreases.
struct LumaPicture {
  cv::Mat codes;
  std::vector<float> linear_of_code;
  // What a lossy coding rounds the lowest spatial frequencies to, 8-bit codes (JPEG: coding_step() of the decoder); 0:
  // nothing was lost, or it is not known.
  double coding_step_codes = 0;
};

// The sRGB decoding curve (IEC 61966-2-1, as in the sample code of CSS Color 4) for `code_count` equally spaced
// codes from 0 to full scale; code_count is 256 or 65536.
std::vector<float> srgb_linear_of_code(int code_count);

}  // namespace focusfall
