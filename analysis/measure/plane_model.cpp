#include "analysis/measure/plane_model.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <utility>

#include "analysis/measure/edge_group.h"

namespace focusfall::plane_fit {
namespace {

constexpr int kLevels = 5;
constexpr int kGateCellPx = 64;              // level-0 side of the cells in which a level is judged; doubles per level
constexpr int kLeastEdgesInGate = 4;         // fewer do not open a level
constexpr double kWidestSigmaLevelPx = 2.5;  // as in a region (edge_group.cpp)
constexpr double kSharpVarianceLevelPx2 = 0.33;
constexpr double kResidualScale = 0.03;
constexpr double kSampleWeight = 6;           // of a sample from a whole square, beside single edges
constexpr int kClusterPx = 32;
constexpr int kDependencePx = 128;           // edges farther apart count as independent
constexpr int kMostClusters = 700;           // the search needs no more

// Scatter of c for one edge, and what more edges cannot lower: measured on rendered tiles, 20 %, 8 %, .3 px.
constexpr double kEdgeScatter = 0.2, kTileScatter = 0.08, kTileFloorPx = 0.3;

// Cost of a cluster that says nothing, between an inlier (about 1) and an outlier (9).
constexpr double kNeutralCost = 3;
constexpr double kMostCost = 9;
constexpr double kOutOfRangePx = 20;         // model beyond it: the reading may be anything above 10 px
constexpr double kNearLinePx = 1.2;          // there the edges' own sharpness varies by .6 px
constexpr double kNearLineVariance = 0.36;

// An inlier: within 3 standard deviations of the field, which are those of the cluster, the scatter between tiles of one
// blur (6 % and .2 px) and .8 px^2 on a sharp one. Measured on rendered tiles.
constexpr double kInlierCut = 3;
constexpr double kSystematic = 0.06, kSystematicPx = 0.2;
constexpr double kInlierFloorPx2 = 0.8;

struct Gate {
  int count = 0;
  double wide = 0, all = 0;

  bool open() const { return count >= kLeastEdgesInGate && wide <= 0.5 * all; }
};

// The gates of one level over the frame.
class GateMap {
 public:
  GateMap(int width_px, int height_px, int level)
      : side_px_(kGateCellPx << level), columns_(width_px / side_px_ + 1), rows_(height_px / side_px_ + 1),
        gates_(size_t(columns_) * rows_) {}
  Gate& at(const EdgeSample& edge) {
    const int column = std::clamp(int(edge.x) / side_px_, 0, columns_ - 1);
    const int row = std::clamp(int(edge.y) / side_px_, 0, rows_ - 1);
    return gates_[size_t(row) * size_t(columns_) + size_t(column)];
  }

 private:
  int side_px_, columns_, rows_;
  std::vector<Gate> gates_;
};

using Cell = std::pair<int, int>;

bool too_wide(const EdgeSample& edge) {
  const double scale = std::ldexp(1.0, 2 * edge.level);
  const double variance = std::max(double(edge.squared_disc_px2), 0.0) / (16 * scale) + kSharpVarianceLevelPx2;
  return edge.saturated || variance > kWidestSigmaLevelPx * kWidestSigmaLevelPx;
}

double quality(const EdgeSample& edge) {
  const double relative = edge.residual / kResidualScale;
  return 1 / (1 + relative * relative);
}

// The edges on the finest level that is open where they lie: one with enough edges, most of them narrow enough.
std::vector<EdgeSample> on_the_right_level(std::span<const EdgeSample> edges, const PlaneOptions& options) {
  std::vector<GateMap> gates;
  for (int level = 0; level < kLevels; ++level) gates.emplace_back(options.width_px, options.height_px, level);
  for (const EdgeSample& edge : edges) {
    if (edge.level >= kLevels) continue;
    Gate& gate = gates[edge.level].at(edge);
    ++gate.count;
    gate.all += quality(edge);
    if (too_wide(edge)) gate.wide += quality(edge);
  }
  std::vector<EdgeSample> kept;
  for (const EdgeSample& edge : edges) {
    if (edge.level >= kLevels || too_wide(edge)) continue;
    int level = 0;
    while (level < edge.level && !gates[size_t(level)].at(edge).open()) ++level;
    if (level == edge.level && gates[size_t(level)].at(edge).open()) kept.push_back(edge);
  }
  return kept;
}

std::vector<Cluster> clusters_of(const std::vector<Point>& points, double scale) {
  std::map<Cell, std::vector<size_t>> cells;
  for (size_t i = 0; i < points.size(); ++i)
    cells[{int(std::floor(points[i].x * scale / kClusterPx)), int(std::floor(points[i].y * scale / kClusterPx))}]
        .push_back(i);
  std::vector<Cluster> clusters;
  std::vector<double> values, weights;
  for (const auto& [cell, members] : cells) {
    Cluster cluster;
    values.clear();
    weights.clear();
    double sum = 0;
    for (size_t i : members) {
      values.push_back(points[i].squared_disc_px2);
      weights.push_back(points[i].weight);
      sum += points[i].weight;
      cluster.x += points[i].weight * points[i].x;
      cluster.y += points[i].weight * points[i].y;
    }
    cluster.x /= sum;
    cluster.y /= sum;
    const WeightedMedian median = weighted_median(values, weights);
    cluster.squared_disc_px2 = median.value;
    const double disc = blur_disc_px(median.value);
    cluster.sigma_px = std::hypot(kEdgeScatter * disc / std::sqrt(median.effective_count), kTileScatter * disc,
                                  kTileFloorPx);
    clusters.push_back(cluster);
  }
  // A fixed stride over the cells in order keeps every part of the frame.
  if (int(clusters.size()) > kMostClusters) {
    std::vector<Cluster> thinned;
    const double stride = double(clusters.size()) / kMostClusters;
    for (int i = 0; i < kMostClusters; ++i) thinned.push_back(clusters[size_t((i + 0.5) * stride)]);
    clusters = std::move(thinned);
  }
  return clusters;
}

double cluster_cost(const Cluster& cluster, const Field& field) {
  const double l = signed_disc(field, cluster.x, cluster.y);
  const double model = std::sqrt(std::max(l * l + field.floor_px2, 0.0));
  const double disc = blur_disc_px(cluster.squared_disc_px2);
  if (model > kOutOfRangePx) {
    const double missing = std::clamp((10 - disc) / 3, 0.0, 3.0);
    return std::max(2.5, missing * missing);
  }
  double variance = cluster.sigma_px * cluster.sigma_px + std::pow(kTileScatter * model, 2);
  if (model < kNearLinePx) variance += kNearLineVariance;
  const double r = disc - model;
  return std::min(r * r / variance, kMostCost);
}

}  // namespace

bool is_inlier(const Cluster& cluster, const Field& field) {
  const double l = signed_disc(field, cluster.x, cluster.y), model = std::abs(l);
  const double sigma_c = std::hypot(cluster.sigma_px, kSystematic * model, kSystematicPx);
  const double sigma = std::hypot(2 * std::max(model, 0.5) * sigma_c, kInlierFloorPx2);
  return std::abs(cluster.squared_disc_px2 - l * l - field.floor_px2) < kInlierCut * sigma;
}

double edge_sigma_px2(double squared_disc_px2) { return std::hypot(0.2 * squared_disc_px2, 0.8); }

Direction direction_of(NearSide side) {
  switch (side) {
    case NearSide::bottom: return {0, 1};
    case NearSide::top: return {0, -1};
    case NearSide::left: return {-1, 0};
    case NearSide::right: return {1, 0};
  }
  return {0, 1};
}

Scene scene_of(std::span<const EdgeSample> edges, std::span<const BlurSample> samples, const PlaneOptions& options) {
  Scene scene;
  scene.centre_x_px = options.width_px / 2.0;
  scene.centre_y_px = options.height_px / 2.0;
  scene.scale_px = std::max(options.width_px, options.height_px) / 2.0;
  const int across = options.width_px / kDependencePx + 2;
  const auto add = [&](double x_px, double y_px, double s, double weight) {
    scene.points.push_back({(x_px - scene.centre_x_px) / scene.scale_px, (y_px - scene.centre_y_px) / scene.scale_px, s,
                            weight, int(y_px / kDependencePx) * across + int(x_px / kDependencePx)});
  };
  for (const EdgeSample& edge : on_the_right_level(edges, options))
    add(edge.x, edge.y, edge.squared_disc_px2, quality(edge));
  for (const BlurSample& sample : samples) add(sample.x, sample.y, sample.squared_disc_px2, kSampleWeight);
  scene.clusters = clusters_of(scene.points, scene.scale_px);
  return scene;
}

Score score_of(const Scene& scene, const Field& field, const Direction& near, std::vector<int>& order) {
  const auto along = [&](const Cluster& c) { return near.x * c.x + near.y * c.y; };
  if (order.size() != scene.clusters.size()) {
    order.resize(scene.clusters.size());
    for (size_t i = 0; i < order.size(); ++i) order[i] = int(i);
    std::stable_sort(order.begin(), order.end(), [&](int a, int b) {
      return along(scene.clusters[size_t(a)]) > along(scene.clusters[size_t(b)]);
    });
  }
  Score best;
  double sum = 0;
  for (size_t i = 0; i < order.size(); ++i) {
    const Cluster& cluster = scene.clusters[size_t(order[i])];
    sum += cluster_cost(cluster, field) - kNeutralCost;
    if (sum < best.cost) best = {sum, along(cluster), int(i) + 1};
  }
  return best;
}

}  // namespace focusfall::plane_fit
