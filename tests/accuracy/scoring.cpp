#include "tests/accuracy/scoring.h"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <fmt/format.h>
#include <numeric>
#include <thread>

namespace focusfall::accuracy {

std::uint64_t first_key(const SetOptions& options, int set) {
  return (options.tuning ? 1'000'000ULL : 9'000'000ULL) + 100'000ULL * static_cast<std::uint64_t>(set);
}

int count_of(const SetOptions& options, int full, int quick) {
  if (options.quick) return quick;
  return std::max(1, static_cast<int>(full * options.share));
}

bool reached(const Figure& figure) {
  return figure.at_most ? figure.value <= figure.target : figure.value >= figure.target;
}

void print(const std::vector<Figure>& figures) {
  for (const Figure& f : figures)
    fmt::print("  {:<58} {:8.2f} {:<3} target {} {:6.2f}  {:<11} n {}\n", f.what, f.value, f.unit, f.at_most ? "<=" : ">=",
               f.target, reached(f) ? "reached" : "NOT REACHED", f.cases);
}

double quantile(std::vector<double> values, double share) {
  if (values.empty()) return 0;
  std::sort(values.begin(), values.end());
  const double place = share * static_cast<double>(values.size() - 1);
  const auto below = static_cast<std::size_t>(place);
  const std::size_t above = std::min(below + 1, values.size() - 1);
  return values[below] + (place - static_cast<double>(below)) * (values[above] - values[below]);
}

double median(std::vector<double> values) { return quantile(std::move(values), 0.5); }

double mean(const std::vector<double>& values) {
  if (values.empty()) return 0;
  return std::accumulate(values.begin(), values.end(), 0.0) / static_cast<double>(values.size());
}

double robust_deviation(const std::vector<double>& values) {
  return (quantile(values, 0.84) - quantile(values, 0.16)) / 2;
}

void for_each_case(int count, const std::function<void(int, FrameMeasurer&)>& work) {
  std::atomic<int> next{0};
  const auto loop = [&] {
    FrameMeasurer measurer;
    for (int i = next++; i < count; i = next++) work(i, measurer);
  };
  std::vector<std::thread> threads;
  for (unsigned i = 1; i < std::max(1U, std::thread::hardware_concurrency()); ++i) threads.emplace_back(loop);
  loop();
  for (std::thread& thread : threads) thread.join();
}

MeasureRequest request_for(const cv::Rect& aim, cv::Size frame) {
  MeasureRequest request;
  const double w = frame.width, h = frame.height;
  request.aim.box = {aim.x / w, aim.y / h, aim.width / w, aim.height / h};
  return request;
}

}  // namespace focusfall::accuracy
