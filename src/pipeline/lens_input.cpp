#include "src/pipeline/lens_input.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <tuple>

#include "src/pipeline/clock.h"

namespace focusfall {
namespace {

constexpr double kNormal95 = 1.959964;        // half width of a 95 % interval in standard deviations
constexpr double kCentreHalfWidth = 0.1;      // of the frame: an aim whose middle is so near the centre (judgement)

bool has_motion(const Verdict& verdict) {
  return std::ranges::any_of(verdict.causes, [](Cause cause) {
    return cause == Cause::motion || cause == Cause::subject_motion || cause == Cause::camera_shake;
  });
}

// Why a frame does not count, the most basic reason first.
std::optional<LeftOut> reason(const FrameRecord& record) {
  if (!record.done || !record.measurement || !record.verdict) return LeftOut::not_done;
  const Capture& capture = *record.capture;
  if (capture.focus_mode && capture.focus_mode->value == FocusMode::manual) return LeftOut::manual_focus;
  if (has_motion(*record.verdict)) return LeftOut::motion;
  if (!record.measurement->aim_blur.estimate && record.verdict->focus == FocusVerdict::no_evidence)
    return LeftOut::no_evidence;
  const auto& plane = record.measurement->plane;
  if (!plane) return LeftOut::no_plane;
  if (plane->contact == Contact::none || !plane->at_contact_px) return LeftOut::aim_not_on_surface;
  if (!capture.focal_length_mm || !capture.f_number || !record.verdict->defocus_um || !record.prediction ||
      !record.prediction->acceptable_blur_um)
    return LeftOut::no_optics;
  return std::nullopt;
}

std::string named(const OptionalSourced<std::string>& model, const OptionalSourced<std::string>& serial) {
  if (!model) return serial ? serial->value : std::string();
  return serial ? fmt::format("{} ({})", model->value, serial->value) : model->value;
}

FocusAreaPlace place_of(const FrameRecord& record) {
  if (!record.aim_origin || record.aim_origin->kind == FocusAreaKind::centre) return FocusAreaPlace::unknown;
  const FractionBox& box = record.measurement->aim.box;
  const double x = std::abs(box.x + box.width / 2 - 0.5), y = std::abs(box.y + box.height / 2 - 0.5);
  return std::max(x, y) <= kCentreHalfWidth ? FocusAreaPlace::centre : FocusAreaPlace::off_centre;
}

ApproachSide approach_of(const std::string& path, std::span<const ApproachRule> rules) {
  ApproachSide side = ApproachSide::unknown;
  for (const ApproachRule& rule : rules) {
    const bool under = path.starts_with(rule.path) &&
                       (rule.path.empty() || rule.path.ends_with('/') || path.size() == rule.path.size() ||
                        path[rule.path.size()] == '/');
    if (under) side = rule.side;
  }
  return side;
}

LensReading reading_of(const FrameRecord& record) {
  const Capture& capture = *record.capture;
  const Interval& um = *record.verdict->defocus_um;
  LensReading reading;
  reading.lens = lens_name(capture);
  reading.body = body_name(capture);
  reading.focal_length_mm = capture.focal_length_mm->value;
  reading.f_number = capture.f_number->value;
  if (capture.focus_distance && !capture.focus_distance->value.stale)
    reading.focus_distance_m = capture.focus_distance->value.value_m;
  reading.area = place_of(record);
  if (capture.focus_mode)
    reading.focus_mode = capture.focus_mode->value == FocusMode::single ? "single" : "continuous";
  if (capture.taken_at) reading.taken_at_s = seconds_of_time(capture.taken_at->value);
  reading.on_surface = record.measurement->plane->contact == Contact::aim;
  reading.defocus_um = um.value;
  reading.sigma_um = (um.high - um.low) / (2 * kNormal95);
  reading.limit_um = *record.prediction->acceptable_blur_um *
                     record.prediction->working_f_number.value_or(capture.f_number->value);
  return reading;
}

// What a second photograph cannot repeat to the last digit.
auto fingerprint(const FrameRecord& record) {
  const PlaneReading& plane = *record.measurement->plane;
  return std::tuple(body_name(*record.capture), plane.at_contact_px->value, plane.x_gradient_px, plane.y_gradient_px,
                    record.measurement->aim_blur.edges);
}

}  // namespace

std::string lens_name(const Capture& capture) { return named(capture.lens, capture.lens_serial); }

std::string body_name(const Capture& capture) { return named(capture.camera, capture.body_serial); }

tl::expected<ApproachRule, std::string> parse_approach(const std::string& text) {
  const auto equals = text.find('=');
  const std::string side = text.substr(0, equals);
  ApproachRule rule;
  if (equals != std::string::npos) rule.path = text.substr(equals + 1);
  if (side == "near" || side == "far") {
    rule.side = side == "near" ? ApproachSide::near : ApproachSide::far;
    return rule;
  }
  return tl::make_unexpected(
      fmt::format("'{}' is no side; known are near, far, near=FOLDER and far=FOLDER", text));
}

LensInput lens_input(std::span<const FrameRecord> records, std::span<const ApproachRule> approach) {
  LensInput input;
  std::map<decltype(fingerprint(records.front())), std::size_t> seen;
  for (std::size_t i = 0; i < records.size(); ++i) {
    std::optional<LeftOut> why = reason(records[i]);
    if (!why && !seen.emplace(fingerprint(records[i]), i).second) why = LeftOut::copy;
    input.left_out.push_back(why);
    if (why) continue;
    LensReading reading = reading_of(records[i]);
    reading.frame = i;
    reading.approach = approach_of(records[i].path, approach);
    input.readings.push_back(std::move(reading));
  }
  return input;
}

}  // namespace focusfall
