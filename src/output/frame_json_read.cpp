#include <fmt/format.h>

#include <limits>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "src/output/base64.h"
#include "src/output/frame_json.h"
#include "src/output/names.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

constexpr double kInfinity = std::numeric_limits<double>::infinity();

// A key that does not hold what the schema says. Caught in frame_record_from_json().
struct BadKey {
  std::string message;
};

const Json& at(const Json& object, std::string_view key) {
  static const Json null;
  const auto found = object.find(key);
  return found == object.end() ? null : *found;
}

template <class T>
std::optional<T> optional_at(const Json& object, std::string_view key) {
  const Json& value = at(object, key);
  if (value.is_null()) return std::nullopt;
  try {
    return value.get<T>();
  } catch (const Json::exception&) {
    throw BadKey{fmt::format("{} holds a {}", key, value.type_name())};
  }
}

template <class T>
T value_at(const Json& object, std::string_view key) {
  if (auto value = optional_at<T>(object, key)) return *value;
  throw BadKey{fmt::format("{} is missing", key)};
}

template <class Enum>
std::optional<Enum> optional_enum_at(const Json& object, std::string_view key) {
  const auto name = optional_at<std::string>(object, key);
  if (!name) return std::nullopt;
  const auto value = value_named<Enum>(*name);
  if (!value) throw BadKey{fmt::format("{} is \"{}\", which is no value of it", key, *name)};
  return value;
}

template <class Enum>
Enum enum_at(const Json& object, std::string_view key) {
  if (const auto value = optional_enum_at<Enum>(object, key)) return *value;
  throw BadKey{fmt::format("{} is missing", key)};
}

// Runs `read` on the object under `key` unless it is null.
template <class Read>
auto object_at(const Json& object, std::string_view key, Read read) -> std::optional<decltype(read(object))> {
  const Json& value = at(object, key);
  if (value.is_null()) return std::nullopt;
  if (!value.is_object()) throw BadKey{fmt::format("{} holds a {}", key, value.type_name())};
  return read(value);
}

// ---- capture --------------------------------------------------------------------------------------------------------

// Reads the fields of `capture` together with their sources.
class CaptureReader {
 public:
  explicit CaptureReader(const Json& capture) : capture_(capture), sources_(at(capture, "source")) {}

  template <class T>
  OptionalSourced<T> plain(std::string_view key) const {
    const auto value = optional_at<T>(capture_, key);
    if (!value) return std::nullopt;
    return Sourced<T>{*value, source(key)};
  }

  template <class Enum>
  OptionalSourced<Enum> named(std::string_view key) const {
    const auto value = optional_enum_at<Enum>(capture_, key);
    if (!value) return std::nullopt;
    return Sourced<Enum>{*value, source(key)};
  }

  OptionalSourced<CoarseValue> coarse(std::string_view key) const {
    const auto value = object_at(capture_, key, [](const Json& json) {
      return CoarseValue{.value = value_at<double>(json, "value"),
                         .low = value_at<double>(json, "low"),
                         .high = value_at<double>(json, "high")};
    });
    if (!value) return std::nullopt;
    return Sourced<CoarseValue>{*value, source(key)};
  }

  // A bound or a value that is not finite was written as null.
  OptionalSourced<FocusDistance> distance(std::string_view key) const {
    const auto value = object_at(capture_, key, [](const Json& json) {
      return FocusDistance{.value_m = optional_at<double>(json, "value").value_or(kInfinity),
                           .low_m = optional_at<double>(json, "low").value_or(kInfinity),
                           .high_m = optional_at<double>(json, "high").value_or(kInfinity),
                           .stale = value_at<bool>(json, "stale")};
    });
    if (!value) return std::nullopt;
    return Sourced<FocusDistance>{*value, source(key)};
  }

 private:
  Source source(std::string_view key) const {
    if (!sources_.is_object()) return Source::exif;
    return optional_enum_at<Source>(sources_, key).value_or(Source::exif);
  }

  const Json& capture_;
  const Json& sources_;
};

Capture capture_from(const Json& json) {
  const CaptureReader reader(json);
  Capture c;
  c.camera = reader.plain<std::string>("camera");
  c.lens = reader.plain<std::string>("lens");
  c.body_serial = reader.plain<std::string>("body_serial");
  c.lens_serial = reader.plain<std::string>("lens_serial");
  c.taken_at = reader.plain<std::string>("taken_at");
  c.sequence = reader.plain<long>("sequence");
  c.focal_length_mm = reader.plain<double>("focal_length_mm");
  c.f_number = reader.plain<double>("f_number");
  c.exposure_time_s = reader.plain<double>("exposure_time_s");
  c.iso_speed = reader.plain<double>("iso_speed");
  c.exposure_bias_ev = reader.plain<double>("exposure_bias_ev");
  c.brightness_apex = reader.plain<double>("brightness_apex");
  c.exposure_mode = reader.named<ExposureMode>("exposure_mode");
  c.focus_distance = reader.distance("focus_distance_m");
  c.pixel_pitch_um = reader.coarse("pixel_pitch_um");
  c.width_px = optional_at<int>(json, "width_px");
  c.height_px = optional_at<int>(json, "height_px");
  c.orientation = reader.plain<int>("orientation");
  c.flash_fired = reader.plain<bool>("flash_fired");
  c.stabiliser_on = reader.plain<bool>("stabiliser_on");
  c.focus_mode = reader.named<FocusMode>("focus_mode");
  return c;
}

// ---- prediction -----------------------------------------------------------------------------------------------------

Interval interval_from(const Json& json) {
  return {.value = value_at<double>(json, "value"),
          .low = value_at<double>(json, "low"),
          .high = value_at<double>(json, "high")};
}

const char* baseline_source_from(const Json& baseline) {
  const auto name = optional_at<std::string>(baseline, "source");
  if (!name) return nullptr;
  for (const char* known : baseline_source_names()) {
    if (*name == known) return known;
  }
  throw BadKey{fmt::format("source of baseline_px2 is \"{}\", which is no value of it", *name)};
}

Prediction prediction_from(const Json& json) {
  const auto number = [&json](std::string_view key) { return optional_at<double>(json, key); };
  Prediction p;
  p.distance_from = enum_at<DistanceOrigin>(json, "distance_from");
  p.acceptable_blur_px = number("acceptable_blur_px");
  p.acceptable_blur_um = number("acceptable_blur_um");
  p.circle_of_confusion_um = number("circle_of_confusion_um");
  p.image_distance_mm = number("image_distance_mm");
  p.entrance_pupil_mm = number("entrance_pupil_mm");
  p.magnification = number("magnification");
  p.working_f_number = number("working_f_number");
  p.hyperfocal_m = number("hyperfocal_m");
  p.near_limit_m = number("near_limit_m");
  p.far_limit_m = number("far_limit_m");
  p.far_limit_infinite = optional_at<bool>(json, "far_limit_infinite").value_or(false);
  p.depth_of_focus_um = number("depth_of_focus_um");
  p.airy_diameter_px = number("airy_diameter_px");
  p.motion_blur_px = number("motion_blur_px");
  p.baseline_px2 = object_at(json, "baseline_px2", interval_from);
  if (p.baseline_px2) p.baseline_source = baseline_source_from(at(json, "baseline_px2"));
  p.blur_disc_px = number("blur_disc_px");
  p.edge_rise_px = number("edge_rise_px");
  p.exposure_value = number("exposure_value");
  p.mid_tone_level = number("mid_tone_level");
  return p;
}

// ---- measurement ----------------------------------------------------------------------------------------------------

FractionBox box_from(const Json& json) {
  return {.x = value_at<double>(json, "x"),
          .y = value_at<double>(json, "y"),
          .width = value_at<double>(json, "width"),
          .height = value_at<double>(json, "height")};
}

BlurReading blur_from(const Json& json) {
  BlurReading reading{.estimate = std::nullopt, .edges = value_at<int>(json, "edges")};
  if (!value_at<bool>(json, "evidence")) return reading;
  const auto squared = object_at(json, "measured_px2", interval_from);
  if (!squared) throw BadKey{"measured_px2 is missing"};
  reading.estimate = BlurEstimate{.squared_disc_px2 = squared->value,
                                  .squared_disc_low_px2 = squared->low,
                                  .squared_disc_high_px2 = squared->high,
                                  .edge_rise_px = value_at<double>(json, "edge_rise_px"),
                                  .mtf50_cycles_per_px = value_at<double>(json, "mtf50_cycles_per_px"),
                                  .bound = enum_at<Bound>(json, "bound")};
  return reading;
}

MotionReading motion_from(const Json& json) {
  MotionReading motion;
  motion.length_px = value_at<double>(json, "length_px");
  motion.length_low_px = value_at<double>(json, "length_low");
  motion.length_high_px = value_at<double>(json, "length_high");
  motion.angle_deg = value_at<double>(json, "angle_deg");
  return motion;
}

PlaneReading plane_from(const Json& json) {
  PlaneReading plane;
  plane.x_gradient_px = value_at<double>(json, "x_gradient");
  plane.y_gradient_px = value_at<double>(json, "y_gradient");
  plane.offset_px = value_at<double>(json, "offset_px");
  plane.contact = enum_at<Contact>(json, "contact");
  plane.contact_x = optional_at<double>(json, "contact_x").value_or(0);
  plane.contact_y = optional_at<double>(json, "contact_y").value_or(0);
  if (const auto value = optional_at<double>(json, "at_contact_px")) {
    plane.at_contact_px = Interval{.value = *value,
                                   .low = value_at<double>(json, "at_contact_low"),
                                   .high = value_at<double>(json, "at_contact_high")};
  }
  plane.inlier_fraction = value_at<double>(json, "inlier_fraction");
  plane.near_side = enum_at<NearSide>(json, "near_side");
  return plane;
}

Clipping clipping_from(const Json& json) {
  Clipping c;
  c.red = value_at<double>(json, "red");
  c.green = value_at<double>(json, "green");
  c.blue = value_at<double>(json, "blue");
  c.any = value_at<double>(json, "any");
  c.aim_any = value_at<double>(json, "aim_any");
  c.largest_patch = value_at<double>(json, "largest_patch");
  c.kind = enum_at<ClippedKind>(json, "kind");
  c.measured_on = enum_at<ClippedOn>(json, "measured_on");
  c.two_or_more = value_at<double>(json, "two_or_more");
  c.aim_two_or_more = value_at<double>(json, "aim_two_or_more");
  c.headroom_ev = optional_at<double>(json, "headroom_ev");
  return c;
}

Tone tone_from(const Json& json) {
  return {.mean_linear = value_at<double>(json, "mean_linear"),
          .median_linear = value_at<double>(json, "median_linear"),
          .aim_median_linear = optional_at<double>(json, "aim_median_linear"),
          .p99_linear = value_at<double>(json, "p99_linear")};
}

LevelGrid levels_from(const Json& json) {
  LevelGrid levels;
  levels.rows = value_at<int>(json, "rows");
  levels.columns = value_at<int>(json, "columns");
  levels.tile_px = value_at<int>(json, "tile_px");
  levels.mean_linear = value_at<std::vector<float>>(json, "mean_linear");
  levels.contrast = value_at<std::vector<float>>(json, "contrast");
  levels.clipped = value_at<std::vector<float>>(json, "clipped");
  const auto count = static_cast<std::size_t>(levels.rows) * static_cast<std::size_t>(levels.columns);
  if (levels.rows < 0 || levels.columns < 0 || levels.mean_linear.size() != count || levels.contrast.size() != count ||
      levels.clipped.size() != count) {
    throw BadKey{"levels do not hold rows x columns values"};
  }
  return levels;
}

Highlights highlights_from(const Json& json) {
  Highlights highlights{value_at<std::vector<float>>(json, "frame_share_above"),
                        value_at<std::vector<float>>(json, "aim_share_above")};
  const auto count = static_cast<std::size_t>(kHighlightSteps);
  const bool no_aim = highlights.aim_share_above.empty();
  if (highlights.frame_share_above.size() != count || (!no_aim && highlights.aim_share_above.size() != count)) {
    throw BadKey{"highlights do not hold a share for every level"};
  }
  return highlights;
}

TileMap tiles_from(const Json& json) {
  TileMap tiles;
  tiles.rows = value_at<int>(json, "rows");
  tiles.columns = value_at<int>(json, "columns");
  tiles.tile_px = value_at<int>(json, "tile_px");
  for (const Json& disc : at(json, "blur_disc_px")) {
    tiles.squared_disc_px2.push_back(
        disc.is_number() ? std::optional(disc.get<float>() * disc.get<float>()) : std::nullopt);
  }
  tiles.edges = value_at<std::vector<int>>(json, "edges");
  tiles.clipped = value_at<std::vector<float>>(json, "clipped");
  const auto count = static_cast<std::size_t>(tiles.rows) * static_cast<std::size_t>(tiles.columns);
  if (tiles.rows < 0 || tiles.columns < 0 || tiles.squared_disc_px2.size() != count || tiles.edges.size() != count ||
      tiles.clipped.size() != count) {
    throw BadKey{"tiles do not hold rows x columns values"};
  }
  tiles.sigma_px.assign(count, 0.0f);
  return tiles;
}

Measurement measurement_from(const Json& json) {
  Measurement m;
  const auto aim = object_at(json, "aim", blur_from);
  if (!aim) throw BadKey{"aim of measurement is missing"};
  m.aim_blur = *aim;
  m.best = object_at(json, "best", [](const Json& best) {
    return SharpestRegion{.box = box_from(best), .reading = blur_from(best)};
  });
  m.motion = object_at(json, "motion", motion_from);
  m.background_motion = object_at(json, "background_motion", motion_from);
  m.plane = object_at(json, "plane", plane_from);
  m.clipping = object_at(json, "clipping", clipping_from);
  if (m.clipping) {
    m.clipping->shadows_any =
        object_at(json, "shadows", [](const Json& shadows) { return value_at<double>(shadows, "any"); }).value_or(0);
  }
  m.tone = object_at(json, "tone", tone_from);
  m.levels = object_at(json, "levels", levels_from);
  m.highlights = object_at(json, "highlights", highlights_from);
  m.tiles = object_at(json, "tiles", tiles_from);
  return m;
}

// ---- verdict --------------------------------------------------------------------------------------------------------

std::optional<Interval> bounds_at(const Json& json, const std::string& key) {
  const auto value = optional_at<double>(json, key);
  if (!value) return std::nullopt;
  return Interval{.value = *value,
                  .low = optional_at<double>(json, key + "_low").value_or(-kInfinity),
                  .high = optional_at<double>(json, key + "_high").value_or(kInfinity)};
}

Verdict verdict_from(const Json& json) {
  Verdict v;
  v.focus = enum_at<FocusVerdict>(json, "focus");
  for (const Json& name : at(json, "causes")) {
    const auto cause = name.is_string() ? value_named<Cause>(name.get<std::string>()) : std::nullopt;
    if (!cause) throw BadKey{fmt::format("causes holds {}, which is no cause", name.dump())};
    v.causes.push_back(*cause);
  }
  v.panned = optional_at<bool>(json, "panned").value_or(false);
  v.defocus_um = bounds_at(json, "defocus_um");
  v.defocus_limits = bounds_at(json, "defocus_limits");
  v.focus_offset_m = bounds_at(json, "focus_offset_m");
  v.exposure = enum_at<ExposureVerdict>(json, "exposure");
  v.exposure_error_ev = bounds_at(json, "exposure_error_ev");
  v.clipped = value_at<bool>(json, "clipped");
  v.pull_back_ev = optional_at<double>(json, "pull_back_ev");
  v.summary = value_at<std::string>(json, "summary");
  return v;
}

std::string path_from(const Json& json) {
  if (const auto encoded = optional_at<std::string>(json, "path_bytes")) {
    if (auto bytes = bytes_of_base64(*encoded)) return std::move(*bytes);
    throw BadKey{"path_bytes is no base64"};
  }
  return optional_at<std::string>(json, "path").value_or("");
}

FrameRecord record_from(const Json& json) {
  if (optional_at<std::string>(json, "schema") != kFrameSchema) {
    throw BadKey{fmt::format("schema is {}, not \"{}\"", at(json, "schema").dump(), kFrameSchema)};
  }
  FrameRecord record;
  record.path = path_from(json);
  record.raw_path = optional_at<std::string>(json, "raw_path");
  record.measured_from = optional_at<std::string>(json, "measured_from");
  record.capture = object_at(json, "capture", capture_from);
  record.prediction = object_at(json, "prediction", prediction_from);
  record.measurement = object_at(json, "measurement", measurement_from);
  if (const Json& aim = at(json, "aim"); aim.is_object() && record.measurement) {
    const FractionBox box = box_from(aim);
    record.measurement->aim = {
        .box = box, .grown = value_at<bool>(aim, "grown"), .mixed = value_at<bool>(aim, "mixed")};
    record.aim_origin = FocusArea{.box = {.x = box.x, .y = box.y, .width = box.width, .height = box.height},
                                  .kind = enum_at<FocusAreaKind>(aim, "source")};
  }
  record.verdict = object_at(json, "verdict", verdict_from);
  for (const Json& issue : at(json, "issues")) {
    record.issues.push_back({.stage = enum_at<Stage>(issue, "stage"),
                             .code = value_at<std::string>(issue, "code"),
                             .message = value_at<std::string>(issue, "message")});
  }
  record.done = record.measurement.has_value();
  return record;
}

}  // namespace

tl::expected<FrameRecord, std::string> frame_record_from_json(const Json& object) {
  try {
    if (!object.is_object()) return tl::make_unexpected(fmt::format("a {}, not an object", object.type_name()));
    return record_from(object);
  } catch (const BadKey& bad) {
    return tl::make_unexpected(bad.message);
  } catch (const Json::exception& bad) {
    return tl::make_unexpected(std::string(bad.what()));
  }
}

}  // namespace focusfall
