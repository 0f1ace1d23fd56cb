#include "analysis/measure/spectrum.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <opencv2/imgproc.hpp>

namespace focusfall {
namespace {

constexpr int kT = SpectralEstimator::kTile;
constexpr double kLowestFrequency = 1.6 / kT;    // below, the window's own width dominates
constexpr double kHighestFrequency = 0.42;       // above, demosaicing and JPEG leave nothing of the scene
constexpr double kRingRatio = 1.2599;            // a third of an octave
constexpr double kAboveFloor = 6.0;              // energy over the noise floor: a ring below it ends the fit
constexpr double kAlphaPrior = 2.0, kAlphaPriorSigma = 0.6;   // of the power; natural textures (measured)
constexpr double kAlphaLeast = 0.6, kAlphaMost = 3.4;
constexpr double kRingModelVariance = 0.06;      // of log energy: textures are no exact power law (measured)
constexpr double kBinsPerSample = 2.5;           // neighbouring bins are correlated by the Hann window
constexpr double kOverlapGain = 0.6;             // independent share of half-overlapping tiles
constexpr int kLeastRings = 5;
constexpr double kFirstDisc = 1.5, kLastDisc = 40.0, kDiscRatio = 1.03;
constexpr double kLeastDisc = 4.0;               // smaller discs differ too little from a steeper power law
constexpr int kMostTilesAcross = 3;              // more tiles add little and cost a transform each

// 2 J1(x)/x, the transform of a disc.
double jinc(double x) { return std::abs(x) < 1e-6 ? 1.0 : 2.0 * ::j1(x) / x; }

struct Fit {
  double chi2 = 0;
  double alpha = 0;
};

// Best constant and exponent for one disc; the exponent is held by its prior and kept in its range.
Fit fit_power_law(const std::vector<double>& y, const std::vector<double>& log_f, const std::vector<double>& weight) {
  double sw = 0, sx = 0, sy = 0, sxx = 0, sxy = 0;
  for (std::size_t i = 0; i < y.size(); ++i) {
    const double x = -log_f[i];
    sw += weight[i];
    sx += weight[i] * x;
    sy += weight[i] * y[i];
    sxx += weight[i] * x * x;
    sxy += weight[i] * x * y[i];
  }
  const double prior = 1 / (kAlphaPriorSigma * kAlphaPriorSigma);
  const double cov = sxy - sx * sy / sw, var = sxx - sx * sx / sw;
  const double alpha = std::clamp((cov + prior * kAlphaPrior) / (var + prior), kAlphaLeast, kAlphaMost);
  const double constant = (sy - alpha * sx) / sw;
  Fit fit{prior * (alpha - kAlphaPrior) * (alpha - kAlphaPrior), alpha};
  for (std::size_t i = 0; i < y.size(); ++i) {
    const double r = y[i] - constant + alpha * log_f[i];
    fit.chi2 += weight[i] * r * r;
  }
  return fit;
}

// Quantile of a discrete posterior over increasing values, interpolated.
double posterior_quantile(const std::vector<double>& values, const std::vector<double>& probability, double share) {
  double sum = 0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (sum + probability[i] >= share) {
      const double f = probability[i] > 0 ? (share - sum) / probability[i] : 0.5;
      const double below = i > 0 ? 0.5 * (values[i - 1] + values[i]) : values[i];
      const double above = i + 1 < values.size() ? 0.5 * (values[i] + values[i + 1]) : values[i];
      return below + f * (above - below);
    }
    sum += probability[i];
  }
  return values.back();
}

}  // namespace

void SpectralEstimator::prepare_rings() {
  if (rings_.empty()) {
    for (double f = kLowestFrequency; f * kRingRatio <= kHighestFrequency * 1.0001; f *= kRingRatio) {
      rings_.push_back({0, 0, f, f * kRingRatio});
    }
    ring_of_bin_.assign(static_cast<std::size_t>(kT) * (kT / 2 + 1), -1);
    for (int y = 0; y < kT; ++y) {
      const double fy = (y <= kT / 2 ? y : y - kT) / static_cast<double>(kT);
      for (int x = 0; x <= kT / 2; ++x) {
        const double f = std::hypot(fy, x / static_cast<double>(kT));
        if (f < kLowestFrequency || f >= rings_.back().high) continue;
        const auto r = static_cast<std::size_t>(std::log(f / kLowestFrequency) / std::log(kRingRatio));
        if (r >= rings_.size()) continue;
        ring_of_bin_[static_cast<std::size_t>(y * (kT / 2 + 1) + x)] = static_cast<int>(r);
        rings_[r].frequency += std::log(f);
        rings_[r].bins += 1;
      }
    }
    for (Ring& ring : rings_) ring.frequency = std::exp(ring.frequency / ring.bins);
    for (double c = kFirstDisc; c < kLastDisc; c *= kDiscRatio) discs_.push_back(c);
    cv::createHanningWindow(window_, cv::Size(kT, kT), CV_32F);
  }
}

const SpectralEstimator::LogResponse& SpectralEstimator::prepared(double system_variance_px2) {
  for (const auto& [variance, response] : log_responses_) {
    if (variance == system_variance_px2) return response;
  }
  prepare_rings();
  // |disc|^2 over each ring, weighted f^-3 (bins times a typical power law) and spread by the window's kernel.
  LogResponse made(discs_.size(), std::vector<double>(rings_.size()));
  constexpr int kSamples = 16;
  for (std::size_t d = 0; d < discs_.size(); ++d) {
    for (std::size_t r = 0; r < rings_.size(); ++r) {
      double sum = 0, total = 0;
      for (int i = 0; i < kSamples; ++i) {
        const double f = rings_[r].low * std::pow(kRingRatio, (i + 0.5) / kSamples);
        const double w = std::pow(f, -2.0);   // f^-3 on a logarithmic grid
        double spread = 0;
        for (int k = -1; k <= 1; ++k) {
          const double h = jinc(M_PI * discs_[d] * (f + static_cast<double>(k) / kT));
          spread += (k == 0 ? 2.0 / 3 : 1.0 / 6) * h * h;
        }
        sum += w * spread * std::exp(-4 * M_PI * M_PI * system_variance_px2 * f * f);
        total += w;
      }
      made[d][r] = std::log(sum / total);
    }
  }
  return log_responses_.emplace_back(system_variance_px2, std::move(made)).second;
}

std::vector<double> SpectralEstimator::ring_energies(const cv::Mat& linear, int& tiles) {
  std::vector<double> energy(rings_.size(), 0.0);
  auto steps = [](int size) { return std::clamp(1 + (size - kT) / (kT / 2), 1, kMostTilesAcross); };
  const int nx = steps(linear.cols), ny = steps(linear.rows);
  tiles = nx * ny;
  for (int ty = 0; ty < ny; ++ty) {
    for (int tx = 0; tx < nx; ++tx) {
      const int x = nx > 1 ? (linear.cols - kT) * tx / (nx - 1) : (linear.cols - kT) / 2;
      const int y = ny > 1 ? (linear.rows - kT) * ty / (ny - 1) : (linear.rows - kT) / 2;
      const cv::Mat source = linear(cv::Rect(x, y, kT, kT));
      const double mean = cv::sum(source.mul(window_))[0] / cv::sum(window_)[0];
      cv::subtract(source, cv::Scalar(mean), tile_);
      tile_ = tile_.mul(window_);
      cv::dft(tile_, spectrum_, cv::DFT_COMPLEX_OUTPUT);
      for (int row = 0; row < kT; ++row) {
        const auto* values = spectrum_.ptr<cv::Vec2f>(row);
        const int* ring = ring_of_bin_.data() + row * (kT / 2 + 1);
        for (int column = 0; column <= kT / 2; ++column) {
          if (ring[column] < 0) continue;
          const double re = values[column][0], im = values[column][1];
          energy[static_cast<std::size_t>(ring[column])] += re * re + im * im;
        }
      }
    }
  }
  for (std::size_t r = 0; r < rings_.size(); ++r) energy[r] /= rings_[r].bins * tiles;
  return energy;
}

std::optional<SpectralBlur> SpectralEstimator::measure(const cv::Mat& linear, double system_variance_px2) {
  if (linear.cols < kT || linear.rows < kT) return std::nullopt;
  const LogResponse& log_response = prepared(system_variance_px2);
  int tiles = 0;
  const std::vector<double> energy = ring_energies(linear, tiles);

  // Rings up to the first that sinks towards the noise.
  const std::size_t n = rings_.size();
  const double floor = std::min(energy[n - 1], energy[n - 2]);
  std::size_t kept = 0;
  while (kept < n && energy[kept] > kAboveFloor * floor) ++kept;
  if (kept < kLeastRings) return std::nullopt;

  std::vector<double> log_f(kept), weight(kept), y(kept);
  const double samples_per_bin = (tiles > 1 ? kOverlapGain * tiles : 1.0) / kBinsPerSample;
  for (std::size_t r = 0; r < kept; ++r) {
    log_f[r] = std::log(rings_[r].frequency);
    weight[r] = 1 / (1 / std::max(rings_[r].bins * samples_per_bin, 1.0) + kRingModelVariance);
  }
  std::vector<double> chi2(discs_.size());
  for (std::size_t d = 0; d < discs_.size(); ++d) {
    for (std::size_t r = 0; r < kept; ++r) y[r] = std::log(energy[r] - floor) - log_response[d][r];
    chi2[d] = fit_power_law(y, log_f, weight).chi2;
  }
  const double best = *std::min_element(chi2.begin(), chi2.end());
  std::vector<double> probability(discs_.size());
  double total = 0;
  for (std::size_t d = 0; d < discs_.size(); ++d) total += probability[d] = std::exp(-0.5 * (chi2[d] - best));
  for (double& p : probability) p /= total;

  SpectralBlur blur;
  blur.disc_px = posterior_quantile(discs_, probability, 0.5);
  blur.sigma_px =
      0.5 * (posterior_quantile(discs_, probability, 0.84) - posterior_quantile(discs_, probability, 0.16));
  blur.low_px = posterior_quantile(discs_, probability, 0.025);
  blur.high_px = posterior_quantile(discs_, probability, 0.975);
  blur.rings = static_cast<int>(kept);
  if (blur.disc_px < kLeastDisc || blur.sigma_px > 0.2 * blur.disc_px + 0.3) return std::nullopt;
  return blur;
}

}  // namespace focusfall
