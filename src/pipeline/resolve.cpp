#include "src/pipeline/resolve.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <string>
#include <string_view>

#include "src/pipeline/clock.h"

namespace focusfall {
namespace {

// Side of the aim where nothing was recorded, fraction of the frame's width and height (judgement: large enough to
// hold edges on most subjects that fill the centre, small enough to leave the background out).
constexpr double kCentreFraction = 1.0 / 6;

// Luminance at BrightnessValue 0: 12.5 / 3.125 cd/m^2 (Bv = 0 with K = 12.5; GNU units 2.22 definitions, APEX).
constexpr double kLuminanceAtZeroBv = 4.0;

// ---- the layers of what was said ------------------------------------------------------------------------------------

bool same_name(std::string_view a, std::string_view b) {
  const auto fold = [](char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; };
  return std::ranges::equal(a, b, {}, fold, fold);
}

// The entry whose serial number is that of the file, else the first without a serial whose name is.
template <class Entry>
const Entry* matching(const std::vector<Entry>& entries, const OptionalSourced<std::string>& serial,
                      const OptionalSourced<std::string>& name) {
  for (const Entry& entry : entries) {
    if (entry.serial && serial && *entry.serial == serial->value) return &entry;
  }
  for (const Entry& entry : entries) {
    if (!entry.serial && entry.model && name && same_name(*entry.model, name->value)) return &entry;
  }
  return nullptr;
}

// Who may speak before the file and who after it, best first.
struct Layers {
  std::vector<std::pair<const UserValues*, Source>> before_file;
  std::vector<std::pair<const UserValues*, Source>> after_file;
  const BodySettings* body = nullptr;

  template <class T>
  static OptionalSourced<T> first(const std::vector<std::pair<const UserValues*, Source>>& layers,
                                  std::optional<T> UserValues::*field) {
    for (const auto& [values, source] : layers) {
      if ((values->*field).has_value()) return Sourced<T>{*(values->*field), source};
    }
    return std::nullopt;
  }

  // What counts for a field that the file does not know.
  template <class T>
  std::optional<T> said(std::optional<T> UserValues::*field) const {
    if (const auto value = first(before_file, field)) return value->value;
    if (const auto value = first(after_file, field)) return value->value;
    return std::nullopt;
  }

  // command line > file > settings, into the file's own field.
  template <class T>
  void merge(OptionalSourced<T>& recorded, std::optional<T> UserValues::*field) const {
    if (auto value = first(before_file, field)) {
      recorded = value;
    } else if (!recorded) {
      recorded = first(after_file, field);
    }
  }
};

Layers layers_for(const Capture& capture, const UserValues& user, const Settings& settings) {
  Layers layers;
  layers.before_file.emplace_back(&user, Source::user);
  const auto add = [&layers](const UserValues& values, bool override_file) {
    (override_file ? layers.before_file : layers.after_file).emplace_back(&values, Source::settings);
  };
  if (const auto* lens = matching(settings.lenses, capture.lens_serial, capture.lens)) {
    add(lens->values, lens->override_file);
  }
  layers.body = matching(settings.bodies, capture.body_serial, capture.camera);
  if (layers.body != nullptr) add(layers.body->values, layers.body->override_file);
  add(settings.defaults, settings.override_file);
  return layers;
}

// ---- the capture ----------------------------------------------------------------------------------------------------

CoarseValue exact(double value) { return {.value = value, .low = value, .high = value}; }

// Pitch, um, of a sensor over a picture; the long side lies over the long side.
double pitch_um(const SensorSize& sensor, DecodedSize size) {
  return 1000 * std::max(sensor.width_mm, sensor.height_mm) / std::max(size.width_px, size.height_px);
}

// A pitch that was said, or one that follows from a sensor size that was.
OptionalSourced<CoarseValue> said_pitch(const std::vector<std::pair<const UserValues*, Source>>& layers,
                                        DecodedSize size) {
  for (const auto& [values, source] : layers) {
    if (values->pixel_pitch_um) return Sourced<CoarseValue>{exact(*values->pixel_pitch_um), source};
    if (values->sensor && size.width_px > 0) {
      return Sourced<CoarseValue>{exact(pitch_um(*values->sensor, size)), source};
    }
  }
  return std::nullopt;
}

OptionalSourced<FocusDistance> said_distance(const std::vector<std::pair<const UserValues*, Source>>& layers) {
  const auto distance = Layers::first(layers, &UserValues::focus_distance_m);
  if (!distance) return std::nullopt;
  return Sourced<FocusDistance>{
      {.value_m = distance->value, .low_m = distance->value, .high_m = distance->value}, distance->source};
}

template <class T>
void merge_said(OptionalSourced<T>& recorded, OptionalSourced<T> before, OptionalSourced<T> after) {
  if (before) {
    recorded = before;
  } else if (!recorded) {
    recorded = after;
  }
}

Capture merged_capture(const Capture& capture, const Layers& layers, DecodedSize size) {
  Capture merged = capture;
  layers.merge(merged.focal_length_mm, &UserValues::focal_length_mm);
  layers.merge(merged.f_number, &UserValues::f_number);
  layers.merge(merged.exposure_time_s, &UserValues::exposure_time_s);
  layers.merge(merged.iso_speed, &UserValues::iso_speed);
  merge_said(merged.focus_distance, said_distance(layers.before_file), said_distance(layers.after_file));
  merge_said(merged.pixel_pitch_um, said_pitch(layers.before_file, size), said_pitch(layers.after_file, size));
  if (layers.body != nullptr && layers.body->clock_offset_s && merged.taken_at) {
    if (auto moved = moved_time(merged.taken_at->value, *layers.body->clock_offset_s)) {
      merged.taken_at = Sourced<std::string>{std::move(*moved), Source::settings};
    }
  }
  return merged;
}

// ---- the optical set-up ---------------------------------------------------------------------------------------------

// Sensor size that was said, turned as the picture lies.
void set_sensor(OpticalSetup& setup, const std::optional<SensorSize>& sensor) {
  if (!sensor) return;
  const bool turned = (setup.width_px > setup.height_px && sensor->width_mm < sensor->height_mm) ||
                      (setup.width_px < setup.height_px && sensor->width_mm > sensor->height_mm);
  setup.sensor_width_mm = turned ? sensor->height_mm : sensor->width_mm;
  setup.sensor_height_mm = turned ? sensor->width_mm : sensor->height_mm;
}

std::optional<OpticalSetup> optical_setup(const Capture& capture, const Layers& layers, DecodedSize size) {
  if (!capture.focal_length_mm || !capture.f_number) return std::nullopt;
  const double teleconverter = layers.said(&UserValues::teleconverter).value_or(1.0);
  OpticalSetup setup;
  setup.focal_length_mm = capture.focal_length_mm->value * teleconverter;
  setup.f_number = capture.f_number->value * teleconverter;
  setup.pupil_magnification = layers.said(&UserValues::pupil_magnification).value_or(setup.pupil_magnification);
  setup.wavelength_um = layers.said(&UserValues::wavelength_um).value_or(setup.wavelength_um);
  setup.distance_from = layers.said(&UserValues::distance_from).value_or(DistanceOrigin::sensor);
  if (capture.focus_distance) {
    const FocusDistance& distance = capture.focus_distance->value;
    setup.focus_distance_m = Interval{distance.value_m, distance.low_m, distance.high_m};
  }
  if (capture.pixel_pitch_um) {
    const CoarseValue& pitch = capture.pixel_pitch_um->value;
    setup.pixel_pitch_um = Interval{pitch.value, pitch.low, pitch.high};
  }
  setup.width_px = size.width_px;
  setup.height_px = size.height_px;
  set_sensor(setup, layers.said(&UserValues::sensor));
  if (capture.exposure_time_s) setup.exposure_time_s = capture.exposure_time_s->value;
  if (capture.iso_speed) setup.iso_speed = capture.iso_speed->value;
  setup.scene_luminance_cd_m2 = layers.said(&UserValues::scene_luminance_cd_m2);
  if (!setup.scene_luminance_cd_m2 && capture.brightness_apex) {
    setup.scene_luminance_cd_m2 = kLuminanceAtZeroBv * std::exp2(capture.brightness_apex->value);
  }
  setup.transmittance = layers.said(&UserValues::transmittance);
  setup.angular_rate_rad_s = layers.said(&UserValues::angular_rate_rad_s);
  setup.subject_speed_m_s = layers.said(&UserValues::subject_speed_m_s);
  setup.flash_duration_s = layers.said(&UserValues::flash_duration_s);
  setup.flash_fired = capture.flash_fired && capture.flash_fired->value;
  setup.acceptable_blur_um = layers.said(&UserValues::acceptable_blur_um);
  setup.acceptable_blur_px = layers.said(&UserValues::acceptable_blur_px);
  // One way of saying it wins as a whole: the command line's millimetres over the settings' pixels.
  if (setup.acceptable_blur_um && setup.acceptable_blur_px) {
    const bool user_said_px = layers.before_file.front().first->acceptable_blur_px.has_value();
    (user_said_px ? setup.acceptable_blur_um : setup.acceptable_blur_px).reset();
  }
  setup.delivered_width_px = layers.said(&UserValues::delivered_width_px).value_or(0);
  return setup;
}

// ---- the aim --------------------------------------------------------------------------------------------------------

double fraction_of(const PictureLength& length, int extent_px) {
  return length.in_pixels ? length.value / extent_px : length.value;
}

DecodedSize displayed_size(DecodedSize size, int orientation) {
  return orientation >= 5 ? DecodedSize{size.height_px, size.width_px} : size;
}

FractionRect displayed_rect(const UserAim& aim, DecodedSize displayed) {
  return {.x = fraction_of(aim.x, displayed.width_px),
          .y = fraction_of(aim.y, displayed.height_px),
          .width = fraction_of(aim.width, displayed.width_px),
          .height = fraction_of(aim.height, displayed.height_px)};
}

// The part of `box` inside the frame; absent where none is. A point on the frame counts.
std::optional<FractionRect> inside_frame(const FractionRect& box) {
  const double left = std::max(box.x, 0.0), right = std::min(box.x + box.width, 1.0);
  const double top = std::max(box.y, 0.0), bottom = std::min(box.y + box.height, 1.0);
  if (!(left <= right) || !(top <= bottom) || left >= 1 || top >= 1) return std::nullopt;
  return FractionRect{.x = left, .y = top, .width = right - left, .height = bottom - top};
}

FocusArea centre_of_frame() {
  constexpr double kStart = (1 - kCentreFraction) / 2;
  return {.box = {.x = kStart, .y = kStart, .width = kCentreFraction, .height = kCentreFraction},
          .kind = FocusAreaKind::centre,
          .source = Source::assumed};
}

std::optional<FocusArea> user_area(const OptionalSourced<UserAim>& aim, DecodedSize size, int orientation) {
  if (!aim || size.width_px <= 0) return std::nullopt;
  const FractionRect displayed = displayed_rect(aim->value, displayed_size(size, orientation));
  return FocusArea{
      .box = unrotated_rect(displayed, orientation), .kind = FocusAreaKind::user, .source = aim->source};
}

// In order: said, recorded (best kind first), the settings' word, the centre.
void choose_aim(Resolved& resolved, const Layers& layers, DecodedSize size, int orientation) {
  std::vector<FocusArea> candidates;
  if (auto area = user_area(Layers::first(layers.before_file, &UserValues::aim), size, orientation)) {
    candidates.push_back(*area);
  }
  std::vector<FocusArea> recorded = resolved.capture.focus_areas;
  std::ranges::stable_sort(recorded, {}, &FocusArea::kind);
  candidates.insert(candidates.end(), recorded.begin(), recorded.end());
  if (auto area = user_area(Layers::first(layers.after_file, &UserValues::aim), size, orientation)) {
    candidates.push_back(*area);
  }
  candidates.push_back(centre_of_frame());

  for (const FocusArea& candidate : candidates) {
    const auto box = inside_frame(candidate.box);
    if (!box) {
      if (candidate.kind == FocusAreaKind::user) {
        resolved.issues.push_back({.stage = Stage::resolve,
                                   .code = "aim-outside-frame",
                                   .message = "The aim that was given lies outside this frame and was not used."});
      }
      continue;
    }
    const GrownBox grown = grow_aim(*box, size);
    resolved.aim = {.box = grown.box, .kind = candidate.kind, .source = candidate.source};
    resolved.aim_grown = grown.grown;
    return;
  }
}

// ---- near side and contact ------------------------------------------------------------------------------------------

void choose_near_side(Resolved& resolved, const Layers& layers) {
  const auto& recorded = resolved.capture.orientation;
  const int orientation = recorded ? recorded->value : 1;
  if (const auto side = layers.said(&UserValues::near_side)) {
    resolved.near_side = unrotated_side(*side, orientation);
  } else if (recorded) {
    resolved.near_side = unrotated_side(NearSide::bottom, orientation);
  } else {
    resolved.issues.push_back(
        {.stage = Stage::resolve,
         .code = "orientation-unknown",
         .message = "The file does not say which way up it was taken; all four sides are tried as the near one. "
                    "--near-side says it."});
  }
}

void choose_contact(Resolved& resolved, const Layers& layers, DecodedSize size, int orientation) {
  const auto row = layers.said(&UserValues::contact_y);
  if (!row || size.width_px <= 0) return;
  const double y = fraction_of(*row, displayed_size(size, orientation).height_px);
  if (y > 1) {
    resolved.issues.push_back({.stage = Stage::resolve,
                               .code = "contact-outside-frame",
                               .message = "The contact row that was given lies outside this frame and was not used."});
    return;
  }
  const FractionRect& box = resolved.aim.box;
  const FramePoint centre = displayed_point({box.x + box.width / 2, box.y + box.height / 2}, orientation);
  resolved.contact = unrotated_point({centre.x, y}, orientation);
}

}  // namespace

// ---- mapping through Orientation ------------------------------------------------------------------------------------

// Exif 2.32, tag 0x0112: 1 as stored; 2 mirrored left-right; 3 turned by 180; 4 mirrored top-bottom; 5 transposed;
// 6 to be turned 90 degrees clockwise for display; 7 transposed about the other diagonal; 8 to be turned 90 degrees
// counter-clockwise.
FramePoint unrotated_point(FramePoint p, int orientation) {
  switch (orientation) {
    case 2: return {1 - p.x, p.y};
    case 3: return {1 - p.x, 1 - p.y};
    case 4: return {p.x, 1 - p.y};
    case 5: return {p.y, p.x};
    case 6: return {p.y, 1 - p.x};
    case 7: return {1 - p.y, 1 - p.x};
    case 8: return {1 - p.y, p.x};
    default: return p;
  }
}

FramePoint displayed_point(FramePoint p, int orientation) {
  // Every orientation but the two quarter turns is its own inverse.
  if (orientation == 6) return unrotated_point(p, 8);
  if (orientation == 8) return unrotated_point(p, 6);
  return unrotated_point(p, orientation);
}

FractionRect unrotated_rect(const FractionRect& displayed, int orientation) {
  const FramePoint a = unrotated_point({displayed.x, displayed.y}, orientation);
  const FramePoint b =
      unrotated_point({displayed.x + displayed.width, displayed.y + displayed.height}, orientation);
  return {.x = std::min(a.x, b.x),
          .y = std::min(a.y, b.y),
          .width = std::abs(a.x - b.x),
          .height = std::abs(a.y - b.y)};
}

NearSide unrotated_side(NearSide displayed, int orientation) {
  FramePoint middle{0.5, 0.5};
  switch (displayed) {
    case NearSide::bottom: middle.y = 1; break;
    case NearSide::top: middle.y = 0; break;
    case NearSide::left: middle.x = 0; break;
    case NearSide::right: middle.x = 1; break;
  }
  const FramePoint stored = unrotated_point(middle, orientation);
  if (stored.y > 0.75) return NearSide::bottom;
  if (stored.y < 0.25) return NearSide::top;
  return stored.x < 0.25 ? NearSide::left : NearSide::right;
}

GrownBox grow_aim(FractionRect box, DecodedSize frame) {
  if (frame.width_px <= 0 || frame.height_px <= 0) return {.box = box};
  bool grown = false;
  const auto grow = [&grown](double& start, double& extent, int frame_px) {
    const double least = std::min(1.0, static_cast<double>(kLeastAimPx) / frame_px);
    if (extent >= least) return;
    start = std::clamp(start + extent / 2 - least / 2, 0.0, 1.0 - least);
    extent = least;
    grown = true;
  };
  grow(box.x, box.width, frame.width_px);
  grow(box.y, box.height, frame.height_px);
  return {.box = box, .grown = grown};
}

Resolved resolve(const Capture& capture, const UserValues& user, const Settings& settings, DecodedSize decoded) {
  const Layers layers = layers_for(capture, user, settings);
  // Without a picture the recorded size has to do.
  DecodedSize size = decoded;
  if (size.width_px <= 0 || size.height_px <= 0) size = {capture.width_px.value_or(0), capture.height_px.value_or(0)};
  if (size.width_px <= 0 || size.height_px <= 0) size = {};

  Resolved resolved;
  resolved.capture = merged_capture(capture, layers, size);
  resolved.setup = optical_setup(resolved.capture, layers, size);
  if (!resolved.setup) {
    resolved.issues.push_back(
        {.stage = Stage::resolve,
         .code = "setup-incomplete",
         .message = fmt::format("{} not known; nothing can be predicted. {}",
                                !resolved.capture.focal_length_mm && !resolved.capture.f_number
                                    ? "Focal length and f-number are"
                                : !resolved.capture.focal_length_mm ? "The focal length is"
                                                                    : "The f-number is",
                                "--focal-length and --f-number say them.")});
  }
  if (layers.body != nullptr && layers.body->baseline_px2) {
    resolved.baseline = {.squared_disc_px2 = *layers.body->baseline_px2, .source = "settings"};
  }
  const int orientation = resolved.capture.orientation ? resolved.capture.orientation->value : 1;
  choose_aim(resolved, layers, size, orientation);
  resolved.aim_may_be_judged = resolved.aim.kind != FocusAreaKind::centre || user.trust_centre ||
                               settings.defaults.trust_centre;
  if (size.width_px > 0) choose_near_side(resolved, layers);
  choose_contact(resolved, layers, size, orientation);
  return resolved;
}

}  // namespace focusfall
