// Motion or camera shake from the blur of edges: what is blurred more across one direction than across the other.
//
// A straight movement of L px along the direction phi blurs an edge whose normal makes the angle (theta - phi) with it
// by a box of L |cos(theta - phi)| px. In squared-disc units (analysis/conventions.h)
//   S(theta) = a + b cos 2 theta + d sin 2 theta,  m = 2 sqrt(b^2 + d^2) = .97 (16/12) L^2,  phi = atan2(d, b) / 2
// and a - m/2 is what blurs all directions alike: defocus, diffraction and the camera's own baseline.
#pragma once

#include <optional>
#include <span>

#include "analysis/measure/measurement.h"

namespace focusfall {

struct MotionOptions {
  int sectors = 12;              // of the edge normal, over 180 degrees
  double sector_overlap = 1.5;   // width of a sector / spacing of the sectors
  int least_edges_in_sector = 6; // fewer say nothing about their direction (as for a region)
  int least_sectors = 4;         // fewer cannot hold three unknowns and a check
};

// Fits the three unknowns to the edges of one region (the aim, or the background). std::nullopt where too few
// directions are covered. A reading is given whether or not the motion is significant: length_low_px is 0 where no
// motion would do, and length_high_px is then the most that could have gone unseen. See motion_is_significant().
std::optional<MotionReading> motion(std::span<const EdgeSample> edges, const MotionOptions& options = {});

// m / sigma_m > 3.5, L > 2 px and m > 1.2 x the isotropic part (baseline taken off): below that the blur has no
// direction worth naming.
bool motion_is_significant(const MotionReading& reading, double baseline_px2 = 0);

// Length along the direction `angle_deg` that the reading allows at most (upper 95 % bound), px.
double motion_length_bound_px(const MotionReading& reading, double angle_deg);

}  // namespace focusfall
