// Statistics and tables of the accuracy program.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "analysis/measure/measure_frame.h"

namespace focusfall::accuracy {

// What to run. The two families of random keys never meet: estimators are developed on the tuning sets, the tables
// that are quoted come from the held-out sets, and nobody looks at single frames of those.
struct SetOptions {
  bool tuning = false;
  bool quick = false;      // a small part, for the regression test
  bool list = false;       // one line a case on stderr (tuning sets only)
  double share = 1;        // of the cases, 0..1
};
std::uint64_t first_key(const SetOptions& options, int set);
int count_of(const SetOptions& options, int full, int quick);

// A figure with the target it is held against. `at_most` false: at least. `bound` is the limit of the regression test:
// the target where it is reached, else what is reached now with room for the scatter of the small set.
struct Figure {
  std::string what;
  double value = 0;
  double target = 0;
  bool at_most = true;
  std::string unit = "%";
  int cases = 0;
};
bool reached(const Figure& figure);
void print(const std::vector<Figure>& figures);

double quantile(std::vector<double> values, double share);   // 0 where empty
double median(std::vector<double> values);
double mean(const std::vector<double>& values);
// Half of the 16-84 % range: a standard deviation that single outliers do not move.
double robust_deviation(const std::vector<double>& values);

// Runs `work` for 0 <= i < count on all processors, each with a measurer of its own.
void for_each_case(int count, const std::function<void(int, FrameMeasurer&)>& work);

// The aim of a frame whose box is given in px, as the program would ask for it.
MeasureRequest request_for(const cv::Rect& aim, cv::Size frame);

// The sets; each prints its tables on stdout and returns the figures of its targets.
std::vector<Figure> run_regions(const SetOptions& options);
std::vector<Figure> run_predictions(const SetOptions& options);
std::vector<Figure> run_motion(const SetOptions& options);
std::vector<Figure> run_planes(const SetOptions& options);
std::vector<Figure> run_causes(const SetOptions& options);
std::vector<Figure> run_exposure(const SetOptions& options);
std::vector<Figure> run_lens(const SetOptions& options);

}  // namespace focusfall::accuracy
