#include "analysis/compare/lens_trend.h"

#include <algorithm>
#include <boost/math/distributions/fisher_f.hpp>
#include <cmath>
#include <functional>
#include <map>
#include <set>
#include <tuple>
#include <utility>

#include "analysis/compare/lens_fit.h"
#include "analysis/compare/lens_report.h"

namespace focusfall {
namespace {

// A trend needs so many acquisitions and so many degrees of freedom beside the means it estimates (judgement).
constexpr int kLeastAcquisitions = 6;
constexpr int kLeastFreedom = 4;
constexpr int kLeastPerSide = 3;              // of the approach

// Least range of the condition, in doublings or stops (judgement: below it the slope hangs on the marks' rounding).
constexpr double kLeastDoublings = 1;         // of the focus distance
constexpr double kLeastStops = 0.9;           // one stop between marked, rounded f-numbers
constexpr double kLeastFocalDoublings = 0.4;  // 70 to 100 mm

struct Point {
  std::size_t stratum = 0;
  double x = 0, y = 0, sigma = 0, limit_um = 0, condition = 0;
};

// Everything but the condition itself: groups that differ in it alone share a mean.
using Stratum = std::tuple<int, int, int, FocusAreaPlace, std::string>;

Stratum stratum_of(const ReadingGroup& group, TrendKind kind) {
  const int f_number = static_cast<int>(std::lround(24 * std::log2(group.f_number)));
  return {kind == TrendKind::focal_length ? 0 : group.focal_cluster, kind == TrendKind::f_number ? 0 : f_number,
          kind == TrendKind::focus_distance ? 0 : group.distance_band.value_or(-1), group.area, group.focus_mode};
}

// The condition of one acquisition, in its own unit, or nothing where it is not known.
std::optional<double> condition_of(const ReadingGroup& group, const Acquisition& acquisition,
                                   std::span<const LensReading> readings, TrendKind kind) {
  const LensReading& first = readings[acquisition.readings.front()];
  switch (kind) {
    case TrendKind::f_number: return group.f_number;
    case TrendKind::focal_length: return first.focal_length_mm;
    case TrendKind::approach:
      if (first.approach == ApproachSide::unknown) return std::nullopt;
      return first.approach == ApproachSide::far ? 1.0 : 0.0;
    case TrendKind::focus_distance: break;
  }
  if (!first.focus_distance_m || !std::isfinite(*first.focus_distance_m)) return std::nullopt;
  return first.focus_distance_m;
}

double abscissa(TrendKind kind, double condition) {
  switch (kind) {
    case TrendKind::approach: return condition;
    case TrendKind::f_number: return 2 * std::log2(condition);   // stops
    default: return std::log2(condition);
  }
}

// Points of all strata in which the condition varies at all; strata numbered from 0.
std::vector<Point> points_of(std::span<const ReadingGroup* const> groups, std::span<const LensReading> readings,
                             TrendKind kind) {
  std::map<Stratum, std::vector<Point>> strata;
  for (const ReadingGroup* group : groups) {
    for (const Acquisition& acquisition : group->acquisitions) {
      const auto condition = condition_of(*group, acquisition, readings, kind);
      if (!condition) continue;
      strata[stratum_of(*group, kind)].push_back({0, abscissa(kind, *condition), acquisition.defocus_um,
                                                  acquisition.sigma_um, group->limit_um, *condition});
    }
  }
  std::vector<Point> result;
  std::size_t number = 0;
  for (auto& [key, points] : strata) {
    const auto [low, high] = std::ranges::minmax_element(points, {}, &Point::x);
    if (points.size() < 2 || low->x == high->x) continue;
    for (Point& point : points) point.stratum = number;
    result.insert(result.end(), points.begin(), points.end());
    ++number;
  }
  return result;
}

const char* needed(TrendKind kind) {
  switch (kind) {
    case TrendKind::focus_distance: return "focus distances that differ by a factor of 2 or more";
    case TrendKind::f_number: return "f-numbers that differ by a stop or more";
    case TrendKind::focal_length: return "focal lengths that differ by a third or more";
    case TrendKind::approach: return "three acquisitions or more from each side, told by --approach";
  }
  return "";
}

double least_span(TrendKind kind) {
  switch (kind) {
    case TrendKind::focus_distance: return kLeastDoublings;
    case TrendKind::f_number: return kLeastStops;
    case TrendKind::focal_length: return kLeastFocalDoublings;
    case TrendKind::approach: return 1;
  }
  return 1;
}

bool carries(TrendKind kind, const std::vector<Point>& points, double span, std::size_t strata) {
  const int n = static_cast<int>(points.size());
  if (n < kLeastAcquisitions || n - static_cast<int>(strata) - 1 < kLeastFreedom) return false;
  if (span < least_span(kind)) return false;
  if (kind != TrendKind::approach) return true;
  const auto far = std::ranges::count_if(points, [](const Point& p) { return p.x > 0.5; });
  return far >= kLeastPerSide && n - far >= kLeastPerSide;
}

LensTrend trend_of(std::span<const ReadingGroup* const> groups, std::span<const LensReading> readings, TrendKind kind) {
  LensTrend trend;
  trend.kind = kind;
  trend.lens = groups.front()->lens;
  trend.body = groups.front()->body;
  const std::vector<Point> points = points_of(groups, readings, kind);
  trend.acquisitions = static_cast<int>(points.size());
  trend.missing = std::string("Needs ") + needed(kind) + ", everything else held, and " +
                  std::to_string(kLeastAcquisitions) + " acquisitions or more.";
  if (points.empty()) return trend;

  const auto [low, high] = std::ranges::minmax_element(points, {}, &Point::x);
  trend.span = high->x - low->x;
  if (kind != TrendKind::approach) {
    trend.low_end = low->condition;
    trend.high_end = high->condition;
  }
  std::vector<double> limits;
  for (const Point& point : points) limits.push_back(point.limit_um);
  trend.limit_um = median(limits);
  const std::size_t strata = points.back().stratum + 1;
  if (!carries(kind, points, trend.span, strata)) return trend;

  const auto n = static_cast<Eigen::Index>(points.size());
  Eigen::MatrixXd design = Eigen::MatrixXd::Zero(n, static_cast<Eigen::Index>(strata) + 1);
  Eigen::VectorXd y(n), sigma(n);
  for (Eigen::Index i = 0; i < n; ++i) {
    const Point& point = points[static_cast<std::size_t>(i)];
    design(i, 0) = point.x;
    design(i, static_cast<Eigen::Index>(point.stratum) + 1) = 1;
    y[i] = point.y;
    sigma[i] = point.sigma;
  }
  const auto fit = robust_fit(design, y, sigma);
  if (!fit) return trend;
  const Estimate estimate{.value = fit->coefficients[0],
                          .standard_error = std::sqrt(fit->covariance(0, 0)),
                          .freedom = fit->freedom,
                          .floor = kSystematicFloorLimits * trend.limit_um / trend.span};
  trend.slope_um = interval_95(estimate);
  trend.p = p_value(estimate);
  trend.missing.clear();
  return trend;
}

// ---- lens or body -----------------------------------------------------------------------------------------------

struct Cell {
  std::size_t lens = 0, body = 0;
};

struct Crossing {
  std::vector<std::string> lenses, bodies;
  std::vector<Cell> cells;                   // one an acquisition
  std::vector<double> y, sigma, limit_um;
  std::set<std::pair<std::size_t, std::size_t>> filled;
};

std::size_t number_of(std::vector<std::string>& names, const std::string& name) {
  const auto found = std::ranges::find(names, name);
  if (found != names.end()) return static_cast<std::size_t>(found - names.begin());
  names.push_back(name);
  return names.size() - 1;
}

Crossing crossing_of(std::span<const ReadingGroup> groups) {
  Crossing crossing;
  for (const ReadingGroup& group : groups) {
    if (group.lens.empty() || group.body.empty()) continue;
    const Cell cell{number_of(crossing.lenses, group.lens), number_of(crossing.bodies, group.body)};
    crossing.filled.insert({cell.lens, cell.body});
    for (const Acquisition& acquisition : group.acquisitions) {
      crossing.cells.push_back(cell);
      crossing.y.push_back(acquisition.defocus_um);
      crossing.sigma.push_back(acquisition.sigma_um);
      crossing.limit_um.push_back(group.limit_um);
    }
  }
  return crossing;
}

// Whether two lenses were both used on two bodies.
bool has_square(const Crossing& c) {
  for (std::size_t a = 0; a < c.lenses.size(); ++a) {
    for (std::size_t b = a + 1; b < c.lenses.size(); ++b) {
      std::size_t shared = 0;
      for (std::size_t body = 0; body < c.bodies.size(); ++body) {
        if (c.filled.contains({a, body}) && c.filled.contains({b, body})) ++shared;
      }
      if (shared >= 2) return true;
    }
  }
  return false;
}

// Whether every lens and body is reached from the first through pairs that were used together.
bool connected(const Crossing& c) {
  std::set<std::size_t> lenses{0}, bodies;
  for (std::size_t round = 0; round < c.lenses.size() + c.bodies.size(); ++round) {
    for (const auto& [lens, body] : c.filled) {
      if (lenses.contains(lens) || bodies.contains(body)) {
        lenses.insert(lens);
        bodies.insert(body);
      }
    }
  }
  return lenses.size() == c.lenses.size() && bodies.size() == c.bodies.size();
}

// Columns: common, then every lens but the last and every body but the last, coded so that the effects of each sum to 0.
Eigen::MatrixXd effects_design(const Crossing& c) {
  const auto lenses = static_cast<Eigen::Index>(c.lenses.size()), bodies = static_cast<Eigen::Index>(c.bodies.size());
  const auto n = static_cast<Eigen::Index>(c.cells.size());
  Eigen::MatrixXd design = Eigen::MatrixXd::Zero(n, lenses + bodies - 1);
  const auto code = [&design](Eigen::Index row, Eigen::Index first, Eigen::Index count, std::size_t number) {
    const auto k = static_cast<Eigen::Index>(number);
    if (k < count - 1) {
      design(row, first + k) = 1;
    } else {
      design.block(row, first, 1, count - 1).setConstant(-1);
    }
  };
  for (Eigen::Index i = 0; i < n; ++i) {
    const Cell& cell = c.cells[static_cast<std::size_t>(i)];
    design(i, 0) = 1;
    code(i, 1, lenses, cell.lens);
    code(i, lenses, bodies, cell.body);
  }
  return design;
}

std::vector<PartEffect> effects_of(const std::vector<std::string>& names, const RobustFit& fit, Eigen::Index first,
                                   double floor_um) {
  std::vector<PartEffect> result;
  const auto count = static_cast<Eigen::Index>(names.size());
  for (Eigen::Index k = 0; k < count; ++k) {
    Eigen::VectorXd pick = Eigen::VectorXd::Zero(fit.coefficients.size());
    if (k < count - 1) {
      pick[first + k] = 1;
    } else {
      pick.segment(first, count - 1).setConstant(-1);
    }
    const Estimate estimate{.value = pick.dot(fit.coefficients),
                            .standard_error = std::sqrt(pick.dot(fit.covariance * pick)),
                            .freedom = fit.freedom,
                            .floor = floor_um};
    result.push_back({names[static_cast<std::size_t>(k)], interval_95(estimate), p_value(estimate)});
  }
  return result;
}

// F test of the cell means against the sum of the two effects, from the residuals in their own standard deviations.
std::optional<double> interaction_p(const Crossing& c, const RobustFit& fit) {
  std::map<std::pair<std::size_t, std::size_t>, std::vector<double>> cells;
  for (std::size_t i = 0; i < c.cells.size(); ++i) {
    cells[{c.cells[i].lens, c.cells[i].body}].push_back(fit.residuals[static_cast<Eigen::Index>(i)]);
  }
  const auto spare = static_cast<double>(cells.size()) - static_cast<double>(fit.coefficients.size());
  const auto within = static_cast<double>(c.cells.size()) - static_cast<double>(cells.size());
  if (spare < 1 || within < 2) return std::nullopt;
  double between_sum = 0, within_sum = 0;
  for (const auto& [key, residuals] : cells) {
    double mean = 0;
    for (const double r : residuals) mean += r / static_cast<double>(residuals.size());
    between_sum += mean * mean * static_cast<double>(residuals.size());
    for (const double r : residuals) within_sum += (r - mean) * (r - mean);
  }
  if (!(within_sum > 0)) return std::nullopt;
  const boost::math::fisher_f f(spare, within);
  return cdf(complement(f, between_sum / spare / (within_sum / within)));
}

}  // namespace

std::vector<LensTrend> lens_trends(std::span<const ReadingGroup> groups, std::span<const LensReading> readings) {
  std::vector<LensTrend> result;
  for (std::size_t first = 0; first < groups.size();) {
    std::vector<const ReadingGroup*> own;
    std::size_t next = first;
    while (next < groups.size() && groups[next].lens == groups[first].lens && groups[next].body == groups[first].body) {
      own.push_back(&groups[next++]);
    }
    for (const TrendKind kind :
         {TrendKind::focus_distance, TrendKind::f_number, TrendKind::focal_length, TrendKind::approach}) {
      result.push_back(trend_of(own, readings, kind));
    }
    first = next;
  }
  return result;
}

LensOrBody lens_or_body(std::span<const ReadingGroup> groups) {
  LensOrBody result;
  const Crossing crossing = crossing_of(groups);
  if (crossing.lenses.size() < 2 || crossing.bodies.size() < 2 || !has_square(crossing) || !connected(crossing)) {
    result.missing =
        "Lens or body cannot be told from these frames: it takes two lenses that were both used on two bodies.";
    return result;
  }
  const auto as_vector = [](const std::vector<double>& v) {
    return Eigen::VectorXd(Eigen::Map<const Eigen::VectorXd>(v.data(), static_cast<Eigen::Index>(v.size())));
  };
  const auto fit = robust_fit(effects_design(crossing), as_vector(crossing.y), as_vector(crossing.sigma));
  if (!fit || fit->freedom < kLeastFreedom) {
    result.missing = "Lens or body cannot be told from these frames: too few acquisitions in each pair.";
    return result;
  }
  const double floor_um = kSystematicFloorLimits * median(crossing.limit_um);
  result.lenses = effects_of(crossing.lenses, *fit, 1, floor_um);
  result.bodies = effects_of(crossing.bodies, *fit, static_cast<Eigen::Index>(crossing.lenses.size()), floor_um);
  result.p_interaction = interaction_p(crossing, *fit);
  return result;
}

}  // namespace focusfall
