#include "src/pipeline/frame_worker.h"

#include <exception>
#include <fmt/core.h>
#include <utility>

#include "analysis/compare/compare.h"
#include "analysis/measure/forward_model.h"
#include "analysis/measure/measure_frame.h"
#include "analysis/optics/predict.h"
#include "metadata/read_capture.h"
#include "src/decode/decoder.h"
#include "src/decode/mosaic.h"
#include "src/pipeline/picture_sink.h"
#include "src/pipeline/resolve.h"

namespace focusfall {
namespace {

FractionBox box_of(const FractionRect& rect) { return {rect.x, rect.y, rect.width, rect.height}; }

// Fields that a reader finds out of the picture, not out of the capture data.
void note_format(const PictureFormat& format, FrameRecord& record) {
  Capture& capture = *record.capture;
  capture.width_px = format.width_px;
  capture.height_px = format.height_px;
  if (format.orientation) capture.orientation = {*format.orientation, Source::exif};
  if (format.measured_from != MeasuredFrom::picture) record.measured_from = measured_from_name(format.measured_from);
  for (const DecodeNote& note : format.notes) record.issues.push_back({Stage::decode, note.code, note.message});
}

// The forward model of the last frame: the frames of a burst ask for the same one, which costs as much as decoding a
// third of a frame.
class ForwardMemory {
 public:
  const std::optional<ForwardReading>& reading(const SystemResponse& response) {
    if (response_ != response) {
      reading_ = forward_reading(response);
      response_ = response;
    }
    return reading_;
  }

 private:
  std::optional<SystemResponse> response_;
  std::optional<ForwardReading> reading_;
};

// What an aim exactly in focus would report.
void predict_reading(const OpticalSetup& setup, ForwardMemory& forward, Prediction& prediction) {
  const auto response = system_response(setup, 0);
  if (!response) return;
  if (const auto& reading = forward.reading(*response)) {
    const double baseline = prediction.baseline_px2 ? prediction.baseline_px2->value : 0;
    prediction.blur_disc_px = blur_disc_px(reading->squared_disc_px2 + baseline);
    prediction.edge_rise_px = disc_edge_rise_px(*prediction.blur_disc_px);
  }
}

// A brightness value says what the mid-tone should be only where the camera did not choose the exposure by it and no
// flash added light.
bool brightness_predicts(const Capture& capture) {
  return capture.brightness_apex && capture.exposure_mode && capture.exposure_mode->value == ExposureMode::manual &&
         capture.flash_fired && !capture.flash_fired->value;
}

class MosaicCounter final : public MosaicSink {
 public:
  void set_aim(const FractionBox& aim) { options_.aim = aim; }
  void start(const MosaicFormat& format) override { counts_.start(format, options_); }
  void take(const MosaicStrip& strip) override { counts_.take(strip); }
  const MosaicAccumulator& counts() const { return counts_; }

 private:
  MosaicClippingOptions options_;
  MosaicAccumulator counts_;
};

}  // namespace

struct FrameWorker::State {
  UserValues user;
  Settings settings;
  FileBuffer file;
  DecodeWorkspace decode;
  PictureSink sink;
  MosaicCounter mosaic;
  FrameMeasurer measurer;
  ForwardMemory forward;

  bool read(std::span<const std::byte> bytes, FrameRecord& record, PictureFormat& format);
  Resolved resolve_frame(FrameRecord& record, const PictureFormat& format);
  bool decode_frame(std::span<const std::byte> bytes, FrameRecord& record);
  void measure(const Resolved& resolved, FrameRecord& record);
  void count_mosaic(std::span<const std::byte> raw, FrameRecord& record);
  void compare_frame(const Resolved& resolved, FrameRecord& record);
  void run(std::span<const std::byte> bytes, FrameRecord& record);
};

FrameWorker::FrameWorker(UserValues user, Settings settings) : state_(std::make_unique<State>()) {
  state_->user = std::move(user);
  state_->settings = std::move(settings);
}
FrameWorker::~FrameWorker() = default;
FrameWorker::FrameWorker(FrameWorker&&) noexcept = default;
FrameWorker& FrameWorker::operator=(FrameWorker&&) noexcept = default;

bool FrameWorker::State::read(std::span<const std::byte> bytes, FrameRecord& record, PictureFormat& format) {
  const auto found = picture_format(bytes, decode);
  if (!found) {
    record.issues.push_back({Stage::decode, found.error().code, found.error().message});
    return false;
  }
  format = *found;
  CaptureReading reading = read_capture(bytes, {format.width_px, format.height_px});
  record.capture = std::move(reading.capture);
  for (CaptureRemark& remark : reading.remarks) {
    record.issues.push_back({Stage::read, std::move(remark.code), std::move(remark.message)});
  }
  note_format(format, record);
  return true;
}

Resolved FrameWorker::State::resolve_frame(FrameRecord& record, const PictureFormat& format) {
  Resolved resolved = resolve(*record.capture, user, settings, {format.width_px, format.height_px});
  record.capture = resolved.capture;
  record.setup = resolved.setup;
  record.aim_origin = resolved.aim;
  record.issues.insert(record.issues.end(), resolved.issues.begin(), resolved.issues.end());
  if (!resolved.setup) return resolved;

  Prediction prediction = predict(*resolved.setup);
  prediction.baseline_px2 = resolved.baseline.squared_disc_px2;
  prediction.baseline_source = resolved.baseline.source;
  predict_reading(*resolved.setup, forward, prediction);
  record.prediction = std::move(prediction);
  return resolved;
}

bool FrameWorker::State::decode_frame(std::span<const std::byte> bytes, FrameRecord& record) {
  sink.set_aim(box_of(record.aim_origin->box));
  const auto decoded = decode_picture(bytes, sink, decode);
  if (decoded) return true;
  record.issues.push_back({Stage::decode, decoded.error().code, decoded.error().message});
  return false;
}

void FrameWorker::State::measure(const Resolved& resolved, FrameRecord& record) {
  MeasureRequest request;
  request.aim.box = box_of(resolved.aim.box);
  request.aim.grown = resolved.aim_grown;
  request.whole_frame = user.level == MeasureLevel::full;
  request.near_side_known = resolved.near_side.has_value();
  if (resolved.near_side) request.near_side = *resolved.near_side;
  if (resolved.contact) {
    request.contact_x = resolved.contact->x;
    request.contact_y = resolved.contact->y;
  }
  request.keep_tiles = user.tiles;
  Measurement measurement = measurer.measure(sink.luma(), request);
  measurement.clipping = sink.clipping();
  measurement.tone = sink.tone();
  measurement.levels = sink.levels();
  measurement.highlights = sink.highlights();
  if (measurement.tiles) measurement.tiles->clipped = sink.clipped_tiles(measurement.tiles->tile_px);
  record.measurement = std::move(measurement);
}

// Clipping and tone as the sensor saw them take the place of those of the developed picture.
void FrameWorker::State::count_mosaic(std::span<const std::byte> raw, FrameRecord& record) {
  mosaic.set_aim(box_of(record.aim_origin->box));
  if (const auto decoded = decode_mosaic(raw, mosaic); !decoded) {
    record.issues.push_back({Stage::decode, decoded.error().code, decoded.error().message});
    return;
  }
  Clipping clipping = mosaic.counts().clipping();
  clipping.headroom_ev = mosaic.counts().headroom_ev(*record.measurement->clipping);
  record.measurement->clipping = clipping;
  record.measurement->tone = mosaic.counts().tone();
}

void FrameWorker::State::compare_frame(const Resolved& resolved, FrameRecord& record) {
  CompareOptions options;
  options.aim_assumed = !resolved.aim_may_be_judged;
  options.trust_centre = user.trust_centre;
  options.brightness_predicts = brightness_predicts(*record.capture);
  // Without focal length and f-number there is no prediction; the baseline's prior still belongs to the reading.
  Prediction prediction = record.prediction.value_or(Prediction{});
  if (!record.prediction) {
    prediction.baseline_px2 = resolved.baseline.squared_disc_px2;
    prediction.baseline_source = resolved.baseline.source;
  }
  record.verdict = compare(record.setup, prediction, *record.measurement, options);
}

void FrameWorker::State::run(std::span<const std::byte> bytes, FrameRecord& record) {
  PictureFormat format;
  if (!read(bytes, record, format)) return;
  const Resolved resolved = resolve_frame(record, format);
  if (!decode_frame(bytes, record)) return;
  measure(resolved, record);
  if (is_camera_raw(bytes)) count_mosaic(bytes, record);
  compare_frame(resolved, record);
  record.done = true;
}

FrameRecord unread_frame(const std::string& path, const ReadError& error) {
  FrameRecord record;
  record.path = path;
  record.issues.push_back({Stage::read, error.code, error.message});
  return record;
}

FrameRecord FrameWorker::process(const std::string& path) {
  if (auto read = read_file(path, state_->file); !read) return unread_frame(path, read.error());
  return process(path, state_->file.bytes());
}

FrameRecord FrameWorker::process(const std::string& path, std::span<const std::byte> file) {
  FrameRecord record;
  record.path = path;
  try {
    state_->run(file, record);
  } catch (const std::exception& error) {
    // A library's exception, or memory that ran out on one large picture: this frame is lost, the run goes on.
    record.issues.push_back({Stage::measure, "frame-failed", fmt::format("could not be measured ({})", error.what())});
    record.done = false;
  }
  return record;
}

}  // namespace focusfall
