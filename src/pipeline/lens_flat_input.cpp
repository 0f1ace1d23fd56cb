#include "src/pipeline/lens_flat_input.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "analysis/compare/lens_reading.h"
#include "src/pipeline/lens_input.h"

namespace focusfall {
namespace {

constexpr double kNormal95 = 1.959964;

// Error of one tile: of the disc, 6 % and .2 px, as regions of rendered frames have it where a stored record does not
// hold the tile's own.
double sigma_px2(double squared_px2, double sigma_px) {
  const double disc = std::sqrt(std::max(squared_px2, 0.0));
  const double sigma = std::hypot(sigma_px > 0 ? sigma_px : 0.0, 0.06 * disc, 0.2);
  return std::hypot(2 * disc * sigma, 0.4);
}

bool usable(const FrameRecord& record) {
  return record.done && record.measurement && record.measurement->tiles && record.capture &&
         record.capture->width_px && record.capture->height_px;
}

std::vector<FieldTile> tiles_of(const FrameRecord& record) {
  const TileMap& map = *record.measurement->tiles;
  const double width = *record.capture->width_px, height = *record.capture->height_px;
  const double unit = std::hypot(width, height) / 2;
  std::vector<FieldTile> tiles;
  for (int row = 0; row < map.rows; ++row) {
    for (int column = 0; column < map.columns; ++column) {
      const auto i = static_cast<std::size_t>(row) * static_cast<std::size_t>(map.columns) +
                     static_cast<std::size_t>(column);
      if (!map.squared_disc_px2[i]) continue;
      // The last row and column may be cut by the border.
      const double right = std::min<double>((column + 1) * map.tile_px, width);
      const double bottom = std::min<double>((row + 1) * map.tile_px, height);
      const double x = (column * map.tile_px + right) / 2, y = (row * map.tile_px + bottom) / 2;
      const double squared = static_cast<double>(*map.squared_disc_px2[i]);
      tiles.push_back({(x - width / 2) / unit, (y - height / 2) / unit, squared,
                       sigma_px2(squared, static_cast<double>(map.sigma_px[i]))});
    }
  }
  return tiles;
}

bool is_under(const std::string& path, const std::vector<std::string>& places) {
  return std::ranges::any_of(places, [&](const std::string& place) {
    return path == place || path.starts_with(place.ends_with('/') ? place : place + "/");
  });
}

// um at the sensor of one px of blur disc: pixel pitch x working f-number, median over the frames.
std::optional<double> um_per_px(std::span<const FrameRecord> records) {
  std::vector<double> scales;
  for (const FrameRecord& record : records) {
    if (!usable(record) || !record.capture->pixel_pitch_um || !record.prediction) continue;
    const auto f_number = record.prediction->working_f_number;
    if (f_number) scales.push_back(record.capture->pixel_pitch_um->value.value * *f_number);
  }
  return scales.empty() ? std::nullopt : std::optional(median(scales));
}

Interval scaled(const Interval& px, double factor) {
  return {px.value * factor, px.low * factor, px.high * factor};
}

// "12" without and "+12" or "-12" with a sign.
std::string um_words(double um, bool with_sign) { return with_sign ? fmt::format("{:+.0f}", um) : fmt::format("{:.0f}", um); }

std::string field_text(const FlatResult& result) {
  const Interval &tilt = *result.tilt_um, &curve = *result.curvature_um;
  const bool with_sign = result.signed_field;
  return fmt::format(
      "Tilt of the field {:.0f} µm ({:.0f} to {:.0f} µm) at the sensor from the centre to half a diagonal, along {:.0f} "
      "degrees from the long side of the stored frame; curvature {} µm ({} to {} µm).",
      tilt.value, tilt.low, tilt.high, *result.axis_deg, um_words(curve.value, with_sign),
      um_words(curve.low, with_sign), um_words(curve.high, with_sign));
}

std::string with_sign(const FlatResult& result, const FieldFit& fit) {
  if (!result.signed_field)
    return field_text(result) +
           " The sign is not known: blur in front and behind looks alike. It takes three frames or more with focus moved "
           "on, and --focus-travel.";
  return field_text(result) + fmt::format(" Focus falls further behind to the {} and the {}.",
                                          fit.x_tilt_px > 0 ? "right" : "left", fit.y_tilt_px > 0 ? "bottom" : "top");
}

// With the second series: what stays with the sensor belongs to lens and body.
void part_from_wall(FlatResult& result, const FieldFit& upright, const FieldFit& turned, double scale) {
  const FieldParts parts = field_parts(upright, turned);
  const double size = std::hypot(parts.camera_x_px, parts.camera_y_px), half = kNormal95 * parts.camera_sigma_px;
  result.camera_tilt_um = scaled({size, std::max(0.0, size - half), size + half}, scale);
  result.text += fmt::format(
      " Of it, {:.0f} µm ({:.0f} to {:.0f} µm) belong to lens and body; {:.0f} µm turned with the wall.",
      result.camera_tilt_um->value, result.camera_tilt_um->low, result.camera_tilt_um->high,
      std::hypot(parts.wall_x_px, parts.wall_y_px) * scale);
}

bool one_camera(std::span<const FrameRecord> records) {
  std::set<std::string> names;
  for (const FrameRecord& record : records) {
    if (usable(record)) names.insert(lens_name(*record.capture) + "\n" + body_name(*record.capture));
  }
  return names.size() <= 1;
}

}  // namespace

FlatResult flat_field(std::span<const FrameRecord> records, const FlatRequest& request) {
  FlatResult result;
  std::vector<std::vector<FieldTile>> upright, turned;
  for (const FrameRecord& record : records) {
    if (!usable(record)) continue;
    auto tiles = tiles_of(record);
    if (tiles.size() < static_cast<std::size_t>(kLeastFieldTiles)) continue;
    (is_under(record.path, request.upside_down) ? turned : upright).push_back(std::move(tiles));
  }
  result.frames = static_cast<int>(upright.size() + turned.size());
  const auto scale = um_per_px(records);
  if (!one_camera(records)) {
    result.text = "Not enough evidence: the frames come from several lenses or bodies.";
    return result;
  }
  if (upright.empty()) {
    result.text = fmt::format("Not enough evidence: no frame with {} tiles or more that can be measured; stored records "
                              "need check --tiles.",
                              kLeastFieldTiles);
    return result;
  }
  if (!scale) {
    result.text = "Not enough evidence: no f-number or pixel pitch; give --f-number, --pixel-pitch.";
    return result;
  }
  const auto fit = field_of_focus(upright, request.travel);
  if (!fit) {
    result.text = "Not enough evidence: no tilted or curved field fits the blur of these frames.";
    return result;
  }
  result.tilt_um = scaled(fit->tilt_px, *scale);
  result.axis_deg = fit->axis_deg;
  result.curvature_um = scaled(fit->curvature_px, *scale);
  result.signed_field = fit->signed_field;
  result.text = with_sign(result, *fit);
  const auto second = turned.empty() ? std::nullopt : field_of_focus(turned, request.travel);
  if (second && second->signed_field && fit->signed_field) {
    part_from_wall(result, *fit, *second, *scale);
  } else {
    result.text += " This is the tilt of lens, body and wall together.";
  }
  return result;
}

}  // namespace focusfall
