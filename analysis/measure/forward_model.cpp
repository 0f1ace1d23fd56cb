#include "analysis/measure/forward_model.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "analysis/measure/edge_tables.h"
#include "analysis/measure/pyramid.h"
#include "analysis/measure/region_blur.h"

namespace focusfall {
namespace {

constexpr double kSamplesPerLevelPx = 16;
constexpr double kReachLevelPx = 17.0;     // half length of the drawn spread: neighbourhood and pyramid filters
// Normals in degrees, spread over the half circle, none on a lattice direction.
constexpr std::array<double, 6> kNormals = {8, 38, 68, 98, 128, 158};

// Width that the fit reports on `level` across one direction.
std::optional<float> width_across(const SystemResponse& system, int level, double normal_deg) {
  const double step = (1 << level) / kSamplesPerLevelPx;
  const double reach = kReachLevelPx * (1 << level);
  const std::vector<double> spread = edge_spread(system, normal_deg, step, reach);
  const double middle = static_cast<double>(spread.size() / 2);
  return width_of_drawn_edge(level, normal_deg * M_PI / 180, [&](double u) {
    const double at = std::clamp(u / step + middle, 0.0, static_cast<double>(spread.size()) - 1.001);
    const auto i = static_cast<std::size_t>(at);
    return spread[i] + (at - static_cast<double>(i)) * (spread[i + 1] - spread[i]);
  });
}

double median(std::vector<double> values) {
  std::sort(values.begin(), values.end());
  const std::size_t n = values.size();
  return n % 2 ? values[n / 2] : 0.5 * (values[n / 2 - 1] + values[n / 2]);
}

}  // namespace

std::optional<ForwardReading> forward_reading(const SystemResponse& response) {
  SystemResponse system = response;
  system.pixel_aperture_px = 0;
  for (int level = 0; level < Pyramid::kLevels; ++level) {
    std::vector<double> widths, discs;
    for (const double normal : kNormals) {
      if (const auto width = width_across(system, level, normal)) {
        widths.push_back(*width);
        discs.push_back(squared_disc_of_width(level, *width));
      }
    }
    if (widths.empty() || median(widths) >= kLevelCeilingPx) continue;
    const double squared = median(discs);
    return ForwardReading{squared, disc_edge_rise_px(blur_disc_px(squared))};
  }
  return std::nullopt;
}

}  // namespace focusfall
