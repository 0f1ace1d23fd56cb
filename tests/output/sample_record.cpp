#include "tests/output/sample_record.h"

namespace focusfall {
namespace {

Capture sample_capture() {
  Capture c;
  c.camera = {"Invented One", Source::exif};
  c.lens = {"Invented 400 mm f/2.8", Source::maker_note};
  c.body_serial = {"0042", Source::exif};
  c.lens_serial = {"0007", Source::xmp};
  c.taken_at = {"2026-06-14T15:02:11.25+02:00", Source::exif};
  c.sequence = {17L, Source::maker_note};
  c.focal_length_mm = {400.0, Source::exif};
  c.f_number = {2.8, Source::user};
  c.exposure_time_s = {1.0 / 2000, Source::exif};
  c.iso_speed = {400.0, Source::exif};
  c.exposure_bias_ev = {-1.0 / 3, Source::exif};
  c.brightness_apex = {8.25, Source::exif};
  c.exposure_mode = {ExposureMode::manual, Source::exif};
  c.focus_distance = {{.value_m = 30.2, .low_m = 29.3, .high_m = 31.1, .stale = true}, Source::maker_note};
  c.pixel_pitch_um = {{.value = 6, .low = 5.95, .high = 6.05}, Source::derived};
  c.width_px = 6000;
  c.height_px = 4000;
  c.orientation = {1, Source::exif};
  c.flash_fired = {false, Source::exif};
  c.stabiliser_on = {true, Source::maker_note};
  c.focus_mode = {FocusMode::continuous, Source::maker_note};
  return c;
}

Prediction sample_prediction() {
  Prediction p;
  p.acceptable_blur_px = 3;
  p.acceptable_blur_um = 18;
  p.circle_of_confusion_um = 28.84;
  p.image_distance_mm = 405.5;
  p.entrance_pupil_mm = 142.9;
  p.magnification = 0.0137;
  p.working_f_number = 2.838;
  p.hyperfocal_m = 1982;
  p.near_limit_m = 29.9;
  p.far_limit_m = 30.5;
  p.depth_of_focus_um = 102;
  p.airy_diameter_px = 0.63;
  p.motion_blur_px = 1.5;
  p.baseline_px2 = Interval{-3, -8.88, 2.88};
  p.baseline_source = "prior";
  p.blur_disc_px = 1.4;
  p.edge_rise_px = 1.2;
  p.exposure_value = 13.95;
  p.mid_tone_level = 0.18;
  return p;
}

BlurEstimate estimate(double value, double low, double high) {
  BlurEstimate e;
  e.squared_disc_px2 = value;
  e.squared_disc_low_px2 = low;
  e.squared_disc_high_px2 = high;
  e.edge_rise_px = 6.5;
  e.mtf50_cycles_per_px = 0.08;
  return e;
}

Measurement sample_measurement() {
  Measurement m;
  m.aim = {.box = {0.45, 0.5, 0.1, 0.15}, .grown = true, .mixed = true};
  m.aim_blur = {.estimate = estimate(64, 58, 70), .edges = 34};
  m.best = SharpestRegion{.box = {0.2, 0.7, 0.1, 0.12}, .reading = {.estimate = estimate(1, 0.2, 1.9), .edges = 80}};
  m.motion = MotionReading{.length_px = 4, .length_low_px = 3, .length_high_px = 5, .angle_deg = 30};
  m.background_motion = MotionReading{.length_px = 24, .length_low_px = 20, .length_high_px = 27, .angle_deg = 0};
  PlaneReading plane;
  plane.x_gradient_px = 4;
  plane.y_gradient_px = 80;
  plane.offset_px = -70;
  plane.contact = Contact::foot;
  plane.contact_x = 0.5;
  plane.contact_y = 0.76;
  plane.at_contact_px = Interval{-7.2, -8, -6.4};
  plane.inlier_fraction = 0.8;
  m.plane = plane;
  m.clipping = Clipping{.red = 0.02, .green = 0.01, .blue = 0.01, .any = 0.02, .two_or_more = 0.01, .aim_any = 0.001,
                        .aim_two_or_more = 0.0005, .largest_patch = 0.006, .kind = ClippedKind::area,
                        .measured_on = ClippedOn::mosaic, .shadows_any = 0.003};
  m.tone = Tone{.mean_linear = 0.2, .median_linear = 0.17, .aim_median_linear = 0.19, .p99_linear = 0.9};
  return m;
}

}  // namespace

FrameRecord sample_record() {
  FrameRecord record;
  record.path = "shoot/boat 27.jpg";
  record.capture = sample_capture();
  record.aim_origin = FocusArea{.box = {0.47, 0.55, 0.05, 0.05}, .kind = FocusAreaKind::focus_area, .source = Source::maker_note};
  record.prediction = sample_prediction();
  record.measurement = sample_measurement();
  Verdict verdict;
  verdict.focus = FocusVerdict::front;
  verdict.causes = {Cause::defocus, Cause::subject_motion};
  verdict.panned = true;
  verdict.defocus_um = Interval{-122, -136, -109};
  verdict.defocus_limits = Interval{-2.4, -2.67, -2.13};
  verdict.focus_offset_m = Interval{-0.7, -1.5, 0.1};
  verdict.exposure = ExposureVerdict::over;
  verdict.exposure_error_ev = Interval{0.7, 0.5, 0.9};
  verdict.clipped = true;
  verdict.pull_back_ev = 0.6;
  verdict.summary = "Focus fell 0.7 m in front of the subject, 2.4 limits of the depth of field.";
  record.verdict = verdict;
  record.issues = {{.stage = Stage::read, .code = "metadata-value-absurd", .message = "A value was left out."}};
  record.done = true;
  return record;
}

}  // namespace focusfall
