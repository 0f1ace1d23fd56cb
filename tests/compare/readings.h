// Measurements written by hand: a blur in px with its standard error, a plane with its signed blur at the contact.
#pragma once

#include <cmath>

#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"

namespace focusfall {

// Standard error of c of a good region: 6 % and .2 px (measured on rendered tiles).
inline double usual_sigma_px2(double disc_px) {
  const double sigma_px = std::hypot(0.06 * disc_px, 0.2);
  return std::hypot(2 * disc_px * sigma_px, 0.4);
}

inline BlurEstimate estimate(double squared_disc_px2, double sigma_px2) {
  BlurEstimate result;
  result.squared_disc_px2 = squared_disc_px2;
  result.squared_disc_low_px2 = squared_disc_px2 - 1.96 * sigma_px2;
  result.squared_disc_high_px2 = squared_disc_px2 + 1.96 * sigma_px2;
  return result;
}

// A reading of a true disc through a camera whose processing adds `baseline_px2`.
inline BlurReading blur(double disc_px, double baseline_px2 = 0) {
  return {estimate(disc_px * disc_px + baseline_px2, usual_sigma_px2(disc_px)), 60};
}

// A surface whose signed blur at the contact is l, with a line of best focus in the frame.
inline PlaneReading plane_with(double at_contact_px, double sigma_px, Contact contact = Contact::aim) {
  PlaneReading plane;
  plane.y_gradient_px = 40;
  plane.gradient_sigma_px = 0.5;
  plane.contact = contact;
  plane.contact_x = 0.5;
  plane.contact_y = 0.6;
  plane.offset_px = at_contact_px - plane.y_gradient_px * plane.contact_y;
  plane.at_contact_px = Interval{at_contact_px, at_contact_px - 1.96 * sigma_px, at_contact_px + 1.96 * sigma_px};
  plane.at_contact_sigma_px = sigma_px;
  plane.inlier_fraction = 0.9;
  return plane;
}

inline MotionReading movement(double length_px, double angle_deg, double isotropic_px2 = 0, double sigma_px2 = 1) {
  MotionReading reading;
  const auto length = [](double m) { return std::sqrt(std::max(m, 0.0) / (1.05 * 16 / 12)); };
  reading.length_px = length_px;
  reading.angle_deg = angle_deg;
  reading.anisotropy_px2 = 1.05 * 16 / 12 * length_px * length_px;
  reading.anisotropy_sigma_px2 = sigma_px2;
  reading.length_low_px = length(reading.anisotropy_px2 - 1.96 * sigma_px2);
  reading.length_high_px = length(reading.anisotropy_px2 + 1.96 * sigma_px2);
  reading.isotropic_squared_disc_px2 = isotropic_px2;
  return reading;
}

// Limit 3 px, no diffraction to speak of, a baseline known to half a square pixel.
inline Prediction known_camera() {
  Prediction prediction;
  prediction.acceptable_blur_px = 3;
  prediction.baseline_px2 = Interval{0, -1, 1};
  prediction.baseline_source = "learned";
  prediction.blur_disc_px = 0.5;
  return prediction;
}

}  // namespace focusfall
