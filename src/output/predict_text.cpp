#include "src/output/predict_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>
#include <string_view>

#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr int kLabelColumns = 24;
constexpr int kValueColumns = 20;
constexpr int kTextColumns = 100;

std::string heading(std::string_view title) { return fmt::format("\n{}\n", title); }

// "  hyperfocal distance       1980 m                what it means"; nothing where the value is not known.
std::string row(std::string_view label, const std::optional<std::string>& value, std::string_view remark = {}) {
  if (!value) return {};
  std::string line = padded(fmt::format("  {}", label), kLabelColumns) + "  ";
  line += remark.empty() ? *value : padded(*value, kValueColumns) + "  " + std::string(remark);
  return line + "\n";
}

template <class Text>
std::optional<std::string> as_text(const std::optional<double>& value, Text text) {
  if (!value) return std::nullopt;
  return text(*value);
}

std::string shot_line(const FrameRecord& record) {
  const OpticalSetup& setup = *record.setup;
  std::string line = fmt::format("{} {}", millimetres_text(setup.focal_length_mm), f_number_text(setup.f_number));
  if (setup.focus_distance_m) line += " focused at " + distance_text(setup.focus_distance_m->value);
  if (setup.exposure_time_s) line += ", " + time_text(*setup.exposure_time_s);
  if (setup.iso_speed) line += fmt::format(", ISO {:.0f}", *setup.iso_speed);
  if (setup.sensor_width_mm && setup.sensor_height_mm) {
    line += fmt::format(", sensor {:.4g} \xC3\x97 {:.4g} mm", *setup.sensor_width_mm, *setup.sensor_height_mm);
  }
  if (setup.pixel_pitch_um) line += fmt::format(", pixels of {:.3g} \xC2\xB5m", setup.pixel_pitch_um->value);
  return line + "\n";
}

std::string blur_limit(const Prediction& p) {
  std::string text = micrometres_text(*p.acceptable_blur_um);
  if (p.acceptable_blur_px) text += fmt::format(" ({})", px_text(*p.acceptable_blur_px));
  return text;
}

std::string depth_rows(const Prediction& p, const OpticalSetup& setup) {
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  std::optional<double> far_m = p.far_limit_infinite ? std::optional(kInfinity) : p.far_limit_m;
  std::optional<double> depth_m, before_m, behind_m;
  if (p.near_limit_m && far_m) depth_m = *far_m - *p.near_limit_m;
  if (setup.focus_distance_m && p.near_limit_m) before_m = setup.focus_distance_m->value - *p.near_limit_m;
  if (setup.focus_distance_m && far_m) behind_m = *far_m - setup.focus_distance_m->value;
  // Infinity less infinity is no length.
  for (auto* length : {&depth_m, &before_m, &behind_m}) {
    if (*length && std::isnan(**length)) length->reset();
  }
  const bool by_diagonal = !setup.acceptable_blur_um && !setup.acceptable_blur_px;
  std::string text = heading(fmt::format("Depth (distances from the {})",
                                         p.distance_from == DistanceOrigin::sensor ? "sensor plane" : "lens"));
  if (p.acceptable_blur_um) {
    text += row("acceptable blur", blur_limit(p), by_diagonal ? "sensor diagonal / 1500" : "as given");
  }
  // Near and far with the same decimals, so that the eye can take their difference.
  if (p.near_limit_m && far_m) text += row("sharp from", distance_range_text(*p.near_limit_m, *far_m));
  text += row("depth of field", as_text(depth_m, distance_text),
              before_m && behind_m ? fmt::format("{} before, {} behind", distance_text(*before_m),
                                                 distance_text(*behind_m))
                                   : std::string());
  text += row("hyperfocal distance", as_text(p.hyperfocal_m, distance_text), "sharp from half of it to infinity");
  return text;
}

std::string sensor_rows(const Prediction& p, const OpticalSetup& setup) {
  const auto magnification = [](double m) {
    return m >= 0.1 ? fmt::format("{:.3f}", m) : fmt::format("1 : {}", plain_number(1 / m));
  };
  std::string text = heading("At the lens and on the sensor");
  text += row("image distance", as_text(p.image_distance_mm, [](double mm) { return fmt::format("{:.2f} mm", mm); }));
  text += row("entrance pupil", as_text(p.entrance_pupil_mm, [](double mm) { return plain_number(mm) + " mm"; }));
  text += row("magnification", as_text(p.magnification, magnification));
  text += row("working f-number",
              as_text(p.working_f_number, [](double n) { return "f/" + plain_number(n); }));
  text += row("depth of focus", as_text(p.depth_of_focus_um, micrometres_text), "both sides together");
  std::optional<std::string> airy;
  if (p.airy_diameter_px && setup.pixel_pitch_um) {
    airy = fmt::format("{} ({})", micrometres_text(*p.airy_diameter_px * setup.pixel_pitch_um->value),
                       px_text(*p.airy_diameter_px));
  } else if (p.working_f_number) {
    // Diameter of the first dark ring, 2 x 1.21967 lambda N (check of the constant: first zero of J1 over pi).
    constexpr double kFirstDarkRing = 1.2196698912665;
    airy = micrometres_text(2 * kFirstDarkRing * setup.wavelength_um * *p.working_f_number);
  }
  text += row("diffraction disc", airy, "Airy disc to the first dark ring");
  if (p.motion_blur_px) text += row("motion blur", px_text(*p.motion_blur_px));
  return text;
}

std::string light_rows(const Prediction& p) {
  if (!p.exposure_value && !p.mid_tone_level) return {};
  std::string text = heading("Light");
  text += row("exposure value", as_text(p.exposure_value, [](double ev) { return fmt::format("EV {:.2f}", ev); }));
  text += row("mid-tone", as_text(p.mid_tone_level, percent_text), "of full scale, linear");
  return text;
}

std::string at_rows(const std::vector<BlurAtDistance>& at) {
  if (at.empty()) return {};
  std::string text = heading("Blur disc at (and in limits of the depth of field)");
  for (const BlurAtDistance& point : at) {
    const double um = point.signed_disc_um.value;
    std::string disc = micrometres_text(std::abs(um));
    if (point.signed_disc_px) disc += fmt::format(" ({})", px_text(std::abs(point.signed_disc_px->value)));
    std::string remark = um == 0 ? "in focus" : um > 0 ? "focus behind it" : "focus in front of it";
    if (point.limits && um != 0) remark += fmt::format(", {:+.1f} limits", *point.limits);
    text += row(distance_text(point.distance_m), disc, remark);
  }
  return text;
}

}  // namespace

std::string predict_text(const PredictReport& report, int columns) {
  const OpticalSetup& setup = *report.record.setup;
  const Prediction& p = *report.record.prediction;
  const int prose = std::min(columns, kTextColumns);
  std::string text;
  if (!report.record.path.empty()) text.append(visible_text(report.record.path)).append("\n");
  text += wrapped(shot_line(report.record), prose, 2);
  for (const std::string& sentence : report.solved) text.append("\n").append(wrapped(sentence, prose, 0)).append("\n");
  text += depth_rows(p, setup);
  text += at_rows(report.at);
  text += sensor_rows(p, setup);
  text += light_rows(p);
  if (!report.assumptions.empty() || !report.record.issues.empty()) text += heading("Notes");
  for (const std::string& sentence : report.assumptions) text += "  " + wrapped(sentence, prose, 2) + "\n";
  for (const Issue& issue : report.record.issues) text += "  " + wrapped(visible_text(issue.message), prose, 2) + "\n";
  return text + "\n";
}

}  // namespace focusfall
