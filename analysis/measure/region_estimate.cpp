#include "analysis/measure/region_estimate.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>

#include "analysis/optics/system_response.h"

namespace focusfall {
namespace {

constexpr double kNormal95 = 1.96;

// Fusion (measured on rendered tiles, see the accuracy tables).
constexpr double kSpectralFromPx = 5.0;          // below, where edges read < 4 px too, edges alone: the spectrum is only
constexpr double kEdgesAlonePx = 4.0;            //   given from 4 px up, so that near it only its upper errors are seen
constexpr double kSpectralRelative = 0.04, kSpectralAbsolute_px = 0.25;
constexpr double kDisagree = 2.0;                // standard deviations of the difference
constexpr double kTextureSpread = 0.06;          // of c: spectrum alone, on crowded texture
constexpr double kSpectrumAlone = 0.12;          // of c: no edge at all confirms it

// Splitting in two.
constexpr double kLeastShare = 0.25;             // of the weight in the sharper group (design)
constexpr int kLeastGroupEdges = 12;             // in each group (design)
constexpr double kLeastRatio = 1.6;              // of the two discs: nearer ones are scatter
constexpr double kLeastGap = 2.5;                // difference of the means in pooled standard deviations
constexpr double kPureCell = 0.9;                // share of one group in a cell that belongs to it
constexpr double kLeastPlaced = 0.7;             // of each group's weight in cells that belong to it
constexpr int kLeastCellEdges = 4;               // fewer are pure by chance
constexpr int kCells = 4;                        // each way

double signed_root(double squared) { return squared >= 0 ? std::sqrt(squared) : -std::sqrt(-squared); }
double signed_square(double root) { return root * std::abs(root); }

// Variance of pixel box and pyramid filters on a level, px^2 of that level.
double system_variance_px2(int level) {
  double filters = 0;
  for (int k = 1; k <= level; ++k) filters = (filters + 0.75) / 4;
  return filters + 1.0 / 12 / std::pow(4.0, level);
}

struct Point {
  double log_disc = 0;
  double weight = 0;
  int cell = 0;
  bool sharp = false;
};

struct GroupMoments {
  double weight = 0, sum = 0, square = 0;
  int count = 0;
  double mean() const { return sum / weight; }
  double variance() const { return std::max(square / weight - mean() * mean(), 0.0); }
};

GroupMoments moments(const std::vector<Point>& points, bool sharp) {
  GroupMoments m;
  for (const Point& p : points) {
    if (p.sharp != sharp) continue;
    m.weight += p.weight;
    m.sum += p.weight * p.log_disc;
    m.square += p.weight * p.log_disc * p.log_disc;
    ++m.count;
  }
  return m;
}

// Two means in log c, started at the ends of the range.
void split(std::vector<Point>& points) {
  const auto [low, high] = std::minmax_element(points.begin(), points.end(), [](const Point& a, const Point& b) {
    return a.log_disc < b.log_disc;
  });
  double threshold = 0.5 * (low->log_disc + high->log_disc);
  for (int step = 0; step < 20; ++step) {
    for (Point& p : points) p.sharp = p.log_disc < threshold;
    const GroupMoments sharp = moments(points, true), soft = moments(points, false);
    if (sharp.count == 0 || soft.count == 0) return;
    threshold = 0.5 * (sharp.mean() + soft.mean());
  }
}

// Whether the two groups lie in different places: most of each in cells that hold hardly any of the other. The widths
// of one blur scatter too, but all over the region.
bool lie_apart(const std::vector<Point>& points) {
  std::array<double, kCells * kCells> sharp{}, all{};
  std::array<int, kCells * kCells> count{};
  for (const Point& p : points) {
    const auto cell = static_cast<std::size_t>(p.cell);
    all[cell] += p.weight;
    if (p.sharp) sharp[cell] += p.weight;
    ++count[cell];
  }
  double sharp_total = 0, soft_total = 0, sharp_placed = 0, soft_placed = 0;
  for (std::size_t i = 0; i < all.size(); ++i) {
    sharp_total += sharp[i];
    soft_total += all[i] - sharp[i];
    if (count[i] < kLeastCellEdges) continue;
    if (sharp[i] >= kPureCell * all[i]) sharp_placed += sharp[i];
    if (sharp[i] <= (1 - kPureCell) * all[i]) soft_placed += all[i] - sharp[i];
  }
  return sharp_placed >= kLeastPlaced * sharp_total && soft_placed >= kLeastPlaced * soft_total;
}

}  // namespace

BlurEstimate blur_estimate(double squared_disc_px2, double sigma_px, Bound bound) {
  BlurEstimate estimate;
  estimate.squared_disc_px2 = squared_disc_px2;
  // Bounds of c carried to S; near c = 0 that would shrink them to nothing, so S keeps the spread it has at 1 px.
  const double root = signed_root(squared_disc_px2);
  const double half = kNormal95 * sigma_px;
  estimate.squared_disc_low_px2 = std::min(signed_square(root - half), squared_disc_px2 - 2 * half);
  estimate.squared_disc_high_px2 = std::max(signed_square(root + half), squared_disc_px2 + 2 * half);
  estimate.edge_rise_px = disc_edge_rise_px(blur_disc_px(squared_disc_px2));
  estimate.mtf50_cycles_per_px = disc_mtf50_cycles_per_px(blur_disc_px(squared_disc_px2));
  estimate.bound = bound;
  return estimate;
}

std::optional<BlurEstimate> fused_blur(const std::optional<EdgeBlur>& edges,
                                       const std::optional<SpectralBlur>& spectrum) {
  if (!edges && !spectrum) return std::nullopt;
  const double spectral_c = spectrum ? spectrum->disc_px : 0;
  const double spectral_sigma =
      spectrum ? std::hypot(spectrum->sigma_px, kSpectralRelative * spectral_c, kSpectralAbsolute_px) : 0;
  if (!edges) {
    return blur_estimate(spectral_c * spectral_c, std::max(spectral_sigma, kSpectrumAlone * spectral_c));
  }
  const double edge_c = signed_root(edges->squared_disc_px2);
  if (!spectrum || (spectral_c < kSpectralFromPx && edge_c < kEdgesAlonePx && !edges->lower_bound)) {
    return blur_estimate(edges->squared_disc_px2, edges->sigma_px, edges->lower_bound ? Bound::lower : Bound::none);
  }
  const double difference = spectral_c - edge_c;
  const double tolerance = kDisagree * std::hypot(edges->sigma_px, spectral_sigma);
  if (edges->lower_bound || difference > tolerance) {
    return blur_estimate(spectral_c * spectral_c, std::max(spectral_sigma, kTextureSpread * spectral_c));
  }
  if (difference < -tolerance) return blur_estimate(edges->squared_disc_px2, std::max(edges->sigma_px, -difference / 2));
  const double we = 1 / (edges->sigma_px * edges->sigma_px), ws = 1 / (spectral_sigma * spectral_sigma);
  const double c = (we * edge_c + ws * spectral_c) / (we + ws);
  return blur_estimate(signed_square(c), 1 / std::sqrt(we + ws));
}

std::optional<SpectralBlur> region_spectrum(const Pyramid& pyramid, PixelRect region, SpectralEstimator& estimator,
                                            cv::Mat& scratch) {
  constexpr double kCoarserFrom = 14;   // level px: the tables and the tile hold wider discs, but less exactly
  std::optional<SpectralBlur> best;
  const PixelRect whole = pyramid.region;
  const int x0 = std::max(region.x, whole.x), y0 = std::max(region.y, whole.y);
  const int x1 = std::min(region.x + region.width, whole.x + whole.width);
  const int y1 = std::min(region.y + region.height, whole.y + whole.height);
  for (int level = 0; level < Pyramid::kLevels; ++level) {
    if (std::min(x1 - x0, y1 - y0) >> level < SpectralEstimator::kTile) break;
    const cv::Mat* values = &scratch;
    cv::Mat window;
    if (level == 0) {
      const cv::Mat codes = pyramid.picture->codes(cv::Rect(x0, y0, x1 - x0, y1 - y0));
      const auto& curve = pyramid.picture->linear_of_code;
      scratch.create(codes.rows, codes.cols, CV_32FC1);
      for (int y = 0; y < codes.rows; ++y) {
        float* row = scratch.ptr<float>(y);
        if (codes.depth() == CV_16U) {
          const auto* in = codes.ptr<std::uint16_t>(y);
          for (int x = 0; x < codes.cols; ++x) row[x] = curve[in[x]];
        } else {
          const auto* in = codes.ptr<std::uint8_t>(y);
          for (int x = 0; x < codes.cols; ++x) row[x] = curve[in[x]];
        }
      }
    } else {
      const cv::Mat& coarse = pyramid.levels[static_cast<std::size_t>(level)];
      if (coarse.empty()) break;
      const int lx = (x0 - whole.x) >> level, ly = (y0 - whole.y) >> level;
      window = coarse(cv::Rect(lx, ly, std::min((x1 - x0) >> level, coarse.cols - lx),
                               std::min((y1 - y0) >> level, coarse.rows - ly)));
      values = &window;
    }
    const auto found = estimator.measure(*values, system_variance_px2(level));
    const double scale = 1 << level;
    if (found) {
      best = SpectralBlur{found->disc_px * scale, found->sigma_px * scale, found->low_px * scale,
                          found->high_px * scale, found->rings};
      if (found->disc_px < kCoarserFrom) break;
    }
  }
  return best;
}

EdgeGroups edge_groups(std::span<const EdgeSample> edges, PixelRect region) {
  std::vector<Point> points;
  for (const EdgeSample& edge : edges) {
    const int cx = std::clamp(static_cast<int>((edge.x - static_cast<float>(region.x)) * kCells /
                                               static_cast<float>(region.width)), 0, kCells - 1);
    const int cy = std::clamp(static_cast<int>((edge.y - static_cast<float>(region.y)) * kCells /
                                               static_cast<float>(region.height)), 0, kCells - 1);
    // Below 1 px differences of c mean nothing.
    const double c = std::max(blur_disc_px(edge.squared_disc_px2), 1.0);
    const double q = edge.residual / 0.03;
    points.push_back({std::log(c), static_cast<double>(edge.amplitude) * edge.amplitude / (1 + q * q),
                      cy * kCells + cx});
  }
  if (static_cast<int>(points.size()) < 2 * kLeastGroupEdges) return {};
  split(points);
  const GroupMoments sharp = moments(points, true), soft = moments(points, false);
  if (sharp.count < kLeastGroupEdges || soft.count < kLeastGroupEdges) return {};
  const double total = sharp.weight + soft.weight;
  if (sharp.weight < kLeastShare * total) return {};
  const double gap = soft.mean() - sharp.mean();
  const double pooled =
      std::sqrt((sharp.weight * sharp.variance() + soft.weight * soft.variance()) / total);
  if (gap < std::log(kLeastRatio) || gap < kLeastGap * pooled || !lie_apart(points)) return {};

  EdgeGroups groups;
  for (std::size_t i = 0; i < points.size(); ++i) {
    (points[i].sharp ? groups.sharper : groups.softer).push_back(edges[i]);
  }
  return groups;
}

}  // namespace focusfall
