// A frame of ground, background and a subject as the edge estimator would see it: edges on all pyramid levels, drawn
// from the noise model, no pixels.
#pragma once

#include <cmath>
#include <functional>
#include <numbers>
#include <optional>
#include <vector>

#include "analysis/measure/plane.h"
#include "tests/measure/simulated_edges.h"

namespace focusfall {

struct Ground {
  int width_px = 3000, height_px = 2000;
  double slope = 0.02;            // k, px of signed blur per px, towards the near side
  double lean_deg = 0;            // of the horizon
  double line_px = 1200;          // row of best focus at the middle of the frame
  double horizon_px = 0;          // rows above it show the background
  double background_px = 40;      // its disc
  double baseline_px2 = 0;
  double clutter_share = 0;       // of the ground's area, hidden by things of any blur
  FractionBox clear;              // where none of them lies
  double edges_per_block = 2.5;   // on every level, of 32 x 32 px
  EdgeScatter scatter{0.2, 0.8, 0.08, 8};

  double signed_blur_px(double x, double y) const {
    const double lean = lean_deg * std::numbers::pi / 180;
    return slope * ((x - width_px / 2.0) * std::sin(lean) + (y - line_px) * std::cos(lean));
  }
};

// Something of one blur that hides the ground.
struct Figure {
  FractionBox box;
  double disc_px = 0;
};

class GroundSimulator {
 public:
  explicit GroundSimulator(unsigned seed) : draw_(seed) {}
  EdgeSimulator& draw() { return draw_; }

  std::vector<EdgeSample> edges(const Ground& ground, const std::vector<Figure>& figures = {}) {
    const std::vector<Figure> clutter = clutter_of(ground);
    std::vector<EdgeSample> result;
    for (int level = 0; level < 5; ++level) {
      const double block = 32 << level;
      const double expected = ground.edges_per_block * ground.width_px * ground.height_px / (block * block);
      for (int i = 0; i < int(expected); ++i)
        if (auto edge = one(ground, figures, clutter, level)) result.push_back(*edge);
    }
    return result;
  }

 private:
  std::vector<Figure> clutter_of(const Ground& ground) {
    std::vector<Figure> clutter;
    double area = 0;
    while (area < ground.clutter_share) {
      const double w = draw_.uniform(0.03, 0.1), h = draw_.uniform(0.05, 0.15);
      const FractionBox box{draw_.uniform(0, 1 - w), draw_.uniform(0, 1 - h), w, h};
      const double disc_px = draw_.uniform(0, 15);
      const FractionBox& c = ground.clear;
      const bool in_the_way = c.width > 0 && box.x < c.x + c.width && c.x < box.x + w && box.y < c.y + c.height && c.y < box.y + h;
      if (in_the_way) continue;
      clutter.push_back({box, disc_px});
      area += w * h;
    }
    return clutter;
  }

  static std::optional<double> hidden(const std::vector<Figure>& figures, double fx, double fy) {
    for (const Figure& f : figures)
      if (fx >= f.box.x && fx < f.box.x + f.box.width && fy >= f.box.y && fy < f.box.y + f.box.height) return f.disc_px;
    return std::nullopt;
  }

  std::optional<EdgeSample> one(const Ground& ground, const std::vector<Figure>& figures,
                                const std::vector<Figure>& clutter, int level) {
    const double x = draw_.uniform(0, ground.width_px), y = draw_.uniform(0, ground.height_px);
    const double fx = x / ground.width_px, fy = y / ground.height_px;
    double disc = y < ground.horizon_px ? ground.background_px : std::abs(ground.signed_blur_px(x, y));
    if (y >= ground.horizon_px)
      if (const auto c = hidden(clutter, fx, fy)) disc = *c;
    if (const auto c = hidden(figures, fx, fy)) disc = *c;

    EdgeSample edge = draw_.edge(x, y, draw_.uniform(0, std::numbers::pi), disc * disc, ground.scatter);
    // On a coarse level the sharp end is known in that level's pixels only.
    const double scale = std::ldexp(1.0, 2 * level);
    edge.squared_disc_px2 += float(0.3 * (scale - 1) * draw_.normal() + ground.baseline_px2);
    edge.level = std::uint8_t(level);
    const double sigma = std::sqrt(std::max(double(edge.squared_disc_px2), 0.0) / (16 * scale) + 0.33);
    edge.saturated = sigma > 2.65;
    // Edges wider than the window are lost one by one.
    if (sigma > 4.5 || (sigma > 2.5 && draw_.uniform(0, 1) < (sigma - 2.5) / 2)) return std::nullopt;
    return edge;
  }

  EdgeSimulator draw_;
};

}  // namespace focusfall
