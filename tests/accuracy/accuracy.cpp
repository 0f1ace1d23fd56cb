// The accuracy tables: what the estimators reach on rendered tiles and frames that nothing was tuned on.
//   accuracy [--set regions|predictions|motion|planes|causes|exposure|lens]... [--share FRACTION] [--tuning [--list]] [--quick]
// --quick runs a small part and fails where a figure has fallen back behind its regression bound (regression.h).
#include <fmt/format.h>
#include <opencv2/core/utility.hpp>

#include <algorithm>
#include <chrono>
#include <exception>
#include <functional>
#include <string>
#include <vector>

#include "tests/accuracy/regression.h"
#include "tests/accuracy/scoring.h"

namespace focusfall::accuracy {
namespace {

struct Set {
  const char* name;
  std::vector<Figure> (*run)(const SetOptions&);
};
constexpr Set kSets[] = {{"regions", run_regions}, {"predictions", run_predictions}, {"motion", run_motion}, {"planes", run_planes}, {"causes", run_causes},
                         {"exposure", run_exposure}, {"lens", run_lens}};

// How many figures have fallen back behind their bound.
int count_fallen(const std::vector<Figure>& figures) {
  int fallen = 0;
  for (const RegressionBound& bound : kRegressionBounds) {
    const auto figure = std::find_if(figures.begin(), figures.end(), [&](const Figure& f) { return f.what == bound.what; });
    if (figure == figures.end()) continue;
    const bool kept = figure->at_most ? figure->value <= bound.bound : figure->value >= bound.bound;
    if (!kept) fmt::print("FALLEN BACK: {} is {:.2f}, the bound is {:.2f}\n", figure->what, figure->value, bound.bound);
    fallen += !kept;
  }
  return fallen;
}

int run(const std::vector<std::string>& arguments) {
  SetOptions options;
  std::vector<std::string> wanted;
  for (std::size_t i = 0; i < arguments.size(); ++i) {
    const std::string& a = arguments[i];
    if (a == "--tuning") options.tuning = true;
    else if (a == "--quick") options.quick = true;
    else if (a == "--list") options.list = true;
    else if (a == "--set" && i + 1 < arguments.size()) wanted.push_back(arguments[++i]);
    else if (a == "--share" && i + 1 < arguments.size()) options.share = std::stod(arguments[++i]);
    else {
      fmt::print(stderr, "accuracy: unknown argument {}\n", a);
      return 2;
    }
  }
  cv::setNumThreads(1);  // the cases run side by side
  std::vector<Figure> figures;
  for (const Set& set : kSets) {
    if (!wanted.empty() && std::find(wanted.begin(), wanted.end(), set.name) == wanted.end()) continue;
    const auto start = std::chrono::steady_clock::now();
    const std::vector<Figure> some = set.run(options);
    figures.insert(figures.end(), some.begin(), some.end());
    fmt::print(stderr, "{}: {:.0f} s\n", set.name, std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count());
  }
  fmt::print("\nFigures against their targets ({} set{})\n", options.tuning ? "tuning" : "held-out", options.quick ? ", small part" : "");
  print(figures);
  if (options.quick && !options.tuning && count_fallen(figures) > 0) return 1;
  return 0;
}

}  // namespace
}  // namespace focusfall::accuracy

int main(int count, char** arguments) {
  try {
    return focusfall::accuracy::run({arguments + 1, arguments + count});
  } catch (const std::exception& error) {
    fmt::print(stderr, "accuracy: {}\n", error.what());
    return 3;
  }
}
