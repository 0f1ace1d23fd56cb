#include "analysis/optics/series.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace focusfall {
namespace {

double f_stops(double ratio) { return 2 * std::log2(ratio); }

// Differences between the printed marks and the exact values, in stops, recomputed from the lists (f/25 and f/32 from
// memory): full stops 1.4, 2.8, 5.6 -.029, 11 and 22 -.081, worst of the thirds -.141 at f/1.2.
TEST(Series, MarksOfFNumbersDifferFromTheExactValuesAsKnown) {
  for (const double mark : {1.4, 2.8, 5.6}) EXPECT_NEAR(f_stops(mark / *exact_f_number(mark)), -.029, 5e-4);
  for (const double mark : {11., 22.}) EXPECT_NEAR(f_stops(mark / *exact_f_number(mark)), -.081, 5e-4);
  EXPECT_NEAR(f_stops(1.2 / *exact_f_number(1.2)), -.141, 5e-4);
  double worst = 0;
  for (const double mark : f_number_marks()) worst = std::max(worst, std::abs(f_stops(mark / *exact_f_number(mark))));
  EXPECT_LE(worst, kFNumberMarkTolerance);
}

// Recomputed from the lists: 1/15, 1/30, 1/60 +.093 stop; 1/125 ... 1/8000 +.034; 15 s and 30 s -.093.
TEST(Series, MarksOfTimesDifferFromTheExactValuesAsKnown) {
  const auto stops = [](double mark_s) { return std::log2(mark_s / *exact_exposure_time_s(mark_s)); };
  for (const double n : {15., 30., 60.}) EXPECT_NEAR(stops(1 / n), .093, 5e-4);
  for (const double n : {125., 250., 500., 1000., 2000., 4000., 8000.}) EXPECT_NEAR(stops(1 / n), .034, 5e-4);
  for (const double t : {15., 30.}) EXPECT_NEAR(stops(t), -.093, 5e-4);
  for (const double mark : exposure_time_marks_s()) EXPECT_LE(std::abs(stops(mark)), kTimeMarkTolerance);
}

TEST(Series, ExactValuesArePowersOfTwoAThirdOfAStopApart) {
  const auto marks = f_number_marks();
  for (std::size_t i = 1; i < marks.size(); ++i) {
    EXPECT_NEAR(f_stops(*exact_f_number(marks[i]) / *exact_f_number(marks[i - 1])), 1 / 3., 1e-12) << "f/" << marks[i];
  }
  const auto times = exposure_time_marks_s();
  for (std::size_t i = 1; i < times.size(); ++i) {
    EXPECT_NEAR(std::log2(*exact_exposure_time_s(times[i]) / *exact_exposure_time_s(times[i - 1])), 1 / 3., 1e-12);
  }
}

TEST(Series, MarkOfTheExactValueIsTheMark) {
  for (const double mark : f_number_marks()) EXPECT_EQ(nominal_f_number(*exact_f_number(mark)), mark);
  for (const double mark : exposure_time_marks_s()) EXPECT_EQ(nominal_exposure_time_s(*exact_exposure_time_s(mark)), mark);
}

TEST(Series, ANumberOnNoSeriesIsTakenAsItStands) {
  EXPECT_FALSE(exact_f_number(4.2));   // a zoom lens at its long end
  EXPECT_FALSE(exact_f_number(2.9));
}

TEST(Series, RoundingToAMarkNeverLosesTheLimitThatItMustHold) {
  for (double n = 0.71; n < 60; n *= 1.037) {
    const auto mark = f_number_mark_at_least(n);
    ASSERT_TRUE(mark);
    EXPECT_GE(*exact_f_number(*mark), n * (1 - 1e-9));
    EXPECT_LT(f_stops(*exact_f_number(*mark) / n), 1 / 3. + 1e-6);
  }
  for (double t = 1. / 7900; t < 25; t *= 1.19) {
    const auto mark = exposure_time_mark_at_most_s(t);
    ASSERT_TRUE(mark);
    EXPECT_LE(*exact_exposure_time_s(*mark), t * (1 + 1e-9));
  }
  EXPECT_FALSE(f_number_mark_at_least(100));
}

}  // namespace
}  // namespace focusfall
