#include "analysis/compare/baseline.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>

namespace focusfall {
namespace {

constexpr double k95 = 1.959964;
constexpr double kUnknownSigmaPx2 = 3;       // prior of an unknown baseline: measured range of processing
constexpr double kLeastSigmaPx2 = 0.2;       // no estimate of S is better (measured on sharp edges)
constexpr int kGridPoints = 81;
constexpr int kBisections = 30;              // to a thousandth of a square pixel or better
constexpr double kNegligible = 1e-7;         // share of the probability that no bound can see
constexpr double kGridReach = 5;             // standard deviations on either side
constexpr double kConflict = 3;              // beyond that a stated baseline is not this frame's

// How sharp the sharpest region of a frame is, beyond diffraction. In focus: a squared disc between 0 and 1.5 px^2 (a
// disc of 1.2 px, a third of the usual limit). Otherwise any disc up to 30 px is as likely as another. Four frames in
// five are taken to be in focus somewhere (judgement; where only three in ten are, false claims still stay below 2 %,
// see the tests), and 95 % where a surface was found on which the line of best focus was seen.
constexpr double kInFocusPx2 = 1.5;
constexpr double kWidestDiscPx = 30;
constexpr double kInFocusShare = 0.8;
constexpr double kInFocusShareOnSurface = 0.95;

// Lower bounds this close to diffraction are those of a region in focus, px^2.
constexpr double kAsSharpAsCanBePx2 = 0.5;

double normal_cdf(double z) { return 0.5 * std::erfc(-z / std::numbers::sqrt2); }

struct Sharpest {
  double squared_disc_px2 = 0;
  double sigma_px2 = 1;
};

std::optional<Sharpest> sharpest(const Measurement& measurement) {
  std::optional<Sharpest> result;
  const auto consider = [&](const BlurReading& reading) {
    if (!reading.estimate || reading.estimate->bound == Bound::lower) return;
    if (!result || reading.estimate->squared_disc_px2 < result->squared_disc_px2)
      result = Sharpest{reading.estimate->squared_disc_px2, sigma_px2(*reading.estimate)};
  };
  consider(measurement.aim_blur);
  if (measurement.best) consider(measurement.best->reading);
  return result;
}

// Density of the sharpest region's reading, `excess` = S - B - S_diffraction, sigma = its standard error.
double likelihood(double excess_px2, double sigma, double in_focus_share) {
  const double in_focus =
      (normal_cdf(excess_px2 / sigma) - normal_cdf((excess_px2 - kInFocusPx2) / sigma)) / kInFocusPx2;
  // A disc uniform in c has the density 1/(2 c) in c^2; near 0 the measurement blurs it over sigma.
  const double missed = normal_cdf(excess_px2 / sigma) /
                        (2 * kWidestDiscPx * std::sqrt(std::max(excess_px2, sigma)));
  return in_focus_share * in_focus + (1 - in_focus_share) * missed;
}

// The surface shows where focus fell: the signed blur changes sign inside the frame.
bool line_of_focus_seen(const std::optional<PlaneReading>& plane) {
  if (!plane) return false;
  const double g = plane->offset_px, x = plane->x_gradient_px, y = plane->y_gradient_px;
  const double least = std::min({g, g + x, g + y, g + x + y}), most = std::max({g, g + x, g + y, g + x + y});
  return least < 0 && most > 0;
}

}  // namespace

double sigma_px2(const BlurEstimate& estimate) {
  return std::max((estimate.squared_disc_high_px2 - estimate.squared_disc_low_px2) / (2 * k95), kLeastSigmaPx2);
}

BaselinePosterior::BaselinePosterior(const Prediction& prediction, const Measurement& measurement) {
  const double disc_px = prediction.blur_disc_px.value_or(0);
  diffraction_px2_ = disc_px * disc_px;
  double sigma = kUnknownSigmaPx2;
  if (prediction.baseline_px2) {
    expected_px2_ = prediction.baseline_px2->value;
    sigma = std::max((prediction.baseline_px2->high - prediction.baseline_px2->low) / (2 * k95), kLeastSigmaPx2);
  }

  const std::optional<Sharpest> best = sharpest(measurement);
  double lowest = expected_px2_ - kGridReach * sigma;
  if (best) {
    // Sharper than the stated baseline can make anything: another picture setting than the one it was learned on.
    const double bound_px2 = best->squared_disc_px2 - diffraction_px2_;
    if (bound_px2 + kConflict * best->sigma_px2 < expected_px2_ - kConflict * sigma) {
      sigma = std::max(sigma, kUnknownSigmaPx2);
      lowest = std::min(expected_px2_ - kGridReach * sigma, bound_px2 - kConflict * best->sigma_px2);
    }
  }

  // Prior times what the sharpest region says, on a grid.
  const double share = line_of_focus_seen(measurement.plane) ? kInFocusShareOnSurface : kInFocusShare;
  const double highest = expected_px2_ + kGridReach * sigma;
  double sum = 0;
  for (int i = 0; i < kGridPoints; ++i) {
    const double baseline = lowest + (highest - lowest) * i / (kGridPoints - 1);
    const double z = (baseline - expected_px2_) / sigma;
    double weight = std::exp(-0.5 * z * z);
    if (best)
      weight *= likelihood(best->squared_disc_px2 - baseline - diffraction_px2_, best->sigma_px2, share);
    baseline_px2_.push_back(baseline);
    weight_.push_back(weight);
    sum += weight;
  }
  // Every term can underflow only where a stated baseline lies far above the frame; the grid's low end is then right.
  if (!(sum > 0)) weight_.front() = sum = 1;
  for (double& weight : weight_) weight /= sum;
}

// Smallest s whose probability P(S - B <= s) reaches `probability`, with S - B kept above diffraction.
double BaselinePosterior::quantile(double squared_disc_px2, double sigma, double probability) const {
  const auto cdf = [&](double s) {
    double total = 0;
    for (size_t i = 0; i < weight_.size(); ++i) {
      if (weight_[i] < kNegligible) continue;
      const double mean = squared_disc_px2 - baseline_px2_[i];
      const double cut = normal_cdf((diffraction_px2_ - mean) / sigma);
      total += weight_[i] * (cut < 1 - 1e-9 ? (normal_cdf((s - mean) / sigma) - cut) / (1 - cut) : 1.0);
    }
    return total;
  };
  double low = diffraction_px2_;
  double high = std::max(squared_disc_px2 - baseline_px2_.front(), low) + 8 * sigma;
  for (int step = 0; step < kBisections; ++step) {
    const double middle = (low + high) / 2;
    (cdf(middle) < probability ? low : high) = middle;
  }
  return high;
}

Interval BaselinePosterior::corrected(const BlurEstimate& estimate) const {
  const double sigma = sigma_px2(estimate);
  const double low = quantile(estimate.squared_disc_px2, sigma, 0.025);
  const double high = quantile(estimate.squared_disc_px2, sigma, 0.975);
  const double value = estimate.squared_disc_px2 - expected_px2_;
  // As sharp as anything can be: the negative value stays, it says that the camera sharpened.
  if (value < low && low < diffraction_px2_ + kAsSharpAsCanBePx2) return {value, value, high};
  // Otherwise the frame's own evidence on the baseline moves the value where the expected baseline contradicts it.
  return {std::clamp(value, low, high), low, high};
}

}  // namespace focusfall
