// A linear model fitted to readings that scatter and that carry an error of their own, robust against single strays.
//
//   y_i = x_i beta + e_i,   e_i ~ N(0, spread^2 + sigma_i^2)
//
// beta by Huber's M-estimate (Robust Estimation of a Location Parameter, 1964), the unknown spread by the matching
// moment equation, sum psi(r_i)^2 = kappa (n - p), which is that of Paule and Mandel (Consensus values and weighting
// factors, 1982, eq. 9) with clipped residuals. The covariance is the clipped residuals' own, as in Hartung and Knapp
// (On tests of the overall treatment effect in meta-analysis, 2001) and Huber (Robust Statistics, 1981, eq. 7.6.5),
// so that it does not hang on the errors that the readings claim.
#pragma once

#include <Eigen/Core>
#include <optional>

#include "analysis/conventions.h"

namespace focusfall {

struct RobustFit {
  Eigen::VectorXd coefficients;
  Eigen::MatrixXd covariance;
  double freedom = 0;             // degrees of freedom of Student's distribution, > 0
  Interval spread;                // standard deviation beside the readings' own errors; 95 % bounds
  Eigen::VectorXd residuals;      // in their own standard deviations, spread included
};

// `design` has one row a reading, `sigma` is >= 0 and in the unit of `y`. Nothing where there are not at least two rows
// more than columns, or where the columns do not tell the coefficients apart.
std::optional<RobustFit> robust_fit(const Eigen::MatrixXd& design, const Eigen::VectorXd& y,
                                    const Eigen::VectorXd& sigma);

// An estimate that scatter and an error shared by all readings make uncertain.
struct Estimate {
  double value = 0;
  double standard_error = 0;      // from the scatter
  double freedom = 1;             // of that standard error
  double floor = 0;               // half width, 95 %, of the error that more readings do not take away
};

// Student's interval and the floor, added in squares: the two are independent.
Interval interval_95(const Estimate& estimate);

// Two-sided probability of a value at least so far from 0 if 0 is true; below .05 exactly where interval_95 excludes 0.
double p_value(const Estimate& estimate);

}  // namespace focusfall
