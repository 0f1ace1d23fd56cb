// Tone of a picture from the histogram of its luma codes.
#pragma once

#include <cstdint>
#include <opencv2/core.hpp>
#include <optional>
#include <vector>

#include "analysis/conventions.h"
#include "analysis/measure/measurement.h"

namespace focusfall {

// Mean, median and 99th percentile in linear light, from counts of luma codes. The quantile q of n pixels is the value
// of the pixel at place ceil(q n), counted from 1 in ascending order: an observed value, no interpolation.
class ToneAccumulator {
 public:
  // code_count is 256 or 65536; `aim` empty = no aim.
  void start(int code_count, PixelRect aim);
  // Rows of luma codes, CV_8UC1 or CV_16UC1 to match code_count; `first_row` is that of the first.
  void take(int first_row, const cv::Mat& luma);
  // linear_of_code as in LumaPicture. std::nullopt where no row came.
  std::optional<Tone> tone(const std::vector<float>& linear_of_code) const;

 private:
  std::vector<std::uint64_t> counts(const std::vector<std::uint32_t>& lanes) const;

  int code_count_ = 0;
  PixelRect aim_;
  std::vector<std::uint32_t> lanes_, aim_lanes_;   // part counts, interleaved by code
};

}  // namespace focusfall
