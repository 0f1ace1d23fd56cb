// Exposure: the additive (APEX) system and the amount of light on the sensor.
//
//   2^EV = N^2 / t = L S / K = E S / C,   Av + Tv = Bv + Sv = EV
// as in the definitions of GNU units 2.22: K reflected-light constant, C incident-light constant, Sv = log2(S / 3.125).
#pragma once

namespace focusfall {

// Calibration of reflected-light meters, cd s / (m^2 ISO). ISO 2720 allows 10.6-13.4; 12.5 and 14 are in use and
// differ by .16 stop.
inline constexpr double kReflectedLightConstant = 12.5;
// Incident-light meters, lx s / ISO, flat receptor: 2.5 lx at EV 0 and ISO 100.
inline constexpr double kIncidentLightConstant = 250;
// ISO 100 is Sv 5.
inline constexpr double kSpeedValueConstant = 3.125;

double aperture_value(double f_number);                       // Av = 2 log2 N
double time_value(double exposure_time_s);                    // Tv = -log2 t
double speed_value(double iso_speed);                         // Sv
double brightness_value(double luminance_cd_m2);              // Bv; 0 at 4 cd/m^2 with K = 12.5
double luminance_of_brightness_value_cd_m2(double brightness_apex);

// EV of the setting, log2(N^2 / t), whatever the sensitivity.
double exposure_value(double f_number, double exposure_time_s);
// EV at ISO 100 of the light for which that setting is right: EV - log2(S / 100).
double exposure_value_at_iso_100(double f_number, double exposure_time_s, double iso_speed);
// Luminance and illuminance for which an EV is right at a sensitivity.
double luminance_of_exposure_value_cd_m2(double ev, double iso_speed);
double illuminance_of_exposure_value_lx(double ev, double iso_speed);

// T-number, N / sqrt(transmittance).
double t_number(double f_number, double transmittance);

// q = (pi / 4) tau v cos^4(theta): what a lens keeps of the light, after ISO 12232 (with transmittance .9,
// vignetting factor .98 and 10 degrees off the axis it is .65).
struct LensLoss {
  double transmittance = 0.9;     // tau, 0..1
  double vignetting = 0.98;       // v
  double field_angle_deg = 10;    // theta
};
double lens_factor(const LensLoss& loss);

// Luminous exposure of the sensor, lx s: H = q L t / N^2, N the working f-number.
double focal_plane_exposure_lx_s(double luminance_cd_m2, double working_f_number, double exposure_time_s,
                                 const LensLoss& loss = {});

// ISO 12232: S = 10 / H for a mid-tone, S = 78 / H at saturation (headroom of half a stop over an 18 % grey of 141 %).
inline constexpr double kMidToneExposure = 10;
inline constexpr double kSaturationExposure = 78;
// Standard output sensitivity: that mid-tone is rendered as 461 / 1000 of full scale, code 118, .18 linear after the
// sRGB curve (ISO 12232, from memory).
inline constexpr double kMidToneLevel = 0.181164;

// Linear level in the delivered picture, 1 = clipping, of a surface of this luminance: .18 H S / 10. Not limited to 1.
// A meter with K = 12.5 aims at H = 8.145 / S, .30 stop below a level of .18.
double picture_level(double focal_plane_exposure_lx_s, double iso_speed);
// The inverse: the luminous exposure that gives a level.
double exposure_of_level_lx_s(double level, double iso_speed);
// Level of the raw signal, 1 = saturation at speed S: H S / 78.
double raw_level(double focal_plane_exposure_lx_s, double iso_speed);

}  // namespace focusfall
