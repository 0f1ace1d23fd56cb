// Edges as the estimator would deliver them, drawn from its noise model: no pixels.
#pragma once

#include <cmath>
#include <functional>
#include <numbers>
#include <random>
#include <vector>

#include "analysis/measure/measurement.h"

namespace focusfall {

struct EdgeScatter {
  double relative = 0.15;        // of S: scatter of single edges on mixed content
  double absolute_px2 = 0.6;     // and what is left on a sharp edge
  double outlier_share = 0.08;   // soft structure and crossing edges, which read too wide
  double outlier_px = 8;         // up to this disc
};

class EdgeSimulator {
 public:
  explicit EdgeSimulator(unsigned seed) : random_(seed) {}

  double uniform(double low, double high) { return std::uniform_real_distribution<double>(low, high)(random_); }
  double normal() { return std::normal_distribution<double>()(random_); }

  // One edge at (x, y) across `normal_rad` whose true squared disc is `squared_disc_px2`.
  EdgeSample edge(double x, double y, double normal_rad, double squared_disc_px2, const EdgeScatter& scatter) {
    EdgeSample sample;
    sample.x = float(x);
    sample.y = float(y);
    const double turn = uniform(0, 1) < 0.5 ? 0 : std::numbers::pi;
    sample.normal_x = float(std::cos(normal_rad + turn));
    sample.normal_y = float(std::sin(normal_rad + turn));
    double s = squared_disc_px2 * (1 + scatter.relative * normal()) + scatter.absolute_px2 * normal();
    if (uniform(0, 1) < scatter.outlier_share) s += std::pow(uniform(0, scatter.outlier_px), 2);
    sample.squared_disc_px2 = float(s);
    sample.amplitude = float(uniform(0.05, 0.5));
    sample.residual = float(uniform(0.005, 0.05));
    // The finest level whose window holds the edge.
    const double sigma_px = std::sqrt(std::max(s, 0.0) / 16 + 0.33);
    while (sample.level < 4 && sigma_px / (1 << sample.level) > 2.4) ++sample.level;
    sample.saturated = sigma_px / (1 << sample.level) > 2.65;
    return sample;
  }

  // `count` edges of all directions in a square of `side_px` at the origin.
  std::vector<EdgeSample> region(int count, double side_px, const std::function<double(double)>& squared_disc_at_normal,
                                 const EdgeScatter& scatter = {}) {
    std::vector<EdgeSample> edges;
    for (int i = 0; i < count; ++i) {
      const double angle = uniform(0, std::numbers::pi);
      edges.push_back(edge(uniform(0, side_px), uniform(0, side_px), angle, squared_disc_at_normal(angle), scatter));
    }
    return edges;
  }

 private:
  std::mt19937 random_;
};

}  // namespace focusfall
