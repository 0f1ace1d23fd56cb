// What the camera's own processing adds to S, and what a frame tells about it.
//
// Without a learned baseline B ~ N(0, 3^2) px^2: in-camera sharpening measures -2.7 to -5.6, demosaicing +3 to +5. The
// frame narrows it: nothing can be sharper than diffraction allows, so B <= S - S_diffraction for its sharpest region,
// and in most frames something is in focus, which puts B close to that bound. Both are put together by Bayes' rule on a
// grid of B; a frame that missed everywhere keeps its share of the probability.
#pragma once

#include <vector>

#include "analysis/conventions.h"
#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"

namespace focusfall {

class BaselinePosterior {
 public:
  BaselinePosterior(const Prediction& prediction, const Measurement& measurement);

  // 95 % bounds of S - B of a region, never below what diffraction alone reports. The value is S minus the baseline
  // that was expected beforehand; a region that reads sharper than that keeps its negative value.
  [[nodiscard]] Interval corrected(const BlurEstimate& estimate) const;

  [[nodiscard]] double expected_px2() const { return expected_px2_; }
  [[nodiscard]] double diffraction_px2() const { return diffraction_px2_; }

 private:
  [[nodiscard]] double quantile(double squared_disc_px2, double sigma_px2, double probability) const;

  double expected_px2_ = 0;
  double diffraction_px2_ = 0;     // S of an aim exactly in focus
  std::vector<double> baseline_px2_;
  std::vector<double> weight_;     // sums to 1
};

// Standard error of S from the 95 % bounds of an estimate, px^2; never 0.
double sigma_px2(const BlurEstimate& estimate);

}  // namespace focusfall
