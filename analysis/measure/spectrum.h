// Blur of a region from its power spectrum: a power law times the transfer function of a disc.
//
// The spectrum of most textures falls as f^-alpha (Field, "Relations between the statistics of natural images", 1987);
// a disc of diameter c multiplies it by jinc^2(pi c f), whose fall and zeros give c. Edges are not needed, which makes
// this the estimator for fine texture; a straight edge or a soft subject misleads it more than the edge fits.
#pragma once

#include <opencv2/core.hpp>
#include <optional>
#include <utility>
#include <vector>

namespace focusfall {

struct SpectralBlur {
  double disc_px = 0;            // px of the array given
  double sigma_px = 0;           // half of the 16-84 % range of the posterior
  double low_px = 0, high_px = 0;  // 95 %
  int rings = 0;                 // of the spectrum that stood above the noise
};

// Keeps its tables and buffers from call to call; one per thread.
class SpectralEstimator {
 public:
  static constexpr int kTile = 128;      // px; least width and height of a region

  // Mean spectrum of half-overlapping tiles of `linear` (CV_32FC1, linear light, at least kTile each way).
  // `system_variance_px2`: variance of what blurs beside the disc (pixel box, pyramid filters), px^2 of the array.
  // Valid from 4 px to about kTile / 5; nullopt where fewer than five rings stand above the noise or where the
  // posterior is wide.
  std::optional<SpectralBlur> measure(const cv::Mat& linear, double system_variance_px2);

 private:
  struct Ring {
    double frequency = 0;        // mean, cycles/px
    double bins = 0;             // independent samples in it, one tile
    double low = 0, high = 0;    // cycles/px
  };
  using LogResponse = std::vector<std::vector<double>>;   // [disc][ring]
  void prepare_rings();
  const LogResponse& prepared(double system_variance_px2);
  std::vector<double> ring_energies(const cv::Mat& linear, int& tiles);

  std::vector<Ring> rings_;
  std::vector<int> ring_of_bin_;           // per bin of the half spectrum, -1 outside
  std::vector<double> discs_;              // the grid of c
  std::vector<std::pair<double, LogResponse>> log_responses_;   // for every system variance that was asked for
  cv::Mat window_, tile_, spectrum_;
};

}  // namespace focusfall
