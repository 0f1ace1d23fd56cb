#include "analysis/compare/exposure_light.h"

#include <array>
#include <cmath>
#include <limits>

namespace focusfall {
namespace {

// Ratios of walk to noise that are tried: none, then some two a decade.
constexpr std::array kWalkRatios = {0.0, 1e-4, 4e-4, 1.6e-3, 6.4e-3, 0.025, 0.1, 0.4, 1.6, 6.4, 25.0};

// Gains of the filter; they do not depend on the values that are filtered.
struct Filter {
  std::vector<double> gain, root;   // root: standard deviation of an innovation
  double log_determinant = 0;

  Filter(const LightSteps& steps, double ratio) {
    double variance = 0;   // of the walk before the observation; its start is the intercept's
    for (std::size_t i = 0; i < steps.variance.size(); ++i) {
      if (i > 0) variance += ratio * steps.gap[i];
      const double innovation = variance + steps.variance[i];
      gain.push_back(variance / innovation);
      root.push_back(std::sqrt(innovation));
      log_determinant += std::log(innovation);
      variance -= gain.back() * variance;
    }
  }

  template <class Column>
  void whiten(Column&& column) const {
    double walk = 0;
    for (Eigen::Index i = 0; i < column.size(); ++i) {
      const auto k = static_cast<std::size_t>(i);
      const double innovation = column[i] - walk;
      walk += gain[k] * innovation;
      column[i] = innovation / root[k];
    }
  }
};

}  // namespace

LightFit fit_light(const Eigen::MatrixXd& design, const Eigen::VectorXd& levels_ev, const LightSteps& steps) {
  LightFit best;
  best.minus_two_log_likelihood = std::numeric_limits<double>::infinity();
  const auto n = design.rows(), p = design.cols();
  for (const double ratio : kWalkRatios) {
    const Filter filter(steps, ratio);
    Eigen::MatrixXd x = design;
    for (Eigen::Index column = 0; column < p; ++column) filter.whiten(x.col(column));
    Eigen::VectorXd y = levels_ev;
    filter.whiten(y);
    const Eigen::LDLT<Eigen::MatrixXd> normal(x.transpose() * x);
    const Eigen::VectorXd coefficients = normal.solve(x.transpose() * y);
    // Levels finer than a thousandth of a stop are beyond any camera; a perfect fit must not end in a logarithm of 0.
    constexpr double kFinestEv = 1e-3;
    const double squares = (y - x * coefficients).squaredNorm() + static_cast<double>(n) * kFinestEv * kFinestEv;
    const double score = static_cast<double>(n) * std::log(squares / static_cast<double>(n)) + filter.log_determinant;
    if (score >= best.minus_two_log_likelihood) continue;
    const double variance = squares / static_cast<double>(n - p);
    best.coefficients = coefficients;
    best.covariance = variance * normal.solve(Eigen::MatrixXd::Identity(p, p));
    best.sigma_ev = std::sqrt(variance);
    best.walk_ratio = ratio;
    best.minus_two_log_likelihood = score;
    best.degrees_of_freedom = static_cast<int>(n - p);
  }
  return best;
}

SmoothedLight smoothed_light(const Eigen::VectorXd& remainder_ev, const LightFit& fit, const LightSteps& steps) {
  const auto n = static_cast<std::size_t>(remainder_ev.size());
  std::vector<double> predicted(n), predicted_variance(n), filtered(n), filtered_variance(n);
  double walk = 0, variance = 0;
  for (std::size_t i = 0; i < n; ++i) {
    if (i > 0) variance += fit.walk_ratio * steps.gap[i];
    predicted[i] = walk, predicted_variance[i] = variance;
    const double gain = variance / (variance + steps.variance[i]);
    walk += gain * (remainder_ev[static_cast<Eigen::Index>(i)] - walk);
    variance -= gain * variance;
    filtered[i] = walk, filtered_variance[i] = variance;
  }
  SmoothedLight light{filtered, filtered_variance};
  for (std::size_t i = n; i-- > 1;) {
    const double gain = predicted_variance[i] > 0 ? filtered_variance[i - 1] / predicted_variance[i] : 0;
    light.level_ev[i - 1] = filtered[i - 1] + gain * (light.level_ev[i] - predicted[i]);
    light.sigma_ev[i - 1] = filtered_variance[i - 1] + gain * gain * (light.sigma_ev[i] - predicted_variance[i]);
  }
  for (double& sigma : light.sigma_ev) sigma = fit.sigma_ev * std::sqrt(std::max(0.0, sigma));
  return light;
}

bool is_spanned(const Eigen::MatrixXd& design, const Eigen::VectorXd& column) {
  const double size = column.norm();
  if (size == 0) return true;
  const Eigen::VectorXd fitted = design * design.colPivHouseholderQr().solve(column);
  return (column - fitted).norm() < 1e-6 * size;
}

}  // namespace focusfall
