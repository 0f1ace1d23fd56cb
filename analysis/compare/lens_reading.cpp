#include "analysis/compare/lens_reading.h"

#include <algorithm>
#include <cmath>
#include <compare>
#include <limits>
#include <map>
#include <numeric>
#include <tuple>

namespace focusfall {
namespace {

constexpr double kFocalSpan = 1.05 / 0.95;    // 5 % to each side of the middle
constexpr double kDistanceSpan = 1.5;         // judgement: about the repeat of a marked distance on a lens barrel

// Frames closer than this are a burst, whatever the focus did: continuous drive makes at least about two a second.
// Frames up to kHeldFocusS apart belong together where focus stayed. (Judgement.)
constexpr double kBurstGapS = 0.55;
constexpr double kHeldFocusS = 2;
constexpr double kSameDistance = 1e-6;        // relative: the recorded distance did not change

// Numbers for values that lie within a factor of `span` of the first of their cluster, from the smallest on.
std::vector<int> clusters(const std::vector<double>& values, double span) {
  std::vector<std::size_t> order(values.size());
  std::iota(order.begin(), order.end(), 0u);
  std::ranges::stable_sort(order, {}, [&](std::size_t i) { return values[i]; });
  std::vector<int> numbers(values.size());
  int cluster = -1;
  double first = 0;
  for (const std::size_t i : order) {
    const bool joins = cluster >= 0 && (values[i] <= first * span || values[i] == first);
    if (!joins) {
      ++cluster;
      first = values[i];
    }
    numbers[i] = cluster;
  }
  return numbers;
}

bool same_acquisition(const LensReading& before, const LensReading& after) {
  if (!before.taken_at_s || !after.taken_at_s) return false;
  const double gap_s = *after.taken_at_s - *before.taken_at_s;
  if (gap_s <= kBurstGapS) return true;
  if (gap_s > kHeldFocusS) return false;
  if (!before.focus_distance_m || !after.focus_distance_m) return true;
  const double a = *before.focus_distance_m, b = *after.focus_distance_m;
  return a == b || std::abs(a - b) <= kSameDistance * std::min(a, b);
}

// Mean weighted by the errors of the readings; a plain mean where one claims none.
void combine(Acquisition& acquisition, std::span<const LensReading> readings) {
  double weights = 0, sum = 0;
  bool plain = false;
  for (const std::size_t i : acquisition.readings) plain = plain || !(readings[i].sigma_um > 0);
  for (const std::size_t i : acquisition.readings) {
    const double weight = plain ? 1 : 1 / (readings[i].sigma_um * readings[i].sigma_um);
    weights += weight;
    sum += weight * readings[i].defocus_um;
  }
  acquisition.defocus_um = sum / weights;
  acquisition.sigma_um = plain ? 0 : 1 / std::sqrt(weights);
}

void find_acquisitions(ReadingGroup& group, std::span<const LensReading> readings) {
  std::ranges::stable_sort(group.readings, {}, [&](std::size_t i) {
    return readings[i].taken_at_s.value_or(-std::numeric_limits<double>::infinity());
  });
  for (std::size_t k = 0; k < group.readings.size(); ++k) {
    const bool joins = k > 0 && same_acquisition(readings[group.readings[k - 1]], readings[group.readings[k]]);
    if (!joins) group.acquisitions.emplace_back();
    group.acquisitions.back().readings.push_back(group.readings[k]);
  }
  for (Acquisition& acquisition : group.acquisitions) combine(acquisition, readings);
}

void describe(ReadingGroup& group, std::span<const LensReading> readings) {
  std::vector<double> focal, distance, limit;
  for (const std::size_t i : group.readings) {
    focal.push_back(readings[i].focal_length_mm);
    limit.push_back(readings[i].limit_um);
    if (readings[i].focus_distance_m) distance.push_back(*readings[i].focus_distance_m);
  }
  group.focal_length_mm = median(focal);
  group.limit_um = median(limit);
  if (!distance.empty()) group.focus_distance_m = median(distance);
}

// Marked f-numbers are rounded: 2.8 and 2.83 are one. Twelfths of a stop.
int f_number_key(double f_number) { return static_cast<int>(std::lround(24 * std::log2(f_number))); }

}  // namespace

double median(std::vector<double> values) {
  std::ranges::sort(values);
  const std::size_t n = values.size();
  return n % 2 == 1 ? values[n / 2] : values[n / 2 - 1] + (values[n / 2] - values[n / 2 - 1]) / 2;
}

std::vector<ReadingGroup> group_readings(std::span<const LensReading> readings) {
  using Owner = std::pair<std::string, std::string>;
  std::map<Owner, std::vector<std::size_t>> owners;
  for (std::size_t i = 0; i < readings.size(); ++i) owners[{readings[i].lens, readings[i].body}].push_back(i);

  std::vector<ReadingGroup> result;
  for (const auto& [owner, members] : owners) {
    std::vector<double> focal, distance;
    std::vector<std::size_t> with_distance;
    for (const std::size_t i : members) {
      focal.push_back(readings[i].focal_length_mm);
      if (!readings[i].focus_distance_m) continue;
      distance.push_back(*readings[i].focus_distance_m);
      with_distance.push_back(i);
    }
    const std::vector<int> focal_number = clusters(focal, kFocalSpan), band_number = clusters(distance, kDistanceSpan);
    std::map<std::size_t, int> band;
    for (std::size_t k = 0; k < with_distance.size(); ++k) band[with_distance[k]] = band_number[k];

    using Key = std::tuple<int, int, int, FocusAreaPlace, std::string>;
    std::map<Key, ReadingGroup> groups;
    for (std::size_t k = 0; k < members.size(); ++k) {
      const LensReading& reading = readings[members[k]];
      const auto found = band.find(members[k]);
      const int band_key = found == band.end() ? -1 : found->second;   // -1 sorts frames without a distance first
      ReadingGroup& group = groups[{focal_number[k], f_number_key(reading.f_number), band_key, reading.area,
                                    reading.focus_mode}];
      group.lens = owner.first;
      group.body = owner.second;
      group.focus_mode = reading.focus_mode;
      group.focal_cluster = focal_number[k];
      group.f_number = reading.f_number;
      if (found != band.end()) group.distance_band = found->second;
      group.area = reading.area;
      group.readings.push_back(members[k]);
    }
    for (auto& [key, group] : groups) {
      find_acquisitions(group, readings);
      describe(group, readings);
      result.push_back(std::move(group));
    }
  }
  return result;
}

}  // namespace focusfall
