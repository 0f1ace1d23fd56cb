// What the thin-lens and f-number model says about one shot, before a pixel is looked at.
#pragma once

#include <optional>

#include "analysis/conventions.h"

namespace focusfall {

enum class DistanceOrigin { sensor, lens };

// What counts as too much blur where the user has not said it: two pixels of the delivered picture (`check`, `cull`,
// `lens`), or the circle of confusion, diagonal / 1500 (`predict`, and wherever there is no picture).
enum class AcceptableBlurRule { delivered_picture, circle_of_confusion };

// What the model is told. Complete enough to predict: focal length and f-number are there; what else is known
// decides how far the prediction reaches, field by field.
struct OpticalSetup {
  double focal_length_mm = 0;                       // > 0, teleconverter included
  double f_number = 0;                              // >= 0.7, as marked, teleconverter included
  double pupil_magnification = 1;                   // exit pupil / entrance pupil; 1 = symmetric lens (assumed)
  std::optional<Interval> focus_distance_m;         // may be infinite
  DistanceOrigin distance_from = DistanceOrigin::sensor;
  std::optional<Interval> pixel_pitch_um;           // of the delivered pixels
  int width_px = 0;                                 // delivered size; 0 where no picture is at hand (`predict`)
  int height_px = 0;
  std::optional<double> sensor_width_mm;            // else derived from pitch and size
  std::optional<double> sensor_height_mm;
  std::optional<double> exposure_time_s;
  std::optional<double> iso_speed;
  std::optional<double> scene_luminance_cd_m2;      // from BrightnessValue or the user
  std::optional<double> transmittance;              // of the lens, 0..1; T = N / sqrt(transmittance)
  std::optional<double> angular_rate_rad_s;         // of a turning camera
  std::optional<double> subject_speed_m_s;          // across the axis, at the focus distance
  std::optional<double> flash_duration_s;           // where flash lit the subject
  bool flash_fired = false;
  double wavelength_um = 0.55;                      // green, the peak of the eye's daylight response
  std::optional<double> acceptable_blur_um;         // as the user gave it
  std::optional<double> acceptable_blur_px;
  AcceptableBlurRule acceptable_blur_rule = AcceptableBlurRule::delivered_picture;
  int delivered_width_px = 0;                       // 0: the frame's width, at most 4000 px
};

// The `prediction` object of the JSON record, in its order. Absent = what it needs is not known.
struct Prediction {
  DistanceOrigin distance_from = DistanceOrigin::sensor;
  std::optional<double> acceptable_blur_px;
  std::optional<double> acceptable_blur_um;
  std::optional<double> circle_of_confusion_um;     // diagonal / 1500
  std::optional<double> image_distance_mm;
  std::optional<double> entrance_pupil_mm;
  std::optional<double> magnification;
  std::optional<double> working_f_number;
  std::optional<double> hyperfocal_m;
  std::optional<double> near_limit_m;
  std::optional<double> far_limit_m;                // absent when infinite
  bool far_limit_infinite = false;
  std::optional<Interval> near_limit_bounds_m;      // not in the record: the limits with the focus distance at the
  std::optional<Interval> far_limit_bounds_m;       //   ends of its interval; high, or all, may be infinite
  std::optional<double> depth_of_focus_um;          // total: both sides
  std::optional<double> airy_diameter_px;
  std::optional<double> motion_blur_px;
  std::optional<Interval> baseline_px2;             // what camera processing adds to S
  const char* baseline_source = nullptr;            // "prior" | "settings" | "learned"
  std::optional<double> blur_disc_px;               // what an aim exactly in focus would report
  std::optional<double> edge_rise_px;
  std::optional<double> exposure_value;             // EV at ISO 100 is exposure_value - log2(ISO / 100)
  std::optional<double> mid_tone_level;             // linear 0..1
};

}  // namespace focusfall
