#include "src/pipeline/exposure_input.h"

#include <fmt/format.h>

#include <algorithm>
#include <cctype>

#include "src/pipeline/clock.h"

namespace focusfall {
namespace {

template <class T>
std::optional<T> plain(const OptionalSourced<T>& sourced) {
  return sourced ? std::optional<T>(sourced->value) : std::nullopt;
}

std::string text_or_nothing(const OptionalSourced<std::string>& sourced) { return sourced ? sourced->value : ""; }

// Body, size of the picture and what the file says about how it was finished: frames that differ in one of them are
// not compared.
std::string group_of(const Capture& c) {
  const std::string body = c.body_serial ? c.body_serial->value : text_or_nothing(c.camera);
  const int sharpening = c.sharpening.value_or(-1);
  return fmt::format("{}\n{}\n{}x{}\n{}", body, text_or_nothing(c.software), c.width_px.value_or(0),
                     c.height_px.value_or(0), sharpening);
}

std::string lower(std::string text) {
  std::ranges::transform(text, text.begin(), [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
  return text;
}

}  // namespace

ExposureFrame exposure_frame(const FrameRecord& record) {
  ExposureFrame frame;
  if (!record.capture || !record.done) return frame;
  const Capture& c = *record.capture;
  frame.group = group_of(c);
  if (c.taken_at) frame.taken_at_s = seconds_of_time(c.taken_at->value);
  frame.f_number = plain(c.f_number);
  frame.exposure_time_s = plain(c.exposure_time_s);
  frame.iso_speed = plain(c.iso_speed);
  frame.exposure_bias_ev = plain(c.exposure_bias_ev);
  frame.brightness_apex = plain(c.brightness_apex);
  if (c.exposure_mode) frame.manual_exposure = c.exposure_mode->value == ExposureMode::manual;
  frame.flash_fired = plain(c.flash_fired);
  if (record.setup) frame.transmittance = record.setup->transmittance;
  // A record out of a file has its prediction, not its set-up.
  if (record.prediction && record.prediction->working_f_number && frame.f_number) {
    frame.working_ratio = *record.prediction->working_f_number / *frame.f_number;
  }
  frame.aim_named = record.aim_origin && record.aim_origin->kind != FocusAreaKind::centre;
  if (record.measurement) {
    frame.clipping = record.measurement->clipping;
    frame.tone = record.measurement->tone;
    frame.levels = record.measurement->levels;
    frame.highlights = record.measurement->highlights;
  }
  return frame;
}

bool may_be_edited(const Capture& capture) {
  const std::string software = lower(text_or_nothing(capture.software));
  const std::string camera = lower(text_or_nothing(capture.camera));
  std::string word;
  for (const char c : software + " ") {
    if (std::isalpha(static_cast<unsigned char>(c))) {
      word += c;
      continue;
    }
    const bool of_firmware = word.size() <= 3 || word == "version" || word == "firmware";
    if (!of_firmware && camera.find(word) == std::string::npos) return true;
    word.clear();
  }
  return false;
}

}  // namespace focusfall
