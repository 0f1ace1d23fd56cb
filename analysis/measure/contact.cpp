// Where the subject meets the surface. In the column of the picture under the aim three explanations are compared by
// their likelihood: the aim lies on the surface; a subject of one blur stands on the surface, its blur that of the row
// where it meets it; something of one blur of its own hides the surface. The second looks like the first where the
// height of the subject happens to match, with the other sign: then neither is taken.
#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

#include "analysis/measure/plane_model.h"

namespace focusfall::plane_fit {
namespace {

constexpr double kIndependence = 1.0 / 3;      // edges along one contour repeat each other
constexpr double kOutlierShare = 0.15;
constexpr double kOutlierRangePx2 = 400;       // an outlier may read anything up to 20 px
constexpr double kDecisive = 3;                // difference of log likelihoods that decides (odds of 20)
constexpr double kOppositeDecisive = 5;          // the same for feet on the other side of the line of best focus
constexpr double kApartDecisive = 5;             // the same for "neither": tiles of one blur scatter more than edges do
constexpr double kParameterCost = 2;           // per free parameter, nats: that is what chance gains
constexpr double kTileScatter = 0.10, kTileScatterPx = 0.25;   // of c, between regions of one blur (measured)
constexpr double kMostDeviations = 2;
constexpr double kMostHolePx = 64;             // or a quarter of the height of the aim
constexpr double kLeastInliersFoot = 0.82;     // texture that is misread fits worse than this, and misplaces the feet
constexpr double kLeastInliersAim = 0.75;
constexpr double kWidestPx = 12;               // beyond, the surface is read too coarsely to compare a subject with it
constexpr int kRows = 64;                      // places tried for the foot
constexpr int kLeastAimPoints = 6;
constexpr int kLeastGroundPoints = 4;          // below the foot
constexpr double kLeastColumnPx = 64;
constexpr double kMarginPx = 32;               // an inlier tile reaches this far around its centre

// A point of the column: position towards the near side, reading, and what the surface predicts there.
struct ColumnPoint {
  double v = 0;
  double squared_disc_px2 = 0;
  double plane_log_density = 0;
};

double log_density(double measured_px2, double model_px2) {
  const double sigma = edge_sigma_px2(std::max(model_px2, 0.0));
  const double z = (measured_px2 - model_px2) / sigma;
  return kIndependence * std::log((1 - kOutlierShare) * std::exp(-0.5 * z * z) / (sigma * 2.5066283) +
                                  kOutlierShare / kOutlierRangePx2);
}

// Axes of the displayed picture in centred coordinates: v towards the near side, u across.
struct Axes {
  Direction near;
  double u(double x, double y) const { return near.y * x - near.x * y; }
  double v(double x, double y) const { return near.x * x + near.y * y; }
  double x(double u, double v) const { return near.y * u + near.x * v; }
  double y(double u, double v) const { return -near.x * u + near.y * v; }
};

class Finder {
 public:
  Finder(const Scene& scene, const Fit& fit, NearSide side, const PlaneOptions& options)
      : scene_(scene), fit_(fit), options_(options), axes_{direction_of(side)} {
    const double x0 = cx(options.aim.x), x1 = cx(options.aim.x + options.aim.width);
    const double y0 = cy(options.aim.y), y1 = cy(options.aim.y + options.aim.height);
    const double ua = axes_.u(x0, y0), ub = axes_.u(x1, y1), va = axes_.v(x0, y0), vb = axes_.v(x1, y1);
    u_ = (ua + ub) / 2;
    half_width_ = std::max(std::abs(ub - ua) / 2, kLeastColumnPx / 2 / scene.scale_px);
    top_ = std::min(va, vb);
    bottom_ = std::max(va, vb);
    reach();
  }

  ContactFinding run() {
    if (options_.contact_x || options_.contact_y) return as_said();
    collect();
    return choose();
  }

 private:
  double cx(double fraction) const {
    return (fraction * options_.width_px - scene_.centre_x_px) / scene_.scale_px;
  }
  double cy(double fraction) const {
    return (fraction * options_.height_px - scene_.centre_y_px) / scene_.scale_px;
  }
  double model_px2(double u, double v) const {
    const double l = signed_disc(fit_.field, axes_.x(u, v), axes_.y(u, v));
    return l * l + fit_.field.floor_px2;
  }

  double signed_row(double v) const { return signed_disc(fit_.field, axes_.x(u_, v), axes_.y(u_, v)); }

  // The rows that inlier tiles cover.
  void reach() {
    first_ = std::numeric_limits<double>::infinity();
    last_ = -first_;
    for (const Cluster& c : scene_.clusters) {
      const double l = signed_disc(fit_.field, c.x, c.y), v = axes_.v(c.x, c.y);
      if (std::abs(l) > kWidestDiscPx || axes_.near.x * c.x + axes_.near.y * c.y < fit_.score.far_end) continue;
      if (!is_inlier(c, fit_.field)) continue;
      first_ = std::min(first_, v);
      last_ = std::max(last_, v);
    }
    first_ -= kMarginPx / scene_.scale_px;
    last_ += kMarginPx / scene_.scale_px;
  }

  ContactFinding at(Contact contact, double u, double v, double extra_sigma_px) const {
    if (v < first_ || v > last_) return {};
    ContactFinding finding;
    finding.contact = contact;
    finding.x = (axes_.x(u, v) * scene_.scale_px + scene_.centre_x_px) / options_.width_px;
    finding.y = (axes_.y(u, v) * scene_.scale_px + scene_.centre_y_px) / options_.height_px;
    finding.extra_sigma_px = extra_sigma_px;
    return finding;
  }

  ContactFinding as_said() const {
    const double middle = (top_ + bottom_) / 2;
    const double x = options_.contact_x ? cx(*options_.contact_x) : axes_.x(u_, middle);
    const double y = options_.contact_y ? cy(*options_.contact_y) : axes_.y(u_, middle);
    return at(Contact::foot, axes_.u(x, y), axes_.v(x, y), 0);
  }

  void collect() {
    for (const Point& p : scene_.points) {
      const double u = axes_.u(p.x, p.y), v = axes_.v(p.x, p.y);
      if (std::abs(u - u_) > half_width_ || v < top_ || v > last_) continue;
      column_.push_back({v, p.squared_disc_px2, log_density(p.squared_disc_px2, model_px2(u, v))});
      in_aim_ += v <= bottom_;
    }
    std::sort(column_.begin(), column_.end(), [](const ColumnPoint& a, const ColumnPoint& b) { return a.v < b.v; });
  }

  // Log likelihood of "one blur down to the row v, the surface below". Beneath the aim the surface shows beside the
  // subject's legs and between them.
  double standing(double v, double blur_px2) const {
    double sum = 0;
    for (const ColumnPoint& p : column_) {
      if (p.v >= v) {
        sum += p.plane_log_density;
      } else {
        const double own = log_density(p.squared_disc_px2, blur_px2);
        sum += p.v <= bottom_ ? own : either(own, p.plane_log_density);
      }
    }
    return sum;
  }

  // Both explanations of a point, equally likely beforehand; each log density is that of a share of one edge.
  static double either(double a, double b) {
    const double larger = std::max(a, b), smaller = std::min(a, b);
    return larger + kIndependence * std::log(0.5 * (1 + std::exp((smaller - larger) / kIndependence)));
  }

  // The same with the blur of the surface at that row, give or take what tiles of one blur scatter.
  double standing_on_surface(double v, double blur_px2) const {
    const double row_px = std::sqrt(std::max(model_px2(u_, v) - fit_.field.floor_px2, 0.0));
    const double own_px = blur_disc_px(blur_px2 - fit_.field.floor_px2);
    const double sigma_px = std::hypot(kTileScatter * row_px, kTileScatterPx);
    const double z = std::clamp((own_px - row_px) / sigma_px, -kMostDeviations, kMostDeviations);
    const double taken_px = row_px + z * sigma_px;
    return standing(v, taken_px * taken_px + fit_.field.floor_px2) - 0.5 * z * z;
  }

  // A subject shows edges all the way down to its feet; sky between it and the ground does not.
  bool hole_above(double v, double blur_px2) const {
    double previous = std::min(bottom_, v);
    const double most = std::max(kMostHolePx / scene_.scale_px, (bottom_ - top_) / 4);
    for (const ColumnPoint& p : column_) {
      if (p.v <= bottom_) continue;
      if (p.v >= v) break;
      if (std::abs(p.squared_disc_px2 - blur_px2) > 2 * edge_sigma_px2(blur_px2)) continue;
      if (p.v - previous > most) return true;
      previous = p.v;
    }
    return v - previous > most;
  }

  double median_above(double v) const {
    std::vector<double> values;
    for (const ColumnPoint& p : column_)
      if (p.v < v) values.push_back(p.squared_disc_px2);
    if (values.empty()) return 0;
    std::nth_element(values.begin(), values.begin() + std::ptrdiff_t(values.size() / 2), values.end());
    return values[values.size() / 2];
  }

  int points_below(double v) const {
    return int(std::count_if(column_.begin(), column_.end(), [&](const ColumnPoint& p) { return p.v >= v; }));
  }

  ContactFinding choose() {
    if (in_aim_ < kLeastAimPoints) return {};
    const double none = -std::numeric_limits<double>::infinity();
    const double middle = (top_ + bottom_) / 2;

    // The aim on the surface: only where the surface reaches that far.
    double on_surface = none;
    if (middle >= first_ && fit_.inlier_fraction >= kLeastInliersAim && std::abs(signed_row(middle)) <= kWidestPx) {
      on_surface = 0;
      for (const ColumnPoint& p : column_) on_surface += p.plane_log_density;
    }

    // The feet at every row from the aim's middle to the nearest inlier tile; and a blur of its own likewise.
    std::vector<double> rows, likelihoods;
    double foot = none, apart = none, foot_v = middle;
    const bool foot_can_be_told = fit_.inlier_fraction >= kLeastInliersFoot;
    for (int i = 0; i <= kRows; ++i) {
      const double v = middle + (last_ - middle) * i / kRows;
      const double blur_px2 = median_above(v);
      apart = std::max(apart, standing(v, blur_px2) - 2 * kParameterCost);
      if (!foot_can_be_told || std::abs(signed_row(v)) > kWidestPx) continue;
      if (points_below(v) < kLeastGroundPoints || v < first_ || hole_above(v, blur_px2)) continue;
      const double likelihood = standing_on_surface(v, blur_px2) - kParameterCost;
      rows.push_back(v);
      likelihoods.push_back(likelihood);
      if (likelihood > foot) foot = likelihood, foot_v = v;
    }
    if (apart > std::max(on_surface, foot) + kApartDecisive) return {};

    // A row on the other side of the line of best focus has the same blur; if the feet might as well stand there, the
    // side is open.
    if (foot > on_surface) {
      const double l_best = signed_row(foot_v);
      for (size_t i = 0; i < rows.size(); ++i)
        if (signed_row(rows[i]) * l_best < 0 && likelihoods[i] > foot - kOppositeDecisive) return {};
    }

    // How far the row of the feet may lie from the best one.
    double low = foot_v, high = foot_v;
    for (size_t i = 0; i < rows.size(); ++i)
      if (likelihoods[i] > foot - 2) low = std::min(low, rows[i]), high = std::max(high, rows[i]);
    const double slope = fit_.field.a * axes_.near.x + fit_.field.b * axes_.near.y;
    const double row_sigma_px = std::abs(slope) * std::max((high - low) / 4, (last_ - middle) / kRows / 2);

    if (on_surface > foot + kDecisive) return at(Contact::aim, u_, middle, 0);
    if (foot > on_surface + kDecisive) return at(Contact::foot, u_, foot_v, row_sigma_px);
    // Both explain the column. Where they say the same, so be it.
    const double l_aim = signed_disc(fit_.field, axes_.x(u_, middle), axes_.y(u_, middle));
    const double l_foot = signed_disc(fit_.field, axes_.x(u_, foot_v), axes_.y(u_, foot_v));
    if (l_aim * l_foot <= 0) return {};
    return on_surface >= foot ? at(Contact::aim, u_, middle, std::abs(l_foot - l_aim) / 2)
                              : at(Contact::foot, u_, foot_v, std::max(row_sigma_px, std::abs(l_foot - l_aim) / 2));
  }

  const Scene& scene_;
  const Fit& fit_;
  const PlaneOptions& options_;
  Axes axes_;
  double u_ = 0, half_width_ = 0, top_ = 0, bottom_ = 0;   // the aim
  double first_ = 0, last_ = 0;                            // rows of inlier tiles
  std::vector<ColumnPoint> column_;
  int in_aim_ = 0;
};

}  // namespace

ContactFinding find_contact(const Scene& scene, const Fit& fit, NearSide near_side, const PlaneOptions& options) {
  return Finder(scene, fit, near_side, options).run();
}

}  // namespace focusfall::plane_fit
