#include "analysis/compare/lens_report.h"

#include <algorithm>
#include <cmath>
#include <numeric>

#include "analysis/compare/lens_fit.h"
#include "analysis/compare/lens_words.h"

namespace focusfall {
namespace {

constexpr double kOutlier = 3.5;              // standard deviations; 1 of 2,000 normal readings (judgement)
constexpr double kClearlyOff = 1.96;          // one acquisition that is off by more than its own 95 %
constexpr double kTestDistanceSpan = 1.2;     // a test series stays at its place: distances within 20 %
constexpr double kTestDurationS = 4 * 3600;   //   and is made in one go (judgement)
constexpr double kLevel = 0.05;

double acquisition_limit_um(const Acquisition& acquisition, std::span<const LensReading> readings) {
  return readings[acquisition.readings.front()].limit_um;
}

SeriesKind kind_of(const ReadingGroup& group, std::span<const LensReading> readings) {
  std::vector<double> distances, times;
  for (const std::size_t i : group.readings) {
    if (!readings[i].on_surface) return SeriesKind::ordinary_frames;
    if (readings[i].focus_distance_m) distances.push_back(*readings[i].focus_distance_m);
    if (readings[i].taken_at_s) times.push_back(*readings[i].taken_at_s);
  }
  const auto [near, far] = std::ranges::minmax_element(distances);
  if (!distances.empty() && *far > *near * kTestDistanceSpan) return SeriesKind::ordinary_frames;
  const auto [first, last] = std::ranges::minmax_element(times);
  if (!times.empty() && *last - *first > kTestDurationS) return SeriesKind::ordinary_frames;
  return SeriesKind::test_series;
}

// Front and back, each in at least two acquisitions that are clearly off by more than the tolerance.
bool is_mixed(const ReadingGroup& group) {
  int front = 0, back = 0;
  for (const Acquisition& one : group.acquisitions) {
    const double margin = std::max(kClearlyOff * one.sigma_um, kToleranceLimits * group.limit_um);
    if (one.defocus_um < -margin) ++front;
    if (one.defocus_um > margin) ++back;
  }
  return front >= 2 && back >= 2;
}

void count_shares(LensGroup& group, std::span<const LensReading> readings) {
  double third = 0, whole = 0;
  for (const Acquisition& one : group.of.acquisitions) {
    const double limit_um = acquisition_limit_um(one, readings);
    if (std::abs(one.defocus_um) <= limit_um / 3) ++third;
    if (std::abs(one.defocus_um) <= limit_um) ++whole;
  }
  const auto count = static_cast<double>(group.of.acquisitions.size());
  group.within_third = third / count;
  group.within_whole = whole / count;
}

void name_outliers(LensGroup& group, const RobustFit& fit, std::span<const LensReading> readings) {
  for (std::size_t k = 0; k < group.of.acquisitions.size(); ++k) {
    if (std::abs(fit.residuals[static_cast<Eigen::Index>(k)]) <= kOutlier) continue;
    for (const std::size_t i : group.of.acquisitions[k].readings) group.outliers.push_back(readings[i].frame);
  }
}

LensGroup measured(ReadingGroup&& of, std::span<const LensReading> readings, const LensReportOptions& options) {
  LensGroup group;
  group.of = std::move(of);
  group.kind = options.kind.value_or(kind_of(group.of, readings));
  group.hint = group.kind == SeriesKind::ordinary_frames;
  group.mixed = is_mixed(group.of);
  count_shares(group, readings);
  const auto n = static_cast<Eigen::Index>(group.of.acquisitions.size());
  if (n < kLeastAcquisitionsForBias) return group;

  Eigen::VectorXd y(n), sigma(n);
  for (Eigen::Index k = 0; k < n; ++k) {
    y[k] = group.of.acquisitions[static_cast<std::size_t>(k)].defocus_um;
    sigma[k] = group.of.acquisitions[static_cast<std::size_t>(k)].sigma_um;
  }
  const auto fit = robust_fit(Eigen::MatrixXd::Ones(n, 1), y, sigma);
  if (!fit) return group;
  const Estimate bias{.value = fit->coefficients[0],
                      .standard_error = std::sqrt(fit->covariance(0, 0)),
                      .freedom = fit->freedom,
                      .floor = kSystematicFloorLimits * group.of.limit_um};
  group.bias_um = interval_95(bias);
  const double limit_um = group.of.limit_um;
  group.bias_limits = Interval{group.bias_um->value / limit_um, group.bias_um->low / limit_um,
                               group.bias_um->high / limit_um};
  group.spread_um = fit->spread;
  group.p = p_value(bias);
  name_outliers(group, *fit, readings);
  return group;
}

// With T = kToleranceLimits: a side where the interval excludes 0 (after Holm too) and |bias| >= T; scatter where the
// spread exceeds the limit; within tolerance where |bias| < T and the interval lies inside +-2 T.
LensFinding finding_of(const LensGroup& group) {
  const auto acquisitions = static_cast<int>(group.of.acquisitions.size());
  if (!group.bias_limits || static_cast<int>(group.of.readings.size()) < kLeastFrames)
    return LensFinding::not_enough_evidence;
  if (group.hint && acquisitions < kLeastOrdinary) return LensFinding::not_enough_evidence;
  const Interval& bias = *group.bias_limits;
  const bool excludes_zero = (bias.low > 0 || bias.high < 0) && group.p_holm < kLevel;
  if (excludes_zero && std::abs(bias.value) >= kToleranceLimits)
    return bias.value > 0 ? LensFinding::back_focus : LensFinding::front_focus;
  if (group.spread_um->value > group.of.limit_um) return LensFinding::scatter;
  const bool inside = bias.low > -2 * kToleranceLimits && bias.high < 2 * kToleranceLimits;
  if (std::abs(bias.value) < kToleranceLimits && inside) return LensFinding::within_tolerance;
  return LensFinding::not_enough_evidence;
}

// One family: every bias, every trend, every lens and body effect of the run.
void adjust(LensReport& report) {
  std::vector<double> p;
  std::vector<double*> adjusted;
  const auto join = [&](double one, double& target) {
    p.push_back(one);
    adjusted.push_back(&target);
  };
  for (LensGroup& group : report.groups) {
    if (group.bias_um) join(group.p, group.p_holm);
  }
  for (LensTrend& trend : report.trends) {
    if (trend.slope_um) join(trend.p, trend.p_holm);
  }
  for (PartEffect& part : report.lens_or_body.lenses) join(part.p, part.p_holm);
  for (PartEffect& part : report.lens_or_body.bodies) join(part.p, part.p_holm);
  const std::vector<double> holm = holm_adjusted(p);
  for (std::size_t i = 0; i < holm.size(); ++i) *adjusted[i] = holm[i];
}

std::optional<LensFinding> common_finding(const std::vector<LensGroup>& groups) {
  std::optional<LensFinding> common;
  for (const LensGroup& group : groups) {
    if (group.finding == LensFinding::not_enough_evidence) continue;
    if (common && *common != group.finding) return std::nullopt;
    common = group.finding;
  }
  return common.value_or(LensFinding::not_enough_evidence);
}

}  // namespace

std::vector<double> holm_adjusted(std::span<const double> p) {
  std::vector<std::size_t> order(p.size());
  std::iota(order.begin(), order.end(), 0u);
  std::ranges::stable_sort(order, {}, [&](std::size_t i) { return p[i]; });
  std::vector<double> result(p.size());
  double running = 0;
  for (std::size_t rank = 0; rank < order.size(); ++rank) {
    running = std::max(running, std::min(1.0, static_cast<double>(p.size() - rank) * p[order[rank]]));
    result[order[rank]] = running;
  }
  return result;
}

LensReport lens_report(std::span<const LensReading> readings, const LensReportOptions& options) {
  LensReport report;
  std::vector<ReadingGroup> groups = group_readings(readings);
  report.trends = lens_trends(groups, readings);
  report.lens_or_body = lens_or_body(groups);
  for (ReadingGroup& group : groups) report.groups.push_back(measured(std::move(group), readings, options));
  adjust(report);
  for (LensGroup& group : report.groups) {
    group.finding = finding_of(group);
    group.text = finding_text(group);
    group.next = next_step_text(group);
  }
  report.finding = common_finding(report.groups);
  report.summary = summary_text(report);
  return report;
}

}  // namespace focusfall
