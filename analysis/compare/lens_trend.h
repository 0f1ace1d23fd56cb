// What the bias of a lens goes along with, and whether it is the lens or the body: across groups.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/compare/lens_reading.h"
#include "analysis/conventions.h"

namespace focusfall {

enum class TrendKind { focus_distance, f_number, focal_length, approach };

// Change of the defocus with one condition, everything else held: each set of like conditions has a mean of its own
// and only what varies inside it counts.
struct LensTrend {
  TrendKind kind = TrendKind::focus_distance;
  std::string lens, body;
  // um at the sensor: per doubling of the focus distance or focal length, per stop, or far minus near approach.
  std::optional<Interval> slope_um;      // absent where the data cannot carry it
  std::string missing;                   // why it is absent: one sentence
  double low_end = 0, high_end = 0;      // range of the condition: m, f-number, mm; 0 for the approach
  double span = 0;                       // that range in doublings or stops; 1 for the approach
  int acquisitions = 0;
  double limit_um = 0;                   // median
  double p = 1;
  double p_holm = 1;                     // over all groups and trends of the run; filled in by the report
};

// One lens or body against the mean of those it was crossed with.
struct PartEffect {
  std::string name;
  Interval effect_um;
  double p = 1;
  double p_holm = 1;
};

// bias = common + lens + body. The common part belongs to neither.
struct LensOrBody {
  std::vector<PartEffect> lenses, bodies;   // empty where the frames cannot tell
  std::string missing;                      // why
  std::optional<double> p_interaction;      // that one lens behaves differently on one body; from >= 1 spare cell
};

// Every kind for every lens and body among the groups, in their order; those that cannot be carried say why.
std::vector<LensTrend> lens_trends(std::span<const ReadingGroup> groups, std::span<const LensReading> readings);

LensOrBody lens_or_body(std::span<const ReadingGroup> groups);

}  // namespace focusfall
