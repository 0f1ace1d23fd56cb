// What the forward model says the estimator will report, against what it reports.
#include <algorithm>
#include <cmath>
#include <fmt/format.h>

#include "analysis/measure/forward_model.h"
#include "tests/accuracy/scoring.h"
#include "tests/render/tile.h"

namespace focusfall::accuracy {
namespace {

struct System {
  double disc, lambda_n_over_p, motion;
};

// Disc alone, diffraction alone and with a disc (with W20 below and above 5 wavelengths), motion, all together.
constexpr System kSystems[] = {{3, 0, 0}, {6, 0, 0}, {12, 0, 0}, {20, 0, 0}, {0, 1.5, 0}, {0, 3, 0}, {0, 4.5, 0},
                               {3, 1, 0}, {5, 0.6, 0}, {8, 3, 0}, {10, 1, 0}, {0, 0, 6}, {0, 0, 12}, {5, 0, 8}, {4, 1.5, 6}};

}  // namespace

std::vector<Figure> run_predictions(const SetOptions& options) {
  const int systems = std::size(kSystems), repeats = count_of(options, 12, 3), count = systems * repeats;
  std::vector<double> measured(static_cast<std::size_t>(count), -1);
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    const System& system = kSystems[i % systems];
    render::Random random(first_key(options, 3) + static_cast<std::uint64_t>(i));
    render::TileSpec spec;
    spec.size_px = 320;
    spec.texture = render::Texture::polygons;
    spec.blur = {.disc_px = system.disc, .motion_px = system.motion, .motion_angle_deg = random.uniform(0, 180), .lambda_n_over_p_px = system.lambda_n_over_p};
    spec.size_factor = 1.3;
    spec.camera = {.iso_speed = 100, .jpeg_quality = 95};
    spec.random_key = first_key(options, 3) + static_cast<std::uint64_t>(i);
    const render::Picture picture = render::render_tile(spec);
    MeasureRequest request = request_for({32, 32, 256, 256}, picture.luma.size());
    request.whole_frame = false;
    const Measurement m = measurer.measure({picture.luma, srgb_linear_of_code(256), picture.coding_step_codes}, request);
    if (m.aim_blur.estimate) measured[static_cast<std::size_t>(i)] = blur_disc_px(m.aim_blur.estimate->squared_disc_px2);
  });
  fmt::print("\nPredicted against measured on edges (polygons, ISO 100, JPEG 95), equivalent disc in px\n");
  fmt::print("  {:>6} {:>9} {:>7} {:>10} {:>9} {:>8}\n", "disc", "lambdaN/p", "motion", "predicted", "measured", "diff %");
  std::vector<double> differences;
  int numbers = 0;
  for (int s = 0; s < systems; ++s) {
    std::vector<double> values;
    for (int i = s; i < count; i += systems)
      if (measured[static_cast<std::size_t>(i)] >= 0) values.push_back(measured[static_cast<std::size_t>(i)]);
    numbers += static_cast<int>(values.size());
    const System& system = kSystems[s];
    const auto predicted = forward_reading({.disc_px = system.disc, .airy_lambda_n_over_p_px = system.lambda_n_over_p, .motion_length_px = system.motion, .motion_angle_deg = 30});
    if (!predicted || values.empty()) {
      fmt::print("  {:6g} {:9g} {:7g}  no {}\n", system.disc, system.lambda_n_over_p, system.motion, predicted ? "measurement" : "prediction");
      differences.push_back(100);
      continue;
    }
    const double forward = blur_disc_px(predicted->squared_disc_px2), difference = 100 * (median(values) - forward) / forward;
    differences.push_back(std::abs(difference));
    fmt::print("  {:6g} {:9g} {:7g} {:10.2f} {:9.2f} {:8.1f}\n", system.disc, system.lambda_n_over_p, system.motion, forward, median(values), difference);
  }
  return {{"predicted against measured: median difference", median(differences), 3, true, "%", numbers},
          {"predicted against measured: worst system", *std::max_element(differences.begin(), differences.end()), 3, true, "%", numbers}};
}

}  // namespace focusfall::accuracy
