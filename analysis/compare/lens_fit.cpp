#include "analysis/compare/lens_fit.h"

#include <Eigen/LU>
#include <Eigen/QR>
#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>

namespace focusfall {
namespace {

// Residuals count up to so many standard deviations. 2 keeps 97 % of the efficiency on normal readings and halves the
// pull of a reading 4 standard deviations away (judgement; Huber's own examples use 1 to 2).
constexpr double kClip = 2;

constexpr int kIterations = 40;
constexpr double kSettled = 1e-9;     // relative change at which the iteration ends
constexpr double kRankThreshold = 1e-9;

// E[min(z^2, k^2)] of a standard normal z, k = kClip.
double clipped_moment() {
  const boost::math::normal normal;
  const double inside = 2 * cdf(normal, kClip) - 1;
  return inside - 2 * kClip * pdf(normal, kClip) + kClip * kClip * (1 - inside);
}

double clipped(double r) { return std::clamp(r, -kClip, kClip); }

// sum psi(r)^2 at a squared spread.
double clipped_sum(const Eigen::VectorXd& error, const Eigen::VectorXd& sigma, double spread2) {
  double sum = 0;
  for (Eigen::Index i = 0; i < error.size(); ++i) {
    const double variance = spread2 + sigma[i] * sigma[i];
    const double r2 = variance > 0 ? error[i] * error[i] / variance : (error[i] == 0 ? 0 : kClip * kClip);
    sum += std::min(r2, kClip * kClip);
  }
  return sum;
}

// The squared spread at which clipped_sum() is `target`: it falls as the spread grows. 0 where it is below already.
double spread2_at(const Eigen::VectorXd& error, const Eigen::VectorXd& sigma, double target) {
  if (clipped_sum(error, sigma, 0) <= target) return 0;
  double high = error.squaredNorm();
  for (int i = 0; i < 60 && clipped_sum(error, sigma, high) > target; ++i) high *= 4;
  double low = 0;
  for (int i = 0; i < 100; ++i) {
    const double middle = (low + high) / 2;
    (clipped_sum(error, sigma, middle) > target ? low : high) = middle;
  }
  return (low + high) / 2;
}

Eigen::VectorXd standardised(const Eigen::VectorXd& error, const Eigen::VectorXd& sigma, double spread2) {
  Eigen::VectorXd r(error.size());
  for (Eigen::Index i = 0; i < error.size(); ++i) {
    const double variance = spread2 + sigma[i] * sigma[i];
    r[i] = variance > 0 ? error[i] / std::sqrt(variance) : 0;
  }
  return r;
}

Eigen::VectorXd weighted_solution(const Eigen::MatrixXd& design, const Eigen::VectorXd& y,
                                  const Eigen::VectorXd& weight) {
  const Eigen::VectorXd root = weight.cwiseSqrt();
  return (root.asDiagonal() * design).colPivHouseholderQr().solve(root.cwiseProduct(y));
}

// Weights 1 / variance, finite where readings claim no error and do not scatter.
Eigen::VectorXd precision(const Eigen::VectorXd& sigma, double spread2, double scale2) {
  const double least = std::max(1e-12 * scale2, 1e-300);
  return sigma.unaryExpr([&](double s) { return 1 / std::max(s * s + spread2, least); });
}

// Huber (1981), eq. 7.6.5: the covariance from the clipped residuals. The mean slope of the clipping is that of normal
// readings, not the count of these few: the count made intervals of 30 readings miss in 5.3 % of 12,000 series.
Eigen::MatrixXd covariance_of(const Eigen::MatrixXd& design, const Eigen::VectorXd& weight, const Eigen::VectorXd& r) {
  const double slope = 2 * cdf(boost::math::normal(), kClip) - 1;
  double psi2 = 0;
  for (const double one : r) psi2 += clipped(one) * clipped(one);
  const Eigen::MatrixXd information = design.transpose() * weight.asDiagonal() * design;
  const auto freedom = static_cast<double>(design.rows() - design.cols());
  return psi2 / freedom / (slope * slope) * information.inverse();
}

}  // namespace

std::optional<RobustFit> robust_fit(const Eigen::MatrixXd& design, const Eigen::VectorXd& y,
                                    const Eigen::VectorXd& sigma) {
  const Eigen::Index n = design.rows(), p = design.cols();
  if (p == 0 || n < p + 2) return std::nullopt;
  Eigen::ColPivHouseholderQR<Eigen::MatrixXd> ranked(design);
  ranked.setThreshold(kRankThreshold);
  if (ranked.rank() < p) return std::nullopt;

  const double scale2 = y.squaredNorm() / static_cast<double>(n);
  const double target = clipped_moment() * static_cast<double>(n - p);
  Eigen::VectorXd beta = ranked.solve(y);
  double spread2 = spread2_at(y - design * beta, sigma, target);
  Eigen::VectorXd r;
  for (int i = 0; i < kIterations; ++i) {
    r = standardised(y - design * beta, sigma, spread2);
    Eigen::VectorXd weight = precision(sigma, spread2, scale2);
    for (Eigen::Index k = 0; k < n; ++k) weight[k] *= std::abs(r[k]) > kClip ? kClip / std::abs(r[k]) : 1;
    const Eigen::VectorXd next = weighted_solution(design, y, weight);
    const double next_spread2 = spread2_at(y - design * next, sigma, target);
    const double change = (next - beta).norm() + std::abs(std::sqrt(next_spread2) - std::sqrt(spread2));
    beta = next;
    spread2 = next_spread2;
    if (change <= kSettled * std::sqrt(scale2)) break;
  }

  const Eigen::VectorXd error = y - design * beta;
  r = standardised(error, sigma, spread2);
  const boost::math::chi_squared chi2(static_cast<double>(n - p));
  RobustFit fit;
  fit.coefficients = beta;
  fit.covariance = covariance_of(design, precision(sigma, spread2, scale2), r);
  fit.freedom = static_cast<double>(n - p);
  // Bounds of the spread by the profile of the moment (Viechtbauer, Confidence intervals for the amount of
  // heterogeneity in meta-analysis, 2007, eq. 15), with the clipped sum in place of the sum.
  fit.spread = {std::sqrt(spread2), std::sqrt(spread2_at(error, sigma, clipped_moment() * quantile(chi2, 0.975))),
                std::sqrt(spread2_at(error, sigma, clipped_moment() * quantile(chi2, 0.025)))};
  fit.residuals = r;
  return fit;
}

namespace {

double half_width(const Estimate& e, double p) {
  const boost::math::students_t student(e.freedom);
  const boost::math::normal normal;
  const double floor_sigma = e.floor / quantile(normal, 0.975);
  return std::hypot(quantile(complement(student, p / 2)) * e.standard_error,
                    quantile(complement(normal, p / 2)) * floor_sigma);
}

}  // namespace

Interval interval_95(const Estimate& estimate) {
  const double half = half_width(estimate, 0.05);
  return {estimate.value, estimate.value - half, estimate.value + half};
}

double p_value(const Estimate& estimate) {
  const double distance = std::abs(estimate.value);
  double low = 1e-15, high = 1;   // half_width falls with p, to 0 at 1
  if (half_width(estimate, low) <= distance) return low;
  for (int i = 0; i < 80; ++i) {
    const double middle = std::sqrt(low * high);
    (half_width(estimate, middle) > distance ? low : high) = middle;
  }
  return std::sqrt(low * high);
}

}  // namespace focusfall
