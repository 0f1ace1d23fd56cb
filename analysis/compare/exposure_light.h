// Levels in the order of time under a light that may wander: a regression whose errors are white noise plus a random
// walk, the light. Fitted by maximum likelihood; the walk is taken out by its Kalman filter (R. E. Kalman, A New
// Approach to Linear Filtering and Prediction Problems, 1960), which turns the problem into ordinary least squares.
#pragma once

#include <Eigen/Dense>
#include <vector>

namespace focusfall {

// What is known of each observation beside its value.
struct LightSteps {
  std::vector<double> variance;   // of the white noise, relative to one another, > 0
  std::vector<double> gap;        // time to the observation before, in usual gaps, > 0; the first is not used
};

struct LightFit {
  Eigen::VectorXd coefficients;
  Eigen::MatrixXd covariance;     // of the coefficients
  double sigma_ev = 0;            // of white noise of relative variance 1
  double walk_ratio = 0;          // variance of the walk in a usual gap / sigma^2
  double minus_two_log_likelihood = 0;
  int degrees_of_freedom = 0;
};

// `design` has one column per coefficient, the first of ones; columns must be linearly independent and fewer than rows.
LightFit fit_light(const Eigen::MatrixXd& design, const Eigen::VectorXd& levels_ev, const LightSteps& steps);

// The walk, smoothed (H. E. Rauch, F. Tung, C. T. Striebel, Maximum likelihood estimates of linear dynamic systems,
// 1965), of what the coefficients leave, with its standard error.
struct SmoothedLight {
  std::vector<double> level_ev, sigma_ev;
};
SmoothedLight smoothed_light(const Eigen::VectorXd& remainder_ev, const LightFit& fit, const LightSteps& steps);

// Whether `column` adds nothing that the columns of `design` do not span.
bool is_spanned(const Eigen::MatrixXd& design, const Eigen::VectorXd& column);

}  // namespace focusfall
