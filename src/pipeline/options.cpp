#include "src/pipeline/options.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <initializer_list>
#include <limits>
#include <numbers>
#include <string_view>
#include <utility>
#include <vector>

namespace focusfall {
namespace {

struct Unit {
  std::string_view name;   // lower case; the empty name is that of a bare number
  double factor = 1;       // into the unit of the result
};

std::string lower(std::string_view text) {
  std::string result(text);
  std::ranges::transform(result, result.begin(),
                         [](char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; });
  return result;
}

std::string_view trimmed(std::string_view text) {
  const auto first = text.find_first_not_of(" \t");
  if (first == std::string_view::npos) return {};
  return text.substr(first, text.find_last_not_of(" \t") - first + 1);
}

// The number at the start of `text`; what follows it stays in `text`. Only digits, point, sign and exponent count:
// "inf" and "nan" are words here.
std::optional<double> take_number(std::string_view& text) {
  const auto first = text.starts_with('-') || text.starts_with('+') ? 1u : 0u;
  if (first >= text.size() || !(text[first] == '.' || (text[first] >= '0' && text[first] <= '9'))) return std::nullopt;
  if (text.starts_with('+')) text.remove_prefix(1);
  double value = 0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc()) return std::nullopt;
  text.remove_prefix(static_cast<std::size_t>(end - text.data()));
  return value;
}

// `text` with the first `sign` spelled as the letter `plain`.
std::string spelled_plainly(const std::string& text, std::string_view sign, char plain) {
  const auto at = text.find(sign);
  if (at == std::string::npos) return text;
  return text.substr(0, at) + plain + text.substr(at + sign.size());
}

// Both spellings of the micro sign become "u".
std::string plain_unit(std::string_view unit) {
  return spelled_plainly(spelled_plainly(lower(trimmed(unit)), "\xC2\xB5", 'u'), "\xCE\xBC", 'u');
}

std::string unit_list(std::initializer_list<Unit> units) {
  std::string list;
  for (const Unit& unit : units) {
    if (unit.name.empty()) continue;
    if (!list.empty()) list += ", ";
    list += unit.name;
  }
  return list;
}

// A number > 0 with one of `units`. CLI11's own number-with-unit transform keeps six digits only.
Parsed<double> positive_with_unit(const std::string& text, std::initializer_list<Unit> units) {
  std::string_view rest = trimmed(text);
  const auto number = take_number(rest);
  if (!number) return tl::make_unexpected(fmt::format("'{}' does not start with a number", text));
  const std::string name = plain_unit(rest);
  const auto* unit = std::ranges::find(units, std::string_view(name), &Unit::name);
  if (unit == units.end()) {
    const std::string list = unit_list(units);
    return tl::make_unexpected(list.empty() ? fmt::format("'{}' should be a number without a unit", text)
                                            : fmt::format("'{}' has an unknown unit; known are {}", text, list));
  }
  const double value = *number * unit->factor;
  if (!(value > 0) || !std::isfinite(value)) {
    return tl::make_unexpected(fmt::format("'{}' must be more than zero", text));
  }
  return value;
}

constexpr double kFootM = 0.3048;                       // international foot
constexpr double kInchM = 0.0254;

}  // namespace

Parsed<double> parse_focal_length_mm(const std::string& text) {
  return positive_with_unit(text, {{"", 1}, {"mm", 1}, {"cm", 10}, {"m", 1000}, {"in", kInchM * 1000}});
}

Parsed<double> parse_distance_m(const std::string& text) {
  const std::string word = lower(trimmed(text));
  if (word == "inf" || word == "infinity") return std::numeric_limits<double>::infinity();
  return positive_with_unit(text, {{"", 1},
                                   {"m", 1},
                                   {"mm", 0.001},
                                   {"cm", 0.01},
                                   {"km", 1000},
                                   {"ft", kFootM},
                                   {"in", kInchM}});
}

Parsed<double> parse_f_number(const std::string& text) {
  std::string_view number = trimmed(text);
  if (number.starts_with('f') || number.starts_with('F')) {
    number.remove_prefix(1);
    if (number.starts_with('/')) number.remove_prefix(1);
  }
  const auto value = positive_with_unit(std::string(number), {{"", 1}});
  if (!value) return tl::make_unexpected(fmt::format("'{}' is no f-number such as 2.8 or f/2.8", text));
  if (*value < 0.7) return tl::make_unexpected(fmt::format("'{}' is below f/0.7, the least that is accepted", text));
  return value;
}

Parsed<double> parse_time_s(const std::string& text) {
  std::string_view rest = trimmed(text);
  double divisor = 1;
  std::string quotient(rest);
  // "1/2000" and "1/2000s": the fraction is computed first, the unit then applies to it.
  if (const auto slash = rest.find('/'); slash != std::string_view::npos) {
    std::string_view below = rest.substr(slash + 1);
    const auto number = take_number(below);
    if (!number || !(*number > 0)) return tl::make_unexpected(fmt::format("'{}' is no time such as 1/2000", text));
    divisor = *number;
    quotient = std::string(rest.substr(0, slash)) + std::string(below);
  }
  const auto value = positive_with_unit(quotient, {{"", 1}, {"s", 1}, {"ms", 1e-3}, {"us", 1e-6}, {"min", 60}});
  if (!value) return tl::make_unexpected(fmt::format("'{}' is no time such as 1/2000, 0.5s or 20ms", text));
  return *value / divisor;
}

Parsed<double> parse_iso_speed(const std::string& text) {
  std::string_view number = trimmed(text);
  if (lower(number.substr(0, 3)) == "iso") number.remove_prefix(3);
  const auto value = positive_with_unit(std::string(number), {{"", 1}});
  if (!value) return tl::make_unexpected(fmt::format("'{}' is no ISO speed such as 800", text));
  return value;
}

Parsed<double> parse_pixel_pitch_um(const std::string& text) {
  return positive_with_unit(text, {{"", 1}, {"um", 1}, {"mm", 1000}, {"nm", 0.001}});
}

Parsed<SensorSize> parse_sensor_mm(const std::string& text) {
  // The multiplication sign is as good as an x.
  const std::string plain = spelled_plainly(lower(trimmed(text)), "\xC3\x97", 'x');
  const auto cross = plain.find('x');
  const auto failed = tl::make_unexpected(fmt::format("'{}' is no sensor size such as 36x24mm", text));
  if (cross == std::string::npos) return failed;
  const auto width = parse_focal_length_mm(plain.substr(0, cross));
  const auto height = parse_focal_length_mm(plain.substr(cross + 1));
  if (!width || !height) return failed;
  return SensorSize{.width_mm = *width, .height_mm = *height};
}

Parsed<double> parse_speed_m_s(const std::string& text) {
  return positive_with_unit(
      text, {{"", 1}, {"m/s", 1}, {"km/h", 1 / 3.6}, {"mph", 0.44704}, {"kn", 1852.0 / 3600}});
}

Parsed<double> parse_angular_rate_rad_s(const std::string& text) {
  constexpr double kDegree = std::numbers::pi / 180;
  return positive_with_unit(text, {{"", kDegree}, {"deg/s", kDegree}, {"rad/s", 1}, {"mrad/s", 0.001}});
}

Parsed<double> parse_factor(const std::string& text) { return positive_with_unit(text, {{"", 1}, {"x", 1}}); }

Parsed<PictureLength> parse_picture_length(const std::string& text) {
  std::string_view rest = trimmed(text);
  const auto number = take_number(rest);
  if (!number) return tl::make_unexpected(fmt::format("'{}' does not start with a number", text));
  const std::string unit = plain_unit(rest);
  PictureLength length;
  if (unit == "px") {
    length = {.value = *number, .in_pixels = true};
  } else if (unit == "%") {
    length.value = *number / 100;
  } else if (unit.empty()) {
    length.value = *number;
  } else {
    return tl::make_unexpected(fmt::format("'{}' has an unknown unit; known are px, % and none (a fraction)", text));
  }
  if (length.value < 0) return tl::make_unexpected(fmt::format("'{}' lies outside the picture", text));
  if (!length.in_pixels && length.value > 1) {
    return tl::make_unexpected(fmt::format("'{}' is more than the whole picture; pixels are written 640px", text));
  }
  return length;
}

Parsed<UserAim> parse_aim(const std::string& text) {
  std::array<PictureLength, 4> lengths;
  std::string_view rest = text;
  for (std::size_t i = 0; i < lengths.size(); ++i) {
    const auto comma = rest.find(',');
    if ((comma == std::string_view::npos) != (i == 3)) {
      return tl::make_unexpected(fmt::format("'{}' should be x,y,width,height: four values with commas", text));
    }
    const auto length = parse_picture_length(std::string(rest.substr(0, comma)));
    if (!length) return tl::make_unexpected(length.error());
    lengths[i] = *length;
    if (i < 3) rest.remove_prefix(comma + 1);
  }
  return UserAim{.x = lengths[0], .y = lengths[1], .width = lengths[2], .height = lengths[3]};
}

Parsed<NearSide> parse_near_side(const std::string& text) {
  const std::string word = lower(trimmed(text));
  if (word == "bottom") return NearSide::bottom;
  if (word == "top") return NearSide::top;
  if (word == "left") return NearSide::left;
  if (word == "right") return NearSide::right;
  return tl::make_unexpected(fmt::format("'{}' is none of bottom, top, left, right", text));
}

Parsed<DistanceOrigin> parse_distance_origin(const std::string& text) {
  const std::string word = lower(trimmed(text));
  if (word == "sensor") return DistanceOrigin::sensor;
  if (word == "lens") return DistanceOrigin::lens;
  return tl::make_unexpected(fmt::format("'{}' is neither sensor nor lens", text));
}

tl::expected<void, std::string> set_acceptable_blur(UserValues& values, const std::string& text) {
  std::string_view rest = trimmed(text);
  const auto number = take_number(rest);
  const std::string unit = plain_unit(rest);
  if (!number || unit.empty()) {
    return tl::make_unexpected(fmt::format("'{}' needs a number and a unit: mm, um or px", text));
  }
  if (!(*number > 0)) return tl::make_unexpected(fmt::format("'{}' must be more than zero", text));
  if (unit != "px" && unit != "um" && unit != "mm") {
    return tl::make_unexpected(fmt::format("'{}' has an unknown unit; known are mm, um, px", text));
  }
  values.acceptable_blur_px.reset();
  values.acceptable_blur_um.reset();
  if (unit == "px") {
    values.acceptable_blur_px = *number;
  } else {
    values.acceptable_blur_um = unit == "mm" ? *number * 1000 : *number;
  }
  return {};
}

namespace {

using Set = tl::expected<void, std::string>;

// Reads with `parse` and stores in `field`.
template <auto field, auto parse>
Set set_field(UserValues& values, const std::string& text) {
  auto parsed = parse(text);
  if (!parsed) return tl::make_unexpected(std::move(parsed.error()));
  values.*field = *parsed;
  return {};
}

Parsed<double> parse_teleconverter(const std::string& text) {
  const auto factor = parse_factor(text);
  if (factor && (*factor < 1 || *factor > 4)) {
    return tl::make_unexpected(fmt::format("'{}' is no teleconverter: 1 to 4", text));
  }
  return factor;
}

Parsed<double> parse_transmittance(const std::string& text) {
  const auto factor = parse_factor(text);
  if (factor && *factor > 1) return tl::make_unexpected(fmt::format("'{}' is more than all the light: 0 to 1", text));
  return factor;
}

Parsed<double> parse_wavelength_um(const std::string& text) {
  return positive_with_unit(text, {{"", 1}, {"um", 1}, {"nm", 0.001}});
}

Parsed<double> parse_luminance_cd_m2(const std::string& text) {
  return positive_with_unit(text, {{"", 1}, {"cd/m2", 1}});
}

Parsed<int> parse_width_px(const std::string& text) {
  const auto value = positive_with_unit(text, {{"", 1}, {"px", 1}});
  if (!value) return tl::make_unexpected(value.error());
  if (*value < 1 || *value > 1e6 || *value != std::floor(*value)) {
    return tl::make_unexpected(fmt::format("'{}' is no width in whole pixels", text));
  }
  return static_cast<int>(*value);
}

using V = UserValues;
using G = ValueOption::Group;

constexpr ValueOption kValueOptions[] = {
    {"focal-length", "MM", "Focal length as marked: 400mm. Default: from the file.", G::shot,
     set_field<&V::focal_length_mm, parse_focal_length_mm>},
    {"f-number", "N", "f-number as marked: 2.8 or f/2.8. Default: from the file.", G::shot,
     set_field<&V::f_number, parse_f_number>},
    {"teleconverter", "FACTOR", "Teleconverter the file does not know of: 1.4. Default: 1, none.", G::shot,
     set_field<&V::teleconverter, parse_teleconverter>},
    {"focus-distance", "M", "Distance focused on: 12.5m, 30ft, inf. Default: from the file.", G::shot,
     set_field<&V::focus_distance_m, parse_distance_m>},
    {"distance-from", "ORIGIN", "Where every distance starts: sensor or lens. Default: sensor.", G::shot,
     set_field<&V::distance_from, parse_distance_origin>},
    {"exposure-time", "S", "Exposure time: 1/2000, 0.5s, 20ms. Default: from the file.", G::shot,
     set_field<&V::exposure_time_s, parse_time_s>},
    {"iso", "SPEED", "ISO speed: 800. Default: from the file.", G::shot, set_field<&V::iso_speed, parse_iso_speed>},
    {"sensor", "WxH", "Sensor size: 36x24mm. Default: from the file.", G::shot,
     set_field<&V::sensor, parse_sensor_mm>},
    {"pixel-pitch", "UM", "Pitch of the delivered pixels: 4.3um. Default: from the file.", G::shot,
     set_field<&V::pixel_pitch_um, parse_pixel_pitch_um>},
    {"luminance", "CD/M2", "Mean luminance of the scene: 4000cd/m2. Default: from the file's brightness value.", G::shot,
     set_field<&V::scene_luminance_cd_m2, parse_luminance_cd_m2>},
    {"transmittance", "0..1", "Share of the light that the lens lets through. Default: not counted.", G::shot,
     set_field<&V::transmittance, parse_transmittance>},
    {"pupil-magnification", "RATIO", "Exit pupil over entrance pupil. Default: 1, a symmetric lens.", G::shot,
     set_field<&V::pupil_magnification, parse_factor>},
    {"wavelength", "UM", "Wavelength for diffraction: 0.55um. Default: 0.55 um, green.", G::shot,
     set_field<&V::wavelength_um, parse_wavelength_um>},

    {"angular-rate", "DEG/S", "Turning of the camera during the exposure: 1.7deg/s. Default: not counted.", G::motion,
     set_field<&V::angular_rate_rad_s, parse_angular_rate_rad_s>},
    {"subject-speed", "M/S", "Speed of the subject across the axis: 8m/s, 30km/h. Default: not counted.", G::motion,
     set_field<&V::subject_speed_m_s, parse_speed_m_s>},
    {"flash-duration", "S", "Duration of the flash that lit the subject: 1/8000. Default: not counted.", G::motion,
     set_field<&V::flash_duration_s, parse_time_s>},

    {"acceptable-blur", "LENGTH",
     "Largest blur disc that counts as sharp: 0.02mm, 20um or 3px. Default: 2 px of the delivered picture, never above "
     "diagonal/1500; diagonal/1500 for predict.",
     G::blur, set_acceptable_blur},
    {"delivered-width", "PX", "Width of the delivered picture. Default: the frame's width, at most 4000 px.", G::blur,
     set_field<&V::delivered_width_px, parse_width_px>},

    {"aim", "X,Y,W,H",
     "Where it counts, in the picture as displayed: 0.4,0.3,0.1,0.15 or 2400px,1200px,600px,600px. Default: the focus "
     "area the camera recorded, a focus or face region, the subject area, the centre.",
     G::place, set_field<&V::aim, parse_aim>},
    {"near-side", "SIDE",
     "Side of the picture as displayed where the ground is nearer: bottom, top, left, right. Default: bottom.",
     G::place, set_field<&V::near_side, parse_near_side>},
    {"contact", "Y",
     "Row of the picture as displayed where the subject touches the ground: 0.72 or 2900px. Default: looked for just "
     "below the aim.",
     G::place, set_field<&V::contact_y, parse_picture_length>},
};

}  // namespace

std::span<const ValueOption> value_options() { return kValueOptions; }

}  // namespace focusfall
