// Direction and length of motion.
#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>

#include "analysis/measure/motion.h"
#include "tests/accuracy/scoring.h"
#include "tests/render/tile.h"

namespace focusfall::accuracy {
namespace {

constexpr double kLengths[] = {0, 4, 6, 9, 12, 15};

struct Reading {
  bool read = false, significant = false;
  double length_error_percent = 0, angle_error_deg = 0, length = 0;
  bool covered = false;
};

double angle_between(double a, double b) {
  const double d = std::fmod(std::abs(a - b), 180.0);
  return std::min(d, 180 - d);
}

}  // namespace

std::vector<Figure> run_motion(const SetOptions& options) {
  const render::Texture textures[] = {render::Texture::polygons, render::Texture::mixed, render::Texture::dead_leaves};
  const int lengths = std::size(kLengths), repeats = count_of(options, 14, 2), count = 3 * lengths * repeats;
  std::vector<Reading> readings(static_cast<std::size_t>(count));
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    const std::uint64_t key = first_key(options, 4) + static_cast<std::uint64_t>(i);
    render::Random random(key);
    render::TileSpec spec;
    spec.size_px = 344 + 96;
    spec.texture = textures[i % 3];
    const double length = kLengths[i / 3 % lengths], angle = random.uniform(0, 180);
    spec.blur = {.disc_px = random.uniform(0, 2.5), .motion_px = length, .motion_angle_deg = angle};
    spec.size_factor = random.log_uniform(1, 2);
    spec.exposure = random.uniform(0.6, 1.3);
    spec.camera = {.iso_speed = random.log_uniform(100, 3200), .jpeg_quality = 85 + random.below(11)};
    spec.random_key = key;
    const render::Picture picture = render::render_tile(spec);
    MeasureRequest request = request_for({48, 48, 344, 344}, picture.luma.size());
    request.whole_frame = false;
    const Measurement m = measurer.measure({picture.luma, srgb_linear_of_code(256), picture.coding_step_codes}, request);
    Reading& r = readings[static_cast<std::size_t>(i)];
    if (!m.motion) return;
    r.read = true;
    r.significant = motion_is_significant(*m.motion);
    r.length = m.motion->length_px;
    r.length_error_percent = length > 0 ? 100 * (r.length - length) / length : 0;
    r.angle_error_deg = angle_between(m.motion->angle_deg, angle);
    r.covered = m.motion->length_low_px <= length && length <= m.motion->length_high_px;
  });
  fmt::print("\nMotion, regions of 344 px, disc 0-2.5 px, ISO 100-3200\n");
  fmt::print("  {:<26} {:>4} {:>7} {:>9} {:>11} {:>11} {:>10} {:>9} {:>8}\n", "", "n", "read %", "called %", "L bias %", "L scatter %", "angle deg", "angle p90", "cover %");
  std::vector<double> length_errors, angle_errors;
  double false_calls = 0, still = 0;
  for (int t = 0; t < 3; ++t) {
    for (int l = 0; l < lengths; ++l) {
      std::vector<double> error, angle, covered;
      int n = 0, read = 0, called = 0;
      for (int i = 0; i < count; ++i) {
        if (i % 3 != t || i / 3 % lengths != l) continue;
        const Reading& r = readings[static_cast<std::size_t>(i)];
        ++n;
        read += r.read;
        called += r.significant;
        if (l == 0) {
          ++still;
          false_calls += r.significant;
        } else if (r.read) {
          error.push_back(r.length_error_percent);
          angle.push_back(r.angle_error_deg);
          length_errors.push_back(std::abs(r.length_error_percent));
          angle_errors.push_back(r.angle_error_deg);
        }
        if (r.read) covered.push_back(r.covered ? 100 : 0);
      }
      fmt::print("  {:<26} {:4} {:7.0f} {:9.0f} {:11.1f} {:11.1f} {:10.1f} {:9.1f} {:8.0f}\n", fmt::format("{} L {:g}", render::texture_name(textures[t]), kLengths[l]), n,
                 100.0 * read / std::max(1, n), 100.0 * called / std::max(1, n), median(error), robust_deviation(error), median(angle), quantile(angle, 0.9), mean(covered));
    }
  }
  const int n = static_cast<int>(length_errors.size());
  double within_length = 0, within_angle = 0;
  for (const double e : length_errors) within_length += e <= 15 ? 100.0 / n : 0;
  for (const double e : angle_errors) within_angle += e <= 5 ? 100.0 / n : 0;
  return {{"motion: angle error, median", median(angle_errors), 5, true, "deg", n},
          {"motion: angle error, 95 % of cases below", quantile(angle_errors, 0.95), 5, true, "deg", n},
          {"motion: length error, median", median(length_errors), 15, true, "%", n},
          {"motion: length error, 95 % of cases below", quantile(length_errors, 0.95), 15, true, "%", n},
          {"motion: called where nothing moved", 100 * false_calls / std::max(1.0, still), 2, true, "%", static_cast<int>(still)}};
}

}  // namespace focusfall::accuracy
