// Per-frame results of an invented lens: true bias, scatter between acts of focusing, each frame's own error.
#pragma once

#include <cmath>
#include <random>
#include <vector>

#include "analysis/compare/lens_report.h"

namespace focusfall {

inline constexpr double kSimulatedLimitUm = 60;   // 2 px of 10.7 um at f/2.8

struct SimulatedSeries {
  double bias_limits = 0;
  double scatter_limits = 0.25;
  int bursts = 12;                    // acts of focusing
  int frames_each = 1;
  double systematic_limits = kSystematicFloorLimits / 1.96;   // standard deviation of the error all frames share
  std::string lens = "lens", body = "body";
  double f_number = 2.8, focus_distance_m = 3, focal_length_mm = 85;
};

// Frames' own errors differ by a factor of four, as those of plane fits on poor and rich surfaces do.
inline std::vector<LensReading> simulated(const SimulatedSeries& series, std::mt19937_64& random) {
  std::normal_distribution<double> normal;
  std::uniform_real_distribution<double> uniform;
  std::vector<LensReading> readings;
  const double shared = series.systematic_limits * normal(random);
  for (int burst = 0; burst < series.bursts; ++burst) {
    const double focus = series.bias_limits + shared + series.scatter_limits * normal(random);
    for (int k = 0; k < series.frames_each; ++k) {
      const double sigma = 0.05 * std::pow(4.0, uniform(random));
      LensReading reading;
      reading.frame = readings.size();
      reading.lens = series.lens;
      reading.body = series.body;
      reading.focal_length_mm = series.focal_length_mm;
      reading.f_number = series.f_number;
      reading.focus_distance_m = series.focus_distance_m;
      reading.area = FocusAreaPlace::centre;
      reading.focus_mode = "single";
      reading.taken_at_s = 20.0 * burst + 0.1 * k;
      reading.on_surface = true;
      reading.defocus_um = kSimulatedLimitUm * (focus + sigma * normal(random));
      reading.sigma_um = kSimulatedLimitUm * sigma;
      reading.limit_um = kSimulatedLimitUm;
      readings.push_back(reading);
    }
  }
  return readings;
}

}  // namespace focusfall
