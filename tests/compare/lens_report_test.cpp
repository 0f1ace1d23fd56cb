#include "analysis/compare/lens_report.h"

#include <gmock/gmock.h>
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_fit.h>
#include <gsl/gsl_statistics_double.h>
#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <cstdio>
#include <random>
#include <stdexcept>
#include <utility>

#include "analysis/compare/lens_fit.h"
#include "tests/compare/simulated_series.h"

namespace focusfall {
namespace {

using testing::DoubleNear;
using testing::ElementsAre;
using testing::HasSubstr;

constexpr int kSeries = 2000;

// What 2,000 series said of a true bias.
struct Calls {
  int front = 0, back = 0, within = 0, scatter = 0, covered = 0, series = 0;
  double side_share() const { return static_cast<double>(front + back) / series; }
  double coverage() const { return static_cast<double>(covered) / series; }
};

Calls calls_of(const SimulatedSeries& truth, unsigned seed, int series = kSeries) {
  std::mt19937_64 random(seed);
  Calls calls;
  for (int i = 0; i < series; ++i) {
    const LensReport report = lens_report(simulated(truth, random));
    const LensGroup& group = report.groups.at(0);
    ++calls.series;
    calls.front += group.finding == LensFinding::front_focus;
    calls.back += group.finding == LensFinding::back_focus;
    calls.within += group.finding == LensFinding::within_tolerance;
    calls.scatter += group.finding == LensFinding::scatter;
    const double true_um = truth.bias_limits * kSimulatedLimitUm;
    calls.covered += group.bias_um->low <= true_um && true_um <= group.bias_um->high;
  }
  return calls;
}

// The interval's own promise, 95 %, and 2,000 series tell it to 1 % (two standard errors): 93 to 97 %.
void expect_promise_kept(const Calls& calls) {
  EXPECT_GE(calls.coverage(), 0.93);
  EXPECT_LE(calls.coverage(), 0.97);
}

void record(const Calls& calls) {
  std::printf("    called front or back %.2f %%, interval covers %.2f %%\n", 100 * calls.side_share(),
              100 * calls.coverage());
}

TEST(LensReport, CallsNoSideWhereThereIsNoBias) {
  for (const double scatter : {0.25, 1.0}) {
    SCOPED_TRACE(scatter);
    const Calls calls = calls_of({.bias_limits = 0, .scatter_limits = scatter}, 11);
    EXPECT_LE(calls.side_share(), 0.055);
    expect_promise_kept(calls);
    record(calls);
  }
}

TEST(LensReport, TakesABurstAsOneWitness) {
  for (const auto& [bursts, frames] : {std::pair{3, 4}, {6, 2}, {12, 5}}) {
    SCOPED_TRACE(testing::Message() << bursts << " bursts of " << frames);
    const Calls calls = calls_of({.bias_limits = 0, .bursts = bursts, .frames_each = frames}, 12);
    EXPECT_LE(calls.side_share(), 0.055);
    expect_promise_kept(calls);
    record(calls);
  }
}

TEST(LensReport, CoversTheTruthOnAnySideOfIt) {
  for (const double bias : {-2.0, -0.5, 0.25, 1.0}) {
    for (const int bursts : {5, 8, 30}) {
      SCOPED_TRACE(testing::Message() << bias << " limits, " << bursts << " acquisitions");
      const Calls calls = calls_of({.bias_limits = bias, .bursts = bursts}, 13);
      expect_promise_kept(calls);
      }
  }
}

TEST(LensReport, FindsTheSideOfHalfALimitAndMore) {
  for (const double bias : {-2.0, -1.0, -0.5, 0.5, 1.0, 2.0}) {
    SCOPED_TRACE(bias);
    const Calls calls = calls_of({.bias_limits = bias}, 14, 500);
    EXPECT_EQ(bias < 0 ? calls.back : calls.front, 0);
    EXPECT_GE(bias < 0 ? calls.front : calls.back, 490);
  }
}

// Without strays, own errors or floor the interval must be Student's, but for the clipping, which costs at most 2 %.
TEST(RobustFit, IsCloseToStudentsIntervalOnQuietReadings) {
  const std::array<double, 8> y{1.2, 0.4, -0.3, 0.9, 1.6, 0.1, 0.7, 1.0};
  const double mean = gsl_stats_mean(y.data(), 1, y.size());
  const double half = gsl_cdf_tdist_Pinv(0.975, 7) * gsl_stats_sd(y.data(), 1, y.size()) / std::sqrt(8.0);
  const Eigen::Map<const Eigen::VectorXd> values(y.data(), 8);
  const auto fit = robust_fit(Eigen::MatrixXd::Ones(8, 1), values, Eigen::VectorXd::Zero(8));
  ASSERT_TRUE(fit);
  const Interval interval =
      interval_95({fit->coefficients[0], std::sqrt(fit->covariance(0, 0)), fit->freedom, 0});
  EXPECT_NEAR(interval.value, mean, 1e-6);
  // No residual is clipped here, so that the spread is s / sqrt(kappa) and the half width Student's / .9545.
  EXPECT_NEAR((interval.high - interval.low) / 2, half / 0.9544997, 1e-4 * half);
}

// Known own errors and no other spread: the weighted straight line of GSL, whose covariance is scaled by the errors.
TEST(RobustFit, AgreesWithTheWeightedLineOfGsl) {
  const std::array<double, 6> x{0, 1, 2, 3, 4, 5}, y{0.02, 0.49, 1.03, 1.48, 2.02, 2.49};
  const std::array<double, 6> sigma{0.1, 0.05, 0.1, 0.2, 0.05, 0.1};
  std::array<double, 6> weight{};
  Eigen::MatrixXd design(6, 2);
  for (int i = 0; i < 6; ++i) {
    weight[i] = 1 / (sigma[i] * sigma[i]);
    design(i, 0) = 1;
    design(i, 1) = x[i];
  }
  double c0 = 0, c1 = 0, cov00 = 0, cov01 = 0, cov11 = 0, chi2 = 0;
  gsl_fit_wlinear(x.data(), 1, weight.data(), 1, y.data(), 1, 6, &c0, &c1, &cov00, &cov01, &cov11, &chi2);
  const auto fit = robust_fit(design, Eigen::Map<const Eigen::VectorXd>(y.data(), 6),
                              Eigen::Map<const Eigen::VectorXd>(sigma.data(), 6));
  ASSERT_TRUE(fit);
  EXPECT_EQ(fit->spread.value, 0);
  EXPECT_NEAR(fit->coefficients[0], c0, 1e-9);
  EXPECT_NEAR(fit->coefficients[1], c1, 1e-9);
  EXPECT_NEAR(fit->covariance(1, 1), cov11 * chi2 / 4 / (0.9544997 * 0.9544997), 1e-6 * cov11);
}

TEST(RobustFit, IsHardlyMovedByOneStray) {
  Eigen::VectorXd y(12);
  y << 0.1, -0.2, 0.05, 0.15, -0.1, 0, 0.2, -0.15, 0.1, -0.05, 0.02, 8;
  const auto fit = robust_fit(Eigen::MatrixXd::Ones(12, 1), y, Eigen::VectorXd::Constant(12, 0.05));
  ASSERT_TRUE(fit);
  EXPECT_LT(std::abs(fit->coefficients[0]), 0.1);   // the plain mean is .68
  EXPECT_GT(fit->residuals[11], 3.5);
}

TEST(RobustFit, RefusesWhatCannotBeTold) {
  EXPECT_FALSE(robust_fit(Eigen::MatrixXd::Ones(2, 1), Eigen::VectorXd::Ones(2), Eigen::VectorXd::Ones(2)));
  EXPECT_FALSE(robust_fit(Eigen::MatrixXd::Ones(9, 2), Eigen::VectorXd::Ones(9), Eigen::VectorXd::Ones(9)));
}

TEST(PValue, IsFivePercentAtTheEndOfTheInterval) {
  for (const double floor : {0.0, 0.4}) {
    Estimate estimate{.value = 0, .standard_error = 0.3, .freedom = 6, .floor = floor};
    estimate.value = interval_95(estimate).high;
    EXPECT_NEAR(p_value(estimate), 0.05, 1e-6);
  }
  const Estimate plain{.value = 0.75, .standard_error = 0.3, .freedom = 6, .floor = 0};
  EXPECT_NEAR(p_value(plain), 2 * gsl_cdf_tdist_Q(2.5, 6), 1e-9);
}

// Holm's own rule by hand: .01 x 4, .02 x 3, .03 x 2, .04 x 1 with the running largest.
TEST(Holm, AdjustsInOrderAndNeverFalls) {
  const std::array p{0.04, 0.01, 0.03, 0.02};
  EXPECT_THAT(holm_adjusted(p), ElementsAre(DoubleNear(0.06, 1e-12), DoubleNear(0.04, 1e-12), DoubleNear(0.06, 1e-12),
                                            DoubleNear(0.06, 1e-12)));
  EXPECT_THAT(holm_adjusted(std::array{0.7, 0.9}), ElementsAre(1.0, 1.0));
}

// ---- groups ---------------------------------------------------------------------------------------------------------

LensReading reading_at(double time_s, double focus_distance_m) {
  LensReading reading;
  reading.lens = "lens";
  reading.focal_length_mm = 85;
  reading.f_number = 2.8;
  reading.focus_distance_m = focus_distance_m;
  reading.taken_at_s = time_s;
  reading.limit_um = kSimulatedLimitUm;
  reading.sigma_um = 5;
  return reading;
}

TEST(Acquisitions, AreBurstsAndHeldFocus) {
  const std::array readings{reading_at(0, 3), reading_at(0.3, 3.1),   // a burst that refocuses
                            reading_at(10, 3), reading_at(11.5, 3),   // focus held
                            reading_at(20, 3), reading_at(21.5, 3.1), // focused anew within two seconds
                            reading_at(30, 3)};
  const auto groups = group_readings(readings);
  ASSERT_EQ(groups.size(), 1u);
  std::vector<std::size_t> sizes;
  for (const Acquisition& one : groups[0].acquisitions) sizes.push_back(one.readings.size());
  EXPECT_THAT(sizes, ElementsAre(2u, 2u, 1u, 1u, 1u));
}

TEST(Groups, DoNotCutDistancesThatLieTogether) {
  std::vector<LensReading> readings;
  for (int i = 0; i < 10; ++i) readings.push_back(reading_at(20 * i, 3.8 + 0.05 * i));   // across 4 m
  for (int i = 0; i < 5; ++i) readings.push_back(reading_at(500 + 20 * i, 9 + 0.1 * i));
  const auto groups = group_readings(readings);
  ASSERT_EQ(groups.size(), 2u);
  EXPECT_EQ(groups[0].readings.size(), 10u);
}

// ---- findings -------------------------------------------------------------------------------------------------------

TEST(LensReport, CallsScatterWhatScatters) {
  std::mt19937_64 random(5);
  const LensReport report = lens_report(simulated({.scatter_limits = 2, .bursts = 30}, random));
  EXPECT_EQ(report.groups.at(0).finding, LensFinding::scatter);
  EXPECT_TRUE(report.groups.at(0).mixed);
}

TEST(LensReport, FindsALensWithinTolerance) {
  std::mt19937_64 random(6);
  const LensReport report = lens_report(simulated({.bursts = 20}, random));
  EXPECT_EQ(report.groups.at(0).finding, LensFinding::within_tolerance);
}

TEST(LensReport, AsksForMoreThanFourFrames) {
  std::mt19937_64 random(7);
  const LensReport report = lens_report(simulated({.bias_limits = 2, .bursts = 4}, random));
  EXPECT_EQ(report.groups.at(0).finding, LensFinding::not_enough_evidence);
  EXPECT_THAT(report.summary, HasSubstr("4 usable frames"));
}

TEST(LensReport, GivesAHintFromFewOrdinaryFrames) {
  std::mt19937_64 random(8);
  auto readings = simulated({.bias_limits = 2}, random);
  for (LensReading& reading : readings) reading.on_surface = false;
  const LensGroup group = lens_report(readings).groups.at(0);
  EXPECT_EQ(group.kind, SeriesKind::ordinary_frames);
  EXPECT_EQ(group.finding, LensFinding::not_enough_evidence);
  EXPECT_THAT(group.text, HasSubstr("A hint"));
}

TEST(LensReport, NamesOutliers) {
  std::mt19937_64 random(9);
  auto readings = simulated({}, random);
  readings[4].defocus_um += 8 * kSimulatedLimitUm;
  EXPECT_THAT(lens_report(readings).groups.at(0).outliers, ElementsAre(4u));
}

// ---- across groups --------------------------------------------------------------------------------------------------

void append(std::vector<LensReading>& all, const std::vector<LensReading>& more) {
  for (LensReading reading : more) {
    reading.frame = all.size();
    all.push_back(reading);
  }
}

const LensTrend& trend(const LensReport& report, TrendKind kind) {
  for (const LensTrend& one : report.trends) {
    if (one.kind == kind) return one;
  }
  throw std::logic_error("every kind is listed");
}

// Focus shift of +15 um a stop over three stops.
std::vector<LensReading> stopped_down(std::mt19937_64& random) {
  std::vector<LensReading> all;
  for (int stop = 0; stop < 4; ++stop) {
    append(all, simulated({.bias_limits = 0.25 * stop, .bursts = 8, .systematic_limits = 0,
                           .f_number = 1.4 * std::pow(2, stop / 2.0)}, random));
  }
  return all;
}

TEST(LensTrends, FindFocusShift) {
  std::mt19937_64 random(21);
  const LensReport report = lens_report(stopped_down(random));
  const LensTrend& shift = trend(report, TrendKind::f_number);
  ASSERT_TRUE(shift.slope_um);
  EXPECT_LT(shift.slope_um->low, 15);
  EXPECT_GT(shift.slope_um->high, 15);
  EXPECT_LT(shift.p_holm, 0.05);
  EXPECT_FALSE(trend(report, TrendKind::focus_distance).slope_um);   // one distance only
  EXPECT_THAT(trend_text(trend(report, TrendKind::focus_distance)), HasSubstr("factor of 2"));
}

// 400 series without a trend: about 5 % are significant, and 5 % +- 2.2 % (two standard errors) is what 400 can tell.
TEST(LensTrends, AreNotSeenWhereThereIsNone) {
  std::mt19937_64 random(22);
  int significant = 0;
  for (int i = 0; i < 400; ++i) {
    std::vector<LensReading> all;
    for (const double distance_m : {1.5, 4.0, 12.0}) {
      append(all, simulated({.bias_limits = 0.5, .bursts = 5, .systematic_limits = 0, .focus_distance_m = distance_m},
                            random));
    }
    significant += trend(lens_report(all), TrendKind::focus_distance).p < 0.05;
  }
  EXPECT_LE(significant, 29);
}

std::vector<LensReading> crossed(std::mt19937_64& random, bool complete) {
  std::vector<LensReading> all;
  const std::array<double, 2> lens{0.5, -0.5}, body{0.2, -0.2};
  for (int l = 0; l < 2; ++l) {
    for (int b = 0; b < 2; ++b) {
      if (!complete && l == 1 && b == 1) continue;
      append(all, simulated({.bias_limits = lens[l] + body[b], .bursts = 10, .systematic_limits = 0,
                             .lens = l == 0 ? "A" : "B", .body = b == 0 ? "1" : "2"}, random));
    }
  }
  return all;
}

TEST(LensOrBody, TellsThePartsApartWhereTheyAreCrossed) {
  std::mt19937_64 random(31);
  const LensOrBody parts = lens_report(crossed(random, true)).lens_or_body;
  ASSERT_EQ(parts.lenses.size(), 2u);
  EXPECT_LT(parts.lenses[0].effect_um.low, 0.5 * kSimulatedLimitUm);
  EXPECT_GT(parts.lenses[0].effect_um.high, 0.5 * kSimulatedLimitUm);
  EXPECT_NEAR(parts.lenses[0].effect_um.value, -parts.lenses[1].effect_um.value, 1e-9);
  EXPECT_LT(parts.lenses[0].p_holm, 0.05);
  EXPECT_LT(parts.bodies[0].effect_um.low, 0.2 * kSimulatedLimitUm);
  EXPECT_GT(parts.bodies[0].effect_um.high, 0.2 * kSimulatedLimitUm);
}

TEST(LensOrBody, SaysSoWhereTheyAreNotCrossed) {
  std::mt19937_64 random(32);
  const LensOrBody parts = lens_report(crossed(random, false)).lens_or_body;
  EXPECT_TRUE(parts.lenses.empty());
  EXPECT_THAT(lens_or_body_text(parts), HasSubstr("cannot be told from these frames"));
}

}  // namespace
}  // namespace focusfall
