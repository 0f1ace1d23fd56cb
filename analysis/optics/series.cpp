#include "analysis/optics/series.h"

#include <algorithm>
#include <array>
#include <cmath>

namespace focusfall {
namespace {

// Exif rationals and decimal settings repeat a mark to better than this.
constexpr double kSameMark = 0.006;

// A number this close, in stops, to an exact step is taken for that step. The half-stop marks that are no thirds lie
// within .055 (f/3.3) and .05 (1/350 s) of theirs, 1/3 s, which is also written .3, within .082. Judgement: f-numbers
// are kept tighter, since a lens may well open to f/2.9 or f/4.2.
constexpr double kFNumberStep = 0.06;
constexpr double kTimeStep = 0.085;

// Marks of f-numbers as printed on lenses and displays; list read in Wikipedia "F-number", f/25-64 from memory.
constexpr std::array kFNumberMarks = {0.7, 0.8, 0.9, 1.0, 1.1, 1.2, 1.4, 1.6, 1.8, 2.0,  2.2,  2.5,  2.8,  3.2,
                                      3.5, 4.0, 4.5, 5.0, 5.6, 6.3, 7.1, 8.0, 9.0, 10.0, 11.0, 13.0, 14.0, 16.0,
                                      18.0, 20.0, 22.0, 25.0, 29.0, 32.0, 36.0, 40.0, 45.0, 51.0, 57.0, 64.0};
constexpr int kFirstFNumberThird = -3;

// Marks of exposure times as displayed, 1/8000 s to 30 s.
constexpr std::array kTimeMarks = {
    1 / 8000., 1 / 6400., 1 / 5000., 1 / 4000., 1 / 3200., 1 / 2500., 1 / 2000., 1 / 1600., 1 / 1250., 1 / 1000., 1 / 800.,
    1 / 640.,  1 / 500.,  1 / 400.,  1 / 320.,  1 / 250.,  1 / 200.,  1 / 160.,  1 / 125.,  1 / 100.,  1 / 80.,   1 / 60.,
    1 / 50.,   1 / 40.,   1 / 30.,   1 / 25.,   1 / 20.,   1 / 15.,   1 / 13.,   1 / 10.,   1 / 8.,    1 / 6.,    1 / 5.,
    1 / 4.,    0.3,       0.4,       0.5,       0.6,       0.8,       1.0,       1.3,       1.6,       2.0,       2.5,
    3.2,       4.0,       5.0,       6.0,       8.0,       10.0,      13.0,      15.0,      20.0,      25.0,      30.0};
constexpr int kFirstTimeThird = -39;

// A series of marks, one a third of a stop, on a scale where value = 2^(stops * octaves_per_stop).
struct Series {
  std::span<const double> marks;
  int first_third;
  double octaves_per_stop;   // f-numbers double in two stops, times in one
  double exact_step;

  double stops(double value) const { return std::log2(value) / octaves_per_stop; }
  double value(double at_stops) const { return std::exp2(at_stops * octaves_per_stop); }
  double exact(std::size_t index) const { return value((first_third + static_cast<double>(index)) / 3); }
};

const Series kFNumbers{kFNumberMarks, kFirstFNumberThird, 0.5, kFNumberStep};
const Series kTimes{kTimeMarks, kFirstTimeThird, 1, kTimeStep};

std::optional<double> exact_value(const Series& series, double nominal) {
  for (std::size_t i = 0; i < series.marks.size(); ++i) {
    if (std::abs(nominal / series.marks[i] - 1) < kSameMark) return series.exact(i);
  }
  const double stops = series.stops(nominal);
  const double third = std::round(3 * stops) / 3, half = std::round(2 * stops) / 2;
  const double nearest = std::abs(stops - third) <= std::abs(stops - half) ? third : half;
  if (std::abs(stops - nearest) > series.exact_step) return std::nullopt;
  return series.value(nearest);
}

std::optional<double> mark_at_third(const Series& series, double third) {
  const double index = third - series.first_third;
  if (index < 0 || index >= static_cast<double>(series.marks.size())) return std::nullopt;
  return series.marks[static_cast<std::size_t>(index)];
}

std::optional<double> nominal_value(const Series& series, double exact) {
  return mark_at_third(series, std::round(3 * series.stops(exact)));
}

// Steps are counted exactly but for rounding: a value that is a step already must not be pushed to the next.
constexpr double kStepRounding = 1e-9;

}  // namespace

std::span<const double> f_number_marks() { return kFNumberMarks; }
std::span<const double> exposure_time_marks_s() { return kTimeMarks; }

std::optional<double> exact_f_number(double nominal) { return exact_value(kFNumbers, nominal); }
std::optional<double> exact_exposure_time_s(double nominal_s) { return exact_value(kTimes, nominal_s); }

std::optional<double> nominal_f_number(double exact) { return nominal_value(kFNumbers, exact); }
std::optional<double> nominal_exposure_time_s(double exact_s) { return nominal_value(kTimes, exact_s); }

std::optional<double> f_number_mark_at_least(double f_number) {
  const double third = std::ceil(3 * kFNumbers.stops(f_number) - kStepRounding);
  return mark_at_third(kFNumbers, std::max<double>(third, kFirstFNumberThird));
}

std::optional<double> exposure_time_mark_at_most_s(double exposure_time_s) {
  const double third = std::floor(3 * kTimes.stops(exposure_time_s) + kStepRounding);
  const double last = kFirstTimeThird + static_cast<double>(kTimeMarks.size()) - 1;
  return mark_at_third(kTimes, std::min(third, last));
}

}  // namespace focusfall
