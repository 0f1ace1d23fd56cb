// Blur of a tile from its power spectrum: a power law times the transfer function of a disc.
#pragma once

#include <opencv2/core.hpp>
#include <optional>

namespace focusfall {

// Linear light, CV_32FC1, square (side a power of two, 64..256).
struct SpectralBlur {
  double disc_px = 0;            // in px of the tile
  double sigma_px = 0;
};

// `system_variance_px2` = variance of what blurs beside the disc (pixel box, pyramid prefilter), px^2 of the tile.
// Valid from 4 px up; nullopt where fewer than 5 rings rise above the noise or the answer is not sharp.
std::optional<SpectralBlur> spectral_blur(const cv::Mat& linear_tile, double system_variance_px2);

}  // namespace focusfall
