#include "analysis/compare/lens_field.h"

#include <Eigen/Cholesky>
#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>

namespace focusfall {
namespace {

constexpr double kNormal95 = 1.959964;
constexpr double kRestSigmaPx2 = 1.5;      // prior of S0 (measurement of rendered planes)
constexpr double kModelSigmaPx2 = 0.8;     // what the model leaves over of S
constexpr double kClip = 2.5;              // Huber, standard deviations
constexpr int kIterations = 30;
constexpr Eigen::Index kShared = 4;        // a, b, h, S0; then one g a frame

struct Problem {
  std::span<const std::vector<FieldTile>> frames;
};

double signed_disc(const Eigen::VectorXd& p, const FieldTile& t, Eigen::Index frame) {
  return p[kShared + frame] + p[0] * t.x + p[1] * t.y + p[2] * (t.x * t.x + t.y * t.y);
}

struct Normal {
  Eigen::MatrixXd matrix;
  Eigen::VectorXd gradient;
  double cost = 0;          // Huber's
};

Normal normal_equations(const Problem& problem, const Eigen::VectorXd& p) {
  const Eigen::Index n = p.size();
  Normal normal{Eigen::MatrixXd::Zero(n, n), Eigen::VectorXd::Zero(n), 0};
  Eigen::VectorXd row(n);
  for (Eigen::Index f = 0; f < static_cast<Eigen::Index>(problem.frames.size()); ++f) {
    for (const FieldTile& tile : problem.frames[static_cast<std::size_t>(f)]) {
      const double l = signed_disc(p, tile, f), sigma = std::hypot(tile.sigma_px2, kModelSigmaPx2);
      const double r = (tile.squared_disc_px2 - l * l - p[3]) / sigma, size = std::abs(r);
      const double weight = size > kClip ? kClip / size : 1;
      normal.cost += size > kClip ? kClip * (2 * size - kClip) : r * r;
      row.setZero();
      row[0] = 2 * l * tile.x / sigma;
      row[1] = 2 * l * tile.y / sigma;
      row[2] = 2 * l * (tile.x * tile.x + tile.y * tile.y) / sigma;
      row[3] = 1 / sigma;
      row[kShared + f] = 2 * l / sigma;
      normal.matrix += weight * row * row.transpose();
      normal.gradient += weight * r * row;
    }
  }
  normal.matrix(3, 3) += 1 / (kRestSigmaPx2 * kRestSigmaPx2);
  normal.gradient[3] -= p[3] / (kRestSigmaPx2 * kRestSigmaPx2);
  normal.cost += p[3] * p[3] / (kRestSigmaPx2 * kRestSigmaPx2);
  return normal;
}

// Levenberg-Marquardt (Marquardt, An algorithm for least-squares estimation of nonlinear parameters, 1963).
double descend(const Problem& problem, Eigen::VectorXd& p) {
  double damping = 1e-2;
  Normal here = normal_equations(problem, p);
  for (int i = 0; i < kIterations; ++i) {
    Eigen::MatrixXd damped = here.matrix;
    damped.diagonal() += damping * (here.matrix.diagonal().array() + 1e-3).matrix();
    const Eigen::VectorXd next = p + damped.ldlt().solve(here.gradient);
    Normal there = normal_equations(problem, next);
    if (!(there.cost < here.cost)) {
      damping *= 8;
      if (damping > 1e8) break;
      continue;
    }
    const double gain = here.cost - there.cost;
    p = next;
    here = std::move(there);
    damping = std::max(damping / 6, 1e-9);
    if (gain < 1e-9 * (1 + here.cost)) break;
  }
  return here.cost;
}

// One frame from a grid of starts: four axes, both signs of slope and curvature against a centre blur >= 0.
Eigen::VectorXd single_fit(std::span<const std::vector<FieldTile>> frame, double& cost) {
  const Problem problem{frame};
  Eigen::VectorXd best;
  cost = std::numeric_limits<double>::infinity();
  for (int axis = 0; axis < 8; ++axis) {
    for (const double slope : {1.0, 5.0}) {
      for (const double curvature : {-4.0, 0.0, 4.0}) {
        for (const double centre : {0.3, 3.0, 8.0}) {
          Eigen::VectorXd p(kShared + 1);
          const double angle = axis * std::numbers::pi / 4;
          p << slope * std::cos(angle), slope * std::sin(angle), curvature, 0, centre;
          const double found = descend(problem, p);
          if (found < cost) {
            cost = found;
            best = p;
          }
        }
      }
    }
  }
  return best;
}

// The shared field of all frames: each is started from the frame whose field is largest, once with either sign of g.
std::optional<Eigen::VectorXd> joint_fit(std::span<const std::vector<FieldTile>> frames) {
  const auto n = static_cast<Eigen::Index>(frames.size());
  Eigen::VectorXd best;
  double best_cost = std::numeric_limits<double>::infinity();
  for (Eigen::Index seed = 0; seed < n; ++seed) {
    double cost = 0;
    const Eigen::VectorXd one = single_fit(frames.subspan(static_cast<std::size_t>(seed), 1), cost);
    Eigen::VectorXd p(kShared + n);
    p.head(kShared) = one.head(kShared);
    for (Eigen::Index f = 0; f < n; ++f) {
      double least = std::numeric_limits<double>::infinity();
      for (double g = -24; g <= 24; g += 0.5) {
        Eigen::VectorXd trial(kShared + 1);
        trial << one.head(kShared), g;
        const double found = normal_equations({frames.subspan(static_cast<std::size_t>(f), 1)}, trial).cost;
        if (found < least) {
          least = found;
          p[kShared + f] = g;
        }
      }
    }
    cost = descend({frames}, p);
    if (cost < best_cost) {
      best_cost = cost;
      best = p;
    }
  }
  if (best.size() == 0 || !best.allFinite()) return std::nullopt;
  return best;
}

// +1 or -1 that makes g run with the travel, 0 where it does not show: g must change all along in one direction but for
// one step in four.
int travel_sign(const Eigen::VectorXd& p, FocusTravel travel) {
  const Eigen::Index n = p.size() - kShared;
  if (travel == FocusTravel::unknown || n < 3) return 0;
  int up = 0, down = 0;
  for (Eigen::Index f = 1; f < n; ++f) (p[kShared + f] > p[kShared + f - 1] ? up : down) += 1;
  if (4 * std::min(up, down) > n - 1) return 0;
  const int found = up > down ? 1 : -1;
  return travel == FocusTravel::near_to_far ? found : -found;
}

}  // namespace

std::optional<FieldFit> field_of_focus(std::span<const std::vector<FieldTile>> frames, FocusTravel travel) {
  std::size_t tiles = 0;
  for (const auto& frame : frames) {
    if (frame.size() < static_cast<std::size_t>(kLeastFieldTiles)) return std::nullopt;
    tiles += frame.size();
  }
  if (frames.empty()) return std::nullopt;
  const auto found = joint_fit(frames);
  if (!found) return std::nullopt;
  Eigen::VectorXd p = *found;
  const Normal normal = normal_equations({frames}, p);
  const Eigen::LDLT<Eigen::MatrixXd> solver(normal.matrix);
  if (solver.info() != Eigen::Success || !solver.isPositive()) return std::nullopt;
  const double freedom = std::max(1.0, static_cast<double>(tiles) - static_cast<double>(p.size()));
  FieldFit fit;
  fit.chi2_per_freedom = normal.cost / freedom;
  const Eigen::MatrixXd covariance =
      std::max(1.0, fit.chi2_per_freedom) * solver.solve(Eigen::MatrixXd::Identity(p.size(), p.size()));

  const int sign = travel_sign(p, travel);
  fit.signed_field = sign != 0;
  if (sign < 0) p = -p;   // S0 is not used below
  const double a = p[0], b = p[1], size = std::hypot(a, b);
  fit.x_tilt_px = a;
  fit.y_tilt_px = b;
  fit.x_sigma_px = std::sqrt(covariance(0, 0));
  fit.y_sigma_px = std::sqrt(covariance(1, 1));
  const double variance = size > 0 ? (a * a * covariance(0, 0) + 2 * a * b * covariance(0, 1) + b * b * covariance(1, 1)) /
                                         (size * size)
                                   : covariance(0, 0);
  const double half = kNormal95 * std::sqrt(variance);
  fit.tilt_px = {size, std::max(0.0, size - half), size + half};
  double axis = std::atan2(b, a) * 180 / std::numbers::pi;
  if (axis < 0) axis += 180;
  fit.axis_deg = axis >= 180 ? axis - 180 : axis;
  const double h = fit.signed_field ? p[2] : std::abs(p[2]), curve = kNormal95 * std::sqrt(covariance(2, 2));
  fit.curvature_px = {h, fit.signed_field ? h - curve : std::max(0.0, h - curve), h + curve};
  return fit;
}

FieldParts field_parts(const FieldFit& upright, const FieldFit& upside_down) {
  // In the frame of the sensor the wall is turned by half a circle, lens and body are not.
  FieldParts parts;
  parts.camera_x_px = (upright.x_tilt_px + upside_down.x_tilt_px) / 2;
  parts.camera_y_px = (upright.y_tilt_px + upside_down.y_tilt_px) / 2;
  parts.wall_x_px = (upright.x_tilt_px - upside_down.x_tilt_px) / 2;
  parts.wall_y_px = (upright.y_tilt_px - upside_down.y_tilt_px) / 2;
  const double x = std::hypot(upright.x_sigma_px, upside_down.x_sigma_px) / 2;
  const double y = std::hypot(upright.y_sigma_px, upside_down.y_sigma_px) / 2;
  parts.camera_sigma_px = parts.wall_sigma_px = std::max(x, y);
  return parts;
}

}  // namespace focusfall
