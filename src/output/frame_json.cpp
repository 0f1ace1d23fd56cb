#include "src/output/frame_json.h"

#include <fmt/format.h>

#include <charconv>
#include <cmath>
#include <string_view>
#include <vector>

#include "analysis/compare/compare.h"
#include "src/output/base64.h"
#include "src/output/names.h"

namespace focusfall {

using Json = nlohmann::ordered_json;

namespace {

// Digits that are printed (judgement): capture data keep all that a camera records; what is computed or measured is
// never better than a tenth of a percent, and a digit more keeps sums honest.
constexpr int kCaptureDigits = 7;
constexpr int kModelDigits = 6;
constexpr int kMeasuredDigits = 5;
constexpr int kLevelDigits = 5;       // levels are compared to hundredths of a stop

// null for what is not finite: an infinite value always has a flag or a bound of its own beside it.
Json number(double value, int digits) {
  if (!std::isfinite(value)) return nullptr;
  return rounded(value, digits);
}

Json number(const std::optional<double>& value, int digits) { return value ? number(*value, digits) : Json(); }

template <class T>
Json sourced(const OptionalSourced<T>& value) {
  return value ? Json(value->value) : Json();
}

Json sourced(const OptionalSourced<double>& value) { return value ? number(value->value, kCaptureDigits) : Json(); }

template <class Enum>
Json named(const OptionalSourced<Enum>& value) {
  return value ? Json(name_of(value->value)) : Json();
}

template <class T>
Json source_of(const OptionalSourced<T>& value) {
  return value ? Json(name_of(value->source)) : Json();
}

Json interval(double value, double low, double high, int digits) {
  return {{"value", number(value, digits)}, {"low", number(low, digits)}, {"high", number(high, digits)}};
}

Json focus_distance(const OptionalSourced<FocusDistance>& distance) {
  if (!distance) return nullptr;
  const FocusDistance& d = distance->value;
  Json json = interval(d.value_m, d.low_m, d.high_m, kCaptureDigits);
  json["at_infinity"] = std::isinf(d.value_m);
  json["stale"] = d.stale;
  return json;
}

Json capture_sources(const Capture& c) {
  return {{"camera", source_of(c.camera)},
          {"lens", source_of(c.lens)},
          {"body_serial", source_of(c.body_serial)},
          {"lens_serial", source_of(c.lens_serial)},
          {"taken_at", source_of(c.taken_at)},
          {"sequence", source_of(c.sequence)},
          {"focal_length_mm", source_of(c.focal_length_mm)},
          {"f_number", source_of(c.f_number)},
          {"exposure_time_s", source_of(c.exposure_time_s)},
          {"iso_speed", source_of(c.iso_speed)},
          {"exposure_bias_ev", source_of(c.exposure_bias_ev)},
          {"brightness_apex", source_of(c.brightness_apex)},
          {"exposure_mode", source_of(c.exposure_mode)},
          {"focus_distance_m", source_of(c.focus_distance)},
          {"pixel_pitch_um", source_of(c.pixel_pitch_um)},
          {"width_px", nullptr},    // the decoder's: not one of the sources
          {"height_px", nullptr},
          {"orientation", source_of(c.orientation)},
          {"flash_fired", source_of(c.flash_fired)},
          {"stabiliser_on", source_of(c.stabiliser_on)},
          {"focus_mode", source_of(c.focus_mode)}};
}

Json capture_json(const Capture& c) {
  Json pitch;
  if (c.pixel_pitch_um) {
    const CoarseValue& p = c.pixel_pitch_um->value;
    pitch = interval(p.value, p.low, p.high, kModelDigits);
  }
  return {{"camera", sourced(c.camera)},
          {"lens", sourced(c.lens)},
          {"body_serial", sourced(c.body_serial)},
          {"lens_serial", sourced(c.lens_serial)},
          {"taken_at", sourced(c.taken_at)},
          {"sequence", sourced(c.sequence)},
          {"focal_length_mm", sourced(c.focal_length_mm)},
          {"f_number", sourced(c.f_number)},
          {"exposure_time_s", sourced(c.exposure_time_s)},
          {"iso_speed", sourced(c.iso_speed)},
          {"exposure_bias_ev", sourced(c.exposure_bias_ev)},
          {"brightness_apex", sourced(c.brightness_apex)},
          {"exposure_mode", named(c.exposure_mode)},
          {"focus_distance_m", focus_distance(c.focus_distance)},
          {"pixel_pitch_um", pitch},
          {"width_px", c.width_px ? Json(*c.width_px) : Json()},
          {"height_px", c.height_px ? Json(*c.height_px) : Json()},
          {"orientation", sourced(c.orientation)},
          {"flash_fired", sourced(c.flash_fired)},
          {"stabiliser_on", sourced(c.stabiliser_on)},
          {"focus_mode", named(c.focus_mode)},
          {"source", capture_sources(c)}};
}

Json prediction_json(const Prediction& p) {
  const auto model = [](const std::optional<double>& value) { return number(value, kModelDigits); };
  Json baseline;
  if (p.baseline_px2) {
    baseline = interval(p.baseline_px2->value, p.baseline_px2->low, p.baseline_px2->high, kModelDigits);
    baseline["source"] = p.baseline_source != nullptr ? Json(p.baseline_source) : Json();
  }
  return {{"distance_from", name_of(p.distance_from)},
          {"acceptable_blur_px", model(p.acceptable_blur_px)},
          {"acceptable_blur_um", model(p.acceptable_blur_um)},
          {"circle_of_confusion_um", model(p.circle_of_confusion_um)},
          {"image_distance_mm", model(p.image_distance_mm)},
          {"entrance_pupil_mm", model(p.entrance_pupil_mm)},
          {"magnification", model(p.magnification)},
          {"working_f_number", model(p.working_f_number)},
          {"hyperfocal_m", model(p.hyperfocal_m)},
          {"near_limit_m", model(p.near_limit_m)},
          {"far_limit_m", model(p.far_limit_m)},
          {"far_limit_infinite", p.far_limit_infinite},
          {"depth_of_focus_um", model(p.depth_of_focus_um)},
          {"airy_diameter_px", model(p.airy_diameter_px)},
          {"motion_blur_px", model(p.motion_blur_px)},
          {"baseline_px2", baseline},
          {"blur_disc_px", model(p.blur_disc_px)},
          {"edge_rise_px", model(p.edge_rise_px)},
          {"exposure_value", model(p.exposure_value)},
          {"mid_tone_level", model(p.mid_tone_level)}};
}

Json measured(double value) { return number(value, kMeasuredDigits); }

void put_box(Json& json, const FractionBox& box) {
  json["x"] = number(box.x, kModelDigits);
  json["y"] = number(box.y, kModelDigits);
  json["width"] = number(box.width, kModelDigits);
  json["height"] = number(box.height, kModelDigits);
}

// `measured_px2` is S as measured, before the baseline is taken off: with it the record can be judged again.
Json blur_json(const BlurReading& reading, const FrameRecord& record) {
  if (!reading.estimate) {
    return {{"blur_disc_px", nullptr},     {"low", nullptr},
            {"high", nullptr},             {"squared_disc_px2", nullptr},
            {"edge_rise_px", nullptr},     {"mtf50_cycles_per_px", nullptr},
            {"edges", reading.edges},      {"evidence", false},
            {"bound", name_of(Bound::none)}, {"measured_px2", nullptr}};
  }
  const BlurEstimate& e = *reading.estimate;
  const Interval s = blur_after_baseline(e, record.prediction.value_or(Prediction{}), *record.measurement);
  return {{"blur_disc_px", measured(blur_disc_px(s.value))},
          {"low", measured(blur_disc_px(s.low))},
          {"high", measured(blur_disc_px(s.high))},
          {"squared_disc_px2", measured(s.value)},
          {"edge_rise_px", measured(e.edge_rise_px)},
          {"mtf50_cycles_per_px", measured(e.mtf50_cycles_per_px)},
          {"edges", reading.edges},
          {"evidence", true},
          {"bound", name_of(e.bound)},
          {"measured_px2",
           interval(e.squared_disc_px2, e.squared_disc_low_px2, e.squared_disc_high_px2, kMeasuredDigits)}};
}

Json motion_json(const std::optional<MotionReading>& motion) {
  if (!motion) return nullptr;
  return {{"length_px", measured(motion->length_px)},
          {"length_low", measured(motion->length_low_px)},
          {"length_high", measured(motion->length_high_px)},
          {"angle_deg", measured(motion->angle_deg)}};
}

Json plane_json(const std::optional<PlaneReading>& plane) {
  if (!plane) return nullptr;
  const bool touches = plane->contact != Contact::none;
  const auto at_contact = [&plane](double Interval::*bound) {
    return plane->at_contact_px ? measured((*plane->at_contact_px).*bound) : Json();
  };
  return {{"x_gradient", measured(plane->x_gradient_px)},
          {"y_gradient", measured(plane->y_gradient_px)},
          {"contact", name_of(plane->contact)},
          {"contact_x", touches ? number(plane->contact_x, kModelDigits) : Json()},
          {"contact_y", touches ? number(plane->contact_y, kModelDigits) : Json()},
          {"at_contact_px", at_contact(&Interval::value)},
          {"at_contact_low", at_contact(&Interval::low)},
          {"at_contact_high", at_contact(&Interval::high)},
          {"inlier_fraction", measured(plane->inlier_fraction)},
          {"near_side", name_of(plane->near_side)},
          {"offset_px", measured(plane->offset_px)}};
}

Json clipping_json(const std::optional<Clipping>& c) {
  if (!c) return nullptr;
  Json json = {{"red", measured(c->red)},
               {"green", measured(c->green)},
               {"blue", measured(c->blue)},
               {"any", measured(c->any)},
               {"aim_any", measured(c->aim_any)},
               {"largest_patch", measured(c->largest_patch)},
               {"kind", name_of(c->kind)},
               {"measured_on", name_of(c->measured_on)},
               {"two_or_more", measured(c->two_or_more)},
               {"aim_two_or_more", measured(c->aim_two_or_more)}};
  if (c->headroom_ev) json["headroom_ev"] = measured(*c->headroom_ev);
  return json;
}

Json tone_json(const std::optional<Tone>& tone) {
  if (!tone) return nullptr;
  return {{"mean_linear", measured(tone->mean_linear)},
          {"median_linear", measured(tone->median_linear)},
          {"aim_median_linear", number(tone->aim_median_linear, kMeasuredDigits)},
          {"p99_linear", measured(tone->p99_linear)}};
}

// Blur per tile as measured: the baseline is one number for the whole frame and would only hide in it.
Json tiles_json(const TileMap& tiles) {
  Json discs = Json::array(), clipped = Json::array();
  for (const auto& squared : tiles.squared_disc_px2) {
    discs.push_back(squared ? number(blur_disc_px(static_cast<double>(*squared)), 3) : Json());
  }
  for (const float fraction : tiles.clipped) clipped.push_back(number(static_cast<double>(fraction), 3));
  return {{"rows", tiles.rows},         {"columns", tiles.columns}, {"blur_disc_px", discs},
          {"edges", tiles.edges},       {"clipped", clipped},       {"tile_px", tiles.tile_px}};
}

Json level_list(const std::vector<float>& values) {
  Json list = Json::array();
  for (const float value : values) list.push_back(number(static_cast<double>(value), kLevelDigits));
  return list;
}

Json levels_json(const LevelGrid& levels) {
  return {{"rows", levels.rows},
          {"columns", levels.columns},
          {"tile_px", levels.tile_px},
          {"mean_linear", level_list(levels.mean_linear)},
          {"contrast", level_list(levels.contrast)},
          {"clipped", level_list(levels.clipped)}};
}

Json highlights_json(const Highlights& highlights) {
  return {{"frame_share_above", level_list(highlights.frame_share_above)},
          {"aim_share_above", level_list(highlights.aim_share_above)}};
}

Json measurement_json(const FrameRecord& record, const FrameJsonOptions& options) {
  const Measurement& m = *record.measurement;
  Json best;
  if (m.best) {
    best = blur_json(m.best->reading, record);
    put_box(best, m.best->box);
  }
  Json json = {{"aim", blur_json(m.aim_blur, record)},
               {"best", best},
               {"motion", motion_json(m.motion)},
               {"background_motion", motion_json(m.background_motion)},
               {"plane", plane_json(m.plane)},
               {"clipping", clipping_json(m.clipping)},
               {"shadows", m.clipping ? Json{{"any", measured(m.clipping->shadows_any)}} : Json()},
               {"tone", tone_json(m.tone)}};
  if (options.tiles && m.tiles) json["tiles"] = tiles_json(*m.tiles);
  if (options.levels && m.levels) json["levels"] = levels_json(*m.levels);
  if (options.levels && m.highlights) json["highlights"] = highlights_json(*m.highlights);
  return json;
}

Json aim_json(const FrameRecord& record) {
  if (!record.measurement) return nullptr;
  const Aim& aim = record.measurement->aim;
  Json json;
  put_box(json, aim.box);
  json["source"] = name_of(record.aim_origin ? record.aim_origin->kind : FocusAreaKind::centre);
  json["grown"] = aim.grown;
  json["mixed"] = aim.mixed;
  return json;
}

void put_interval(Json& json, const std::string& key, const std::optional<Interval>& value) {
  json[key] = value ? measured(value->value) : Json();
  json[key + "_low"] = value ? measured(value->low) : Json();
  json[key + "_high"] = value ? measured(value->high) : Json();
}

Json verdict_json(const Verdict& verdict) {
  Json causes = Json::array();
  for (const Cause cause : verdict.causes) causes.push_back(name_of(cause));
  Json json = {{"focus", name_of(verdict.focus)}, {"causes", causes}};
  put_interval(json, "defocus_um", verdict.defocus_um);
  put_interval(json, "defocus_limits", verdict.defocus_limits);
  put_interval(json, "focus_offset_m", verdict.focus_offset_m);
  json["exposure"] = name_of(verdict.exposure);
  put_interval(json, "exposure_error_ev", verdict.exposure_error_ev);
  json["clipped"] = verdict.clipped;
  json["pull_back_ev"] = number(verdict.pull_back_ev, kMeasuredDigits);
  json["summary"] = verdict.summary;
  json["panned"] = verdict.panned;
  return json;
}

bool is_utf8(const std::string& text) {
  try {
    static_cast<void>(Json(text).dump());
    return true;
  } catch (const Json::type_error&) {
    return false;   // error 316: invalid UTF-8
  }
}

}  // namespace

double rounded(double value, int digits) {
  if (!std::isfinite(value) || value == 0) return value;
  const std::string text = fmt::format("{:.{}g}", value, digits);
  double result = value;
  std::from_chars(text.data(), text.data() + text.size(), result);
  return result;
}

Json frame_json(const FrameRecord& record, const FrameJsonOptions& options) {
  Json json = {{"schema", kFrameSchema}, {"path", record.path.empty() ? Json() : Json(record.path)}};
  if (!is_utf8(record.path)) json["path_bytes"] = base64(record.path);
  if (record.raw_path) json["raw_path"] = *record.raw_path;
  if (record.measured_from) json["measured_from"] = *record.measured_from;
  json["capture"] = record.capture ? capture_json(*record.capture) : Json();
  json["prediction"] = record.prediction ? prediction_json(*record.prediction) : Json();
  json["aim"] = aim_json(record);
  json["measurement"] = record.measurement ? measurement_json(record, options) : Json();
  json["verdict"] = record.verdict ? verdict_json(*record.verdict) : Json();
  Json issues = Json::array();
  for (const Issue& issue : record.issues) {
    issues.push_back({{"stage", name_of(issue.stage)}, {"code", issue.code}, {"message", issue.message}});
  }
  json["issues"] = issues;
  return json;
}

Json solved_json(const SolvedValue& solved) {
  return {{"quantity", solved.quantity}, {"value", number(solved.value, kModelDigits)}, {"unit", solved.unit}};
}

std::string json_line(const Json& object) {
  return object.dump(-1, ' ', false, Json::error_handler_t::replace) + "\n";
}

}  // namespace focusfall
