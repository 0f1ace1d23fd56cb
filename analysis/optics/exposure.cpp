#include "analysis/optics/exposure.h"

#include <cassert>
#include <cmath>
#include <numbers>

namespace focusfall {

double aperture_value(double f_number) { return 2 * std::log2(f_number); }

double time_value(double exposure_time_s) { return -std::log2(exposure_time_s); }

double speed_value(double iso_speed) { return std::log2(iso_speed / kSpeedValueConstant); }

double brightness_value(double luminance_cd_m2) {
  // From Av + Tv = Bv + Sv and N^2 / t = L S / K: 2^Bv = L S / K / 2^Sv, with Sv = log2(S / 3.125).
  return std::log2(luminance_cd_m2 * kSpeedValueConstant / kReflectedLightConstant);
}

double luminance_of_brightness_value_cd_m2(double brightness_apex) {
  return std::exp2(brightness_apex) * kReflectedLightConstant / kSpeedValueConstant;
}

double exposure_value(double f_number, double exposure_time_s) {
  return aperture_value(f_number) + time_value(exposure_time_s);
}

double exposure_value_at_iso_100(double f_number, double exposure_time_s, double iso_speed) {
  return exposure_value(f_number, exposure_time_s) - std::log2(iso_speed / 100);
}

double luminance_of_exposure_value_cd_m2(double ev, double iso_speed) {
  return std::exp2(ev) * kReflectedLightConstant / iso_speed;
}

double illuminance_of_exposure_value_lx(double ev, double iso_speed) {
  return std::exp2(ev) * kIncidentLightConstant / iso_speed;
}

double t_number(double f_number, double transmittance) {
  assert(transmittance > 0 && transmittance <= 1);
  return f_number / std::sqrt(transmittance);
}

double lens_factor(const LensLoss& loss) {
  const double cosine = std::cos(loss.field_angle_deg * std::numbers::pi / 180);
  return std::numbers::pi / 4 * loss.transmittance * loss.vignetting * cosine * cosine * cosine * cosine;
}

double focal_plane_exposure_lx_s(double luminance_cd_m2, double working_f_number, double exposure_time_s,
                                 const LensLoss& loss) {
  return lens_factor(loss) * luminance_cd_m2 * exposure_time_s / (working_f_number * working_f_number);
}

double picture_level(double focal_plane_exposure_lx_s, double iso_speed) {
  return kMidToneLevel * focal_plane_exposure_lx_s * iso_speed / kMidToneExposure;
}

double exposure_of_level_lx_s(double level, double iso_speed) {
  return level / kMidToneLevel * kMidToneExposure / iso_speed;
}

double raw_level(double focal_plane_exposure_lx_s, double iso_speed) {
  return focal_plane_exposure_lx_s * iso_speed / kSaturationExposure;
}

}  // namespace focusfall
