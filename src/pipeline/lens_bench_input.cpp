#include "src/pipeline/lens_bench_input.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <numbers>
#include <set>

#include "src/pipeline/options.h"

namespace focusfall {
namespace {

constexpr double kNormal95 = 1.959964;
constexpr double kLeastTiltDeg = 5, kMostTiltDeg = 85;

// Focus distance from the lens, of one recorded from the sensor or from the lens; far solution of s^2 - D s + D f = 0.
std::optional<double> from_lens_mm(const FrameRecord& record) {
  const auto& distance = record.capture->focus_distance;
  if (!distance || !std::isfinite(distance->value.value_m)) return std::nullopt;
  const double d = distance->value.value_m * 1000, f = record.capture->focal_length_mm->value;
  if (record.prediction && record.prediction->distance_from == DistanceOrigin::lens)
    return d > f ? std::optional(d) : std::nullopt;
  const double root = d * d - 4 * d * f;
  return root >= 0 ? std::optional((d + std::sqrt(root)) / 2) : std::nullopt;
}

bool in_focus_series(const FrameRecord& record) {
  return record.done && record.measurement && record.measurement->aim_blur.estimate && record.capture &&
         record.capture->focal_length_mm;
}

// Image distance behind the lens, um.
std::optional<double> recorded_position_um(const FrameRecord& record) {
  const auto s = from_lens_mm(record);
  if (!s) return std::nullopt;
  const double f = record.capture->focal_length_mm->value;
  return 1000 * f * *s / (*s - f);
}

FocusSeries steps_of(std::span<const FrameRecord> records, const std::optional<double>& step_um) {
  FocusSeries series;
  std::vector<double> limits;
  for (std::size_t i = 0; i < records.size(); ++i) {
    if (!in_focus_series(records[i])) continue;
    const auto position = step_um ? std::optional(static_cast<double>(i) * *step_um) : recorded_position_um(records[i]);
    if (!position) continue;
    const BlurEstimate& blur = *records[i].measurement->aim_blur.estimate;
    series.steps.push_back({*position, blur.squared_disc_px2,
                            (blur.squared_disc_high_px2 - blur.squared_disc_low_px2) / (2 * kNormal95)});
    series.frames.push_back(i);
    const auto& prediction = records[i].prediction;
    if (prediction && prediction->acceptable_blur_um && prediction->working_f_number)
      limits.push_back(*prediction->acceptable_blur_um * *prediction->working_f_number);
  }
  if (!limits.empty()) series.limit_um = median(limits);
  if (!series.steps.empty()) {
    const double first = series.steps.front().position_um;
    for (FocusStep& step : series.steps) step.position_um -= first;
  }
  return series;
}

bool one_lens(std::span<const FrameRecord> records) {
  std::set<std::string> names;
  for (const FrameRecord& record : records) {
    if (in_focus_series(record)) names.insert(lens_name(*record.capture) + "\n" + body_name(*record.capture));
  }
  return names.size() <= 1;
}

std::string best_text(const FocusSeries& series, const BestFocus& best) {
  if (!best.inside)
    return "The best position lies outside the series: carry it on to the side on which the last frames get sharper.";
  // The frame nearest to the best position, so that it can be found again.
  const auto nearest = std::ranges::min_element(series.steps, {}, [&](const FocusStep& step) {
    return std::abs(step.position_um - best.position_um.value);
  });
  std::string text = fmt::format(
      "Best focus {:+.0f} µm at the sensor from the first frame ({:+.0f} to {:+.0f} µm), nearest to frame {} of the "
      "series.",
      best.position_um.value, best.position_um.low, best.position_um.high,
      series.frames[static_cast<std::size_t>(nearest - series.steps.begin())] + 1);
  if (series.limit_um > 0)
    text += fmt::format(" The depth of focus is {:.0f} µm to each side.", series.limit_um);
  return text;
}

std::optional<double> slope_f_number(const FrameRecord& record, const SurfaceAttitude& attitude) {
  const auto s = from_lens_mm(record);
  const Capture& capture = *record.capture;
  if (!s || !capture.width_px || !capture.height_px || !capture.pixel_pitch_um) return std::nullopt;
  const PlaneReading& plane = *record.measurement->plane;
  const double centre_px = plane.at_contact_px->value + plane.x_gradient_px * (0.5 - plane.contact_x) +
                           plane.y_gradient_px * (0.5 - plane.contact_y);
  return f_number_from_slope({.slope = std::hypot(plane.x_gradient_px / *capture.width_px,
                                                  plane.y_gradient_px / *capture.height_px),
                              .focal_length_mm = capture.focal_length_mm->value,
                              .focus_distance_mm = *s,
                              .blur_at_centre_mm = centre_px * capture.pixel_pitch_um->value.value / 1000,
                              .marked_f_number = capture.f_number->value},
                             attitude);
}

std::string diaphragm_text(const GroupDiaphragm& result, double marked) {
  if (!result.reading)
    return fmt::format("Not enough evidence: {} frames with a slope, a recorded focus distance and a geometry that can "
                       "be; it takes 3.",
                       result.frames);
  const DiaphragmReading& r = *result.reading;
  return fmt::format("The slope of the blur is that of f/{:.2f} (f/{:.2f} to f/{:.2f}); marked is f/{:g}, {:.2f} stops "
                     "{}. On fine texture the slope reads too flat: use a bold surface.",
                     r.f_number.value, r.f_number.low, r.f_number.high, marked, std::abs(r.stops_wider),
                     r.stops_wider > 0 ? "wider" : "narrower");
}

tl::expected<double, std::string> number_with_unit(const std::string& text, std::string& unit) {
  double value = 0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc()) return tl::make_unexpected(fmt::format("'{}' does not start with a number", text));
  unit.assign(end, text.data() + text.size());
  return value;
}

}  // namespace

FocusSeriesResult focus_series(std::span<const FrameRecord> records, const std::optional<double>& step_um) {
  FocusSeriesResult result;
  result.positions_from = step_um ? "step" : "recorded distance";
  if (!one_lens(records)) {
    result.text = "Not enough evidence: the frames come from several lenses or bodies; a focus series is made with one.";
    return result;
  }
  const FocusSeries series = steps_of(records, step_um);
  result.best = best_focus(series.steps);
  if (result.best) {
    result.text = best_text(series, *result.best);
  } else if (series.steps.size() < 5) {
    result.text = fmt::format("Not enough evidence: {} frames with a blur at the aim and a known position; it takes 5. "
                              "Where no distance is recorded, give --focus-step.",
                              series.steps.size());
  } else {
    result.text = "Not enough evidence: the blur shows no valley over these positions; make the steps larger.";
  }
  return result;
}

std::vector<GroupDiaphragm> group_diaphragms(std::span<const FrameRecord> records, const LensInput& input,
                                             const LensReport& report, const SurfaceAttitude& attitude) {
  std::vector<GroupDiaphragm> results;
  for (const LensGroup& group : report.groups) {
    std::vector<double> f_numbers;
    for (const std::size_t reading : group.of.readings) {
      if (const auto n = slope_f_number(records[input.readings[reading].frame], attitude)) f_numbers.push_back(*n);
    }
    GroupDiaphragm result;
    result.frames = static_cast<int>(f_numbers.size());
    result.reading = diaphragm(f_numbers, group.of.f_number);
    result.text = diaphragm_text(result, group.of.f_number);
    results.push_back(std::move(result));
  }
  return results;
}

tl::expected<double, std::string> parse_tilt_rad(const std::string& text) {
  std::string unit;
  const auto value = number_with_unit(text, unit);
  if (!value) return value;
  if (unit != "" && unit != "deg" && unit != "rad")
    return tl::make_unexpected(fmt::format("'{}' has an unknown unit; known are deg, rad", text));
  const double degrees = unit == "rad" ? *value * 180 / std::numbers::pi : *value;
  if (!(degrees >= kLeastTiltDeg && degrees <= kMostTiltDeg))
    return tl::make_unexpected(fmt::format("'{}' is no tilt away from square-on between {:.0f} and {:.0f} degrees", text,
                                           kLeastTiltDeg, kMostTiltDeg));
  return degrees * std::numbers::pi / 180;
}

tl::expected<double, std::string> parse_focus_step_um(const std::string& text) {
  return parse_pixel_pitch_um(text);   // a positive length in um, mm or nm
}

}  // namespace focusfall
