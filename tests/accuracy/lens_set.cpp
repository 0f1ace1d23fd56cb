// Series of twelve frames of one surface by a lens of known bias and scatter: what `lens` finds on rendered pixels.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <optional>
#include <vector>

#include "analysis/compare/lens_report.h"
#include "analysis/compare/lens_words.h"
#include "tests/accuracy/scenes.h"
#include "tests/accuracy/scoring.h"

namespace focusfall::accuracy {
namespace {

constexpr int kFramesEach = 12;
constexpr double kScatterLimits = 0.25;
// Limits of the depth of field. Every one twice in twenty series, and 0 four times.
constexpr std::array kBiases{0.5, 0.0, -0.5, 1.0, -1.0, 0.25, -0.25, 2.0, -2.0, 0.0};

struct Series {
  SceneSpec spec;                    // of every frame but for where focus fell
  double bias_limits = 0;
  std::array<double, kFramesEach> truth_limits{};
  double true_mean() const {
    double sum = 0;
    for (const double one : truth_limits) sum += one;
    return sum / kFramesEach;
  }
};

std::vector<Series> make_series(const SetOptions& options) {
  std::vector<Series> all;
  const int count = count_of(options, 20, 1);
  for (int i = 0; i < count; ++i) {
    Series series;
    series.bias_limits = kBiases[static_cast<std::size_t>(i) % kBiases.size()];
    const std::uint64_t key = first_key(options, 8) + static_cast<std::uint64_t>(i);
    render::Random random(key ^ 0x1E55);
    series.spec.key = key;
    series.spec.gradient = random.log_uniform(0.01, 0.05);
    series.spec.figure = false;
    series.spec.texture = static_cast<GroundTexture>(i / 2 % 4);
    for (double& truth : series.truth_limits) truth = series.bias_limits + kScatterLimits * random.normal();
    all.push_back(series);
  }
  return all;
}

// One frame as a reading in units of the limit, kAcceptablePx; nothing where the aim is not on an accepted plane.
std::optional<LensReading> reading_of(const Series& series, int frame, FrameMeasurer& measurer) {
  SceneSpec spec = series.spec;
  spec.contact_disc = kAcceptablePx * series.truth_limits[static_cast<std::size_t>(frame)];
  const Scene scene = make_scene(spec);
  const render::Picture picture = render::render_frame(scene.frame);
  const Measurement m = measurer.measure({picture.luma, srgb_linear_of_code(256), picture.coding_step_codes},
                                         request_for(scene.aim, picture.luma.size()));
  if (!m.plane || m.plane->contact == Contact::none || !m.plane->at_contact_px) return std::nullopt;
  LensReading reading;
  reading.frame = static_cast<std::size_t>(frame);
  reading.lens = "lens";
  reading.body = "body";
  reading.focal_length_mm = 85;
  reading.f_number = 2.8;
  reading.on_surface = true;
  reading.defocus_um = m.plane->at_contact_px->value;
  reading.sigma_um = m.plane->at_contact_sigma_px;
  reading.limit_um = kAcceptablePx;
  return reading;
}

bool side_is_right(const Series& series, const LensGroup& group) {
  return group.finding == (series.bias_limits > 0 ? LensFinding::back_focus : LensFinding::front_focus);
}

}  // namespace

std::vector<Figure> run_lens(const SetOptions& options) {
  const std::vector<Series> all = make_series(options);
  std::vector<std::optional<LensReading>> readings(all.size() * kFramesEach);
  for_each_case(static_cast<int>(readings.size()), [&](int i, FrameMeasurer& measurer) {
    readings[static_cast<std::size_t>(i)] = reading_of(all[static_cast<std::size_t>(i / kFramesEach)], i % kFramesEach, measurer);
  });

  fmt::print("\nSeries of twelve frames, scatter ¼ of the limit; bias in limits of the depth of field\n"
             "  {:<9} {:>6} {:>9} {:>5} {:>8} {:>8} {:>8} {:>8}  {}\n",
             "surface", "bias", "mean true", "used", "found", "error", "low", "high", "finding");
  int clear = 0, right = 0, false_side = 0, no_bias = 0, covered = 0;
  std::vector<double> errors;
  for (std::size_t s = 0; s < all.size(); ++s) {
    std::vector<LensReading> own;
    for (int k = 0; k < kFramesEach; ++k) {
      if (const auto& one = readings[s * kFramesEach + static_cast<std::size_t>(k)]) own.push_back(*one);
    }
    const LensReport report = lens_report(own);
    const Series& series = all[s];
    const bool found = !report.groups.empty() && report.groups[0].bias_limits.has_value();
    clear += std::abs(series.bias_limits) >= 0.5;
    no_bias += series.bias_limits == 0;
    if (!found) {
      fmt::print("  {:<9} {:6.2f} {:9.3f} {:5}  nothing\n", ground_name(series.spec.texture), series.bias_limits, series.true_mean(), own.size());
      errors.push_back(100);
      continue;
    }
    const LensGroup& group = report.groups[0];
    const Interval& bias = *group.bias_limits;
    const double error = bias.value - series.true_mean();
    errors.push_back(100 * std::abs(error));
    covered += bias.low <= series.bias_limits && series.bias_limits <= bias.high;
    right += std::abs(series.bias_limits) >= 0.5 && side_is_right(series, group);
    false_side += series.bias_limits == 0 && (group.finding == LensFinding::front_focus || group.finding == LensFinding::back_focus);
    fmt::print("  {:<9} {:6.2f} {:9.3f} {:5} {:8.3f} {:8.3f} {:8.3f} {:8.3f}  {}\n", ground_name(series.spec.texture), series.bias_limits, series.true_mean(),
               own.size(), bias.value, error, bias.low, bias.high, lens_finding_name(group.finding));
  }
  const auto within = std::count_if(errors.begin(), errors.end(), [](double error) { return error <= 10; });
  const auto count = static_cast<int>(all.size());
  const auto share = [](auto part, int whole) { return 100.0 * static_cast<double>(part) / std::max(1, whole); };
  return {{"lens: side right where the bias is half a limit or more", share(right, clear), 100, false, "%", clear},
          {"lens: series within 10 % of the limit of the true mean", share(within, count), 100, false, "%", count},
          {"lens: largest error of the bias, of the limit", quantile(errors, 1), 10, true, "%", count},
          {"lens: median error of the bias, of the limit", median(errors), 10, true, "%", count},
          {"lens: a side called where there is none", share(false_side, no_bias), 5.5, true, "%", no_bias},
          {"lens: interval covers the true bias", share(covered, count), 90, false, "%", count}};
}

}  // namespace focusfall::accuracy
