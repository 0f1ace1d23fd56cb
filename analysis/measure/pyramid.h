// The picture in linear light at halved sizes.
#pragma once

#include <opencv2/core.hpp>
#include <vector>

#include "analysis/measure/luma_picture.h"
#include "analysis/conventions.h"

namespace focusfall {

// Level k halves level k - 1 with the separable kernel [1 3 3 1]/8. A pixel x of level k lies at
// 2^k x + (2^k - 1)/2 of level 0. Level 0 stays in codes and is linearised where it is looked at.
struct Pyramid {
  static constexpr int kLevels = 5;
  const LumaPicture* picture = nullptr;      // level 0; must outlive the pyramid
  PixelRect region;                          // of level 0 that the coarser levels cover, aligned to 16 px
  std::vector<cv::Mat> levels;               // CV_32FC1, linear; levels[0] is empty

  int width(int level) const;
  int height(int level) const;
};

// Builds levels 1..coarsest for `region` (grown to multiples of 16 px and cut to the picture), reusing buffers.
void build_pyramid(const LumaPicture& picture, PixelRect region, int coarsest, Pyramid& pyramid);

}  // namespace focusfall
