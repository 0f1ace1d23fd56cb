// Start values for the plane fit: fields through two or three local blur values, with every choice of signs, kept by
// their score (random sample consensus, Fischler & Bolles 1981). Unlike a grid it has no resolution of its own, so it
// finds slopes from .0012 to .25 and lines inside and outside the frame alike.
#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numbers>

#include "analysis/measure/plane_model.h"

namespace focusfall::plane_fit {
namespace {

constexpr int kSamples = 2500;               // pairs and triples drawn
constexpr int kProbe = 120;                  // clusters on which every field is tried
constexpr int kSurvivors = 80;               // tried on all of them
constexpr int kKept = 6;                     // candidates for refinement
constexpr double kLeastSlope = 0.0012, kMostSlope = 0.25;   // px per px: 85 mm at 30 m to a long lens near the ground
constexpr double kDistinctPx = 1.5;          // fields that differ by less anywhere in the frame are one

// A fixed sequence (SplitMix64, Steele, Lea & Flood 2014), so that a frame always gives the same plane.
class Sequence {
 public:
  std::uint64_t next() {
    state_ += 0x9E3779B97F4A7C15ull;
    std::uint64_t z = state_;
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9ull;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBull;
    return z ^ (z >> 31);
  }
  size_t below(size_t n) { return size_t(next() % n); }
  double unit() { return double(next() >> 11) * 0x1.0p-53; }

 private:
  std::uint64_t state_ = 1;
};

struct Candidate {
  Field field;
  Score score;
};

Direction turned(const Direction& d, double radians) {
  const double c = std::cos(radians), s = std::sin(radians);
  return {c * d.x - s * d.y, s * d.x + c * d.y};
}

class Search {
 public:
  Search(const Scene& scene, const Direction& near, double range_deg)
      : scene_(scene), near_(near), range_rad_(range_deg * std::numbers::pi / 180) {}

  std::vector<Field> run() {
    const size_t n = scene_.clusters.size();
    if (n < 4) return {};
    const size_t stride = std::max<size_t>(n / kProbe, 1);
    for (size_t i = stride / 2; i < n; i += stride) probe_.clusters.push_back(scene_.clusters[i]);
    for (int k = 0; k < kSamples; ++k) {
      const Cluster& p = scene_.clusters[sequence_.below(n)];
      const Cluster& q = scene_.clusters[sequence_.below(n)];
      if (k % 2 == 0) {
        try_pair(p, q, turned(near_, range_rad_ * (2 * sequence_.unit() - 1)));
      } else {
        try_triple(p, q, scene_.clusters[sequence_.below(n)]);
      }
    }
    return best();
  }

 private:
  // Two values and a direction: l = g + k t, t along the direction.
  void try_pair(const Cluster& p, const Cluster& q, const Direction& d) {
    const double t1 = d.x * p.x + d.y * p.y, t2 = d.x * q.x + d.y * q.y;
    if (std::abs(t2 - t1) < 1e-3) return;
    const double c1 = blur_disc_px(p.squared_disc_px2), c2 = blur_disc_px(q.squared_disc_px2);
    for (int signs = 0; signs < 4; ++signs) {
      const double l1 = signs & 1 ? -c1 : c1, l2 = signs & 2 ? -c2 : c2;
      const double k = (l2 - l1) / (t2 - t1);
      consider({l1 - k * t1, k * d.x, k * d.y, 0});
    }
  }

  void try_triple(const Cluster& p, const Cluster& q, const Cluster& r) {
    const double x1 = q.x - p.x, y1 = q.y - p.y, x2 = r.x - p.x, y2 = r.y - p.y;
    const double determinant = x1 * y2 - x2 * y1;
    if (std::abs(determinant) < 1e-4) return;
    const double c0 = blur_disc_px(p.squared_disc_px2), c1 = blur_disc_px(q.squared_disc_px2),
                 c2 = blur_disc_px(r.squared_disc_px2);
    for (int signs = 0; signs < 8; ++signs) {
      const double l0 = signs & 1 ? -c0 : c0, l1 = signs & 2 ? -c1 : c1, l2 = signs & 4 ? -c2 : c2;
      const double a = ((l1 - l0) * y2 - (l2 - l0) * y1) / determinant;
      const double b = ((l2 - l0) * x1 - (l1 - l0) * x2) / determinant;
      consider({l0 - a * p.x - b * p.y, a, b, 0});
    }
  }

  void consider(const Field& field) {
    const double slope = std::hypot(field.a, field.b);
    const double along = field.a * near_.x + field.b * near_.y;
    if (slope < kLeastSlope * scene_.scale_px || slope > kMostSlope * scene_.scale_px) return;
    if (along < slope * std::cos(range_rad_)) return;
    candidates_.push_back({field, score_of(probe_, field, near_, probe_order_)});
  }

  std::vector<Field> best() {
    const auto better = [](const Candidate& a, const Candidate& b) { return a.score.cost < b.score.cost; };
    std::stable_sort(candidates_.begin(), candidates_.end(), better);
    if (candidates_.size() > size_t(kSurvivors)) candidates_.resize(kSurvivors);
    std::vector<int> order;
    for (Candidate& candidate : candidates_) candidate.score = score_of(scene_, candidate.field, near_, order);
    std::stable_sort(candidates_.begin(), candidates_.end(), better);
    std::vector<Field> kept;
    for (const Candidate& candidate : candidates_) {
      if (candidate.score.cost >= 0 || int(kept.size()) == kKept) break;
      const bool known = std::any_of(kept.begin(), kept.end(), [&](const Field& other) {
        return std::abs(other.g - candidate.field.g) + std::abs(other.a - candidate.field.a) +
                   std::abs(other.b - candidate.field.b) <
               kDistinctPx;
      });
      if (!known) kept.push_back(candidate.field);
    }
    return kept;
  }

  const Scene& scene_;
  Direction near_;
  double range_rad_;
  Sequence sequence_;
  Scene probe_;                 // every n-th cluster, nothing else
  std::vector<int> probe_order_;
  std::vector<Candidate> candidates_;
};

}  // namespace

std::vector<Field> search(const Scene& scene, const Direction& near, double direction_range_deg) {
  return Search(scene, near, direction_range_deg).run();
}

}  // namespace focusfall::plane_fit
