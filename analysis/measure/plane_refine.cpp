// The plane fit itself: S = l^2 + floor on all chosen edges at their own positions, damped Gauss-Newton with Tukey's
// weights (Beaton & Tukey 1974) whose cut closes from 6 to 4 to 3 standard deviations.
#include <algorithm>
#include <cmath>
#include <map>
#include <opencv2/core.hpp>

#include "analysis/measure/plane_model.h"

namespace focusfall::plane_fit {
namespace {

constexpr double kCuts[] = {6, 4, 3};
constexpr double kTukeyPerCut = 1.6;         // Tukey's c for a cut: 4.685 at 3 sigma gives 95 % efficiency
constexpr int kStepsPerCut = 8;
constexpr double kFloorSigmaPx2 = 2;         // prior of the blur on the line: an unknown baseline
constexpr double kTrustRegionPx = 4;         // largest change of l in one step anywhere in the frame
constexpr double kLastDiscPx = 10;           // the last rounds use less blurred edges only: wide discs are under-read
constexpr int kLeastPoints = 24;
constexpr double kCovarianceScale = 1.5;     // of variances, for what the model leaves out; measured

using Vec4 = cv::Vec<double, 4>;
using Mat4 = cv::Matx<double, 4, 4>;

struct Term {
  Vec4 gradient;
  double residual = 0;       // measured - model, in standard errors
  double weight = 0;
  int cluster = 0;
};

struct Round {
  double cut = 6;
  double widest_px = kWidestDiscPx;
  double scale = 1;          // of the standard errors, from the inliers
  double far_end = -1e9;     // of the surface along the near direction
  Direction near;
};

std::vector<Term> terms_of(const Scene& scene, const Field& field, const Round& round) {
  std::vector<Term> terms;
  const double tukey = kTukeyPerCut * round.cut;
  for (const Point& p : scene.points) {
    if (round.near.x * p.x + round.near.y * p.y < round.far_end) continue;
    const double l = signed_disc(field, p.x, p.y);
    if (std::abs(l) > round.widest_px) continue;
    const double sigma = round.scale * edge_sigma_px2(l * l);
    const double r = (p.squared_disc_px2 - l * l - field.floor_px2) / sigma;
    const double t = r / tukey;
    const double robust = std::abs(t) < 1 ? (1 - t * t) * (1 - t * t) : 0;
    terms.push_back({Vec4(2 * l, 2 * l * p.x, 2 * l * p.y, 1) * (1 / sigma), r, robust * p.weight, p.cluster});
  }
  return terms;
}

// Median of |r| / .6745 over the edges that are not plain outliers.
double scale_of(const std::vector<Term>& terms, double scale) {
  std::vector<double> sizes;
  for (const Term& t : terms)
    if (std::abs(t.residual) < 6) sizes.push_back(std::abs(t.residual));
  if (sizes.empty()) return scale;
  std::nth_element(sizes.begin(), sizes.begin() + std::ptrdiff_t(sizes.size() / 2), sizes.end());
  return std::clamp(scale * sizes[sizes.size() / 2] / 0.6745, 0.3, 2.0);
}

Mat4 normal_matrix(const std::vector<Term>& terms, Vec4* right) {
  Mat4 normal = Mat4::zeros();
  if (right) *right = Vec4::all(0);
  for (const Term& t : terms) {
    normal += t.weight * (t.gradient * t.gradient.t());
    if (right) *right += t.weight * t.residual * t.gradient;
  }
  return normal;
}

// One damped step; returns the largest change of l in the frame.
double step(const std::vector<Term>& terms, Field& field) {
  Vec4 right;
  Mat4 normal = normal_matrix(terms, &right);
  normal(3, 3) += 1 / (kFloorSigmaPx2 * kFloorSigmaPx2);
  right[3] -= field.floor_px2 / (kFloorSigmaPx2 * kFloorSigmaPx2);
  for (int i = 0; i < 4; ++i) normal(i, i) *= 1 + 1e-3;
  Vec4 delta = normal.solve(right, cv::DECOMP_SVD);
  const double change = std::abs(delta[0]) + std::abs(delta[1]) + std::abs(delta[2]);
  if (change > kTrustRegionPx) delta *= kTrustRegionPx / change;
  field.g += delta[0];
  field.a += delta[1];
  field.b += delta[2];
  field.floor_px2 += delta[3];
  return change;
}

// Sandwich covariance with the scores summed over neighbours first (Liang & Zeger 1986): what neighbours share, a
// contour or a patch of soft texture, does not average out.
Mat4 clustered_covariance(const std::vector<Term>& terms) {
  Mat4 bread = normal_matrix(terms, nullptr);
  bread(3, 3) += 1 / (kFloorSigmaPx2 * kFloorSigmaPx2);
  std::map<int, Vec4> scores;
  for (const Term& t : terms) scores[t.cluster] += t.weight * t.residual * t.gradient;
  Mat4 meat = Mat4::zeros();
  for (const auto& [cluster, score] : scores) meat += score * score.t();
  const double groups = std::max(double(scores.size()), 5.0);
  const Mat4 inverse = bread.inv(cv::DECOMP_SVD);
  return (kCovarianceScale * groups / (groups - 4)) * (inverse * meat * inverse);
}

// Share of the clusters in range that the field explains, and what signed blur these span.
void count_inliers(const Scene& scene, const Direction& near, Fit& fit) {
  int counted = 0;
  std::vector<double> inliers;
  for (const Cluster& c : scene.clusters) {
    if (near.x * c.x + near.y * c.y < fit.score.far_end) continue;
    const double l = signed_disc(fit.field, c.x, c.y);
    if (std::abs(l) > kWidestDiscPx) continue;
    ++counted;
    if (is_inlier(c, fit.field)) inliers.push_back(l);
  }
  if (inliers.empty()) return;
  fit.inlier_fraction = double(inliers.size()) / counted;
  std::sort(inliers.begin(), inliers.end());
  fit.least_px = inliers[inliers.size() / 20];
  fit.most_px = inliers[inliers.size() - 1 - inliers.size() / 20];
}

}  // namespace

Fit refine(const Scene& scene, const Field& start, const Direction& near) {
  Fit fit;
  fit.field = start;
  std::vector<int> order;
  Round round;
  round.near = near;
  std::vector<Term> terms;
  for (double cut : kCuts) {
    round.cut = cut;
    round.widest_px = cut == kCuts[2] ? kLastDiscPx : kWidestDiscPx;
    fit.score = score_of(scene, fit.field, near, order);
    if (fit.score.clusters == 0) return fit;
    round.far_end = fit.score.far_end - 0.01;
    double change = 0;
    for (int i = 0; i < kStepsPerCut; ++i) {
      terms = terms_of(scene, fit.field, round);
      if (int(terms.size()) < kLeastPoints) return fit;
      round.scale = scale_of(terms, round.scale);
      change = step(terms, fit.field);
      if (change < 0.01) break;
    }
    fit.settled = change < 0.3;
  }
  fit.score = score_of(scene, fit.field, near, order);
  terms = terms_of(scene, fit.field, round);
  if (int(terms.size()) < kLeastPoints) {
    fit.settled = false;
    return fit;
  }
  const Mat4 covariance = clustered_covariance(terms);
  for (int i = 0; i < 3; ++i)
    for (int j = 0; j < 3; ++j) fit.covariance[i][j] = covariance(i, j);
  count_inliers(scene, near, fit);
  return fit;
}

}  // namespace focusfall::plane_fit
