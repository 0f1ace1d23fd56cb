// Everything a person may say about a shot, as numbers in the units of the names. The command line binds to this
// struct, so that help and code cannot disagree. Absent = not said: the file, then the settings, are asked.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <tl/expected.hpp>

#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"

namespace focusfall {

// A place or extent in the picture: a fraction 0..1 of its width or height, or pixels.
struct PictureLength {
  double value = 0;
  bool in_pixels = false;
};

// The aim in the picture *as displayed*: top-left corner, width and height.
struct UserAim {
  PictureLength x, y, width, height;
};

struct SensorSize {
  double width_mm = 0;    // along the long or short side as the picture is stored
  double height_mm = 0;
};

// How much of a frame is measured: the aim at full size and a coarse map, or everything.
enum class MeasureLevel { aim_only, full };

struct UserValues {
  // The shot. All > 0.
  std::optional<double> focal_length_mm;        // of the lens as marked, without the teleconverter
  std::optional<double> f_number;               // 0.7 or more, as marked, without the teleconverter
  std::optional<double> focus_distance_m;       // may be infinite
  std::optional<DistanceOrigin> distance_from;  // where that distance and every distance printed starts; sensor
  std::optional<double> teleconverter;          // factor 1..4 that the file does not know of
  std::optional<SensorSize> sensor;
  std::optional<double> pixel_pitch_um;         // of the delivered pixels
  std::optional<double> exposure_time_s;
  std::optional<double> iso_speed;
  std::optional<double> scene_luminance_cd_m2;
  std::optional<double> transmittance;          // of the lens, 0..1
  std::optional<double> pupil_magnification;    // exit / entrance pupil
  std::optional<double> wavelength_um;          // 0.55

  // Motion and flash.
  std::optional<double> angular_rate_rad_s;     // of the camera
  std::optional<double> subject_speed_m_s;      // across the axis
  std::optional<double> flash_duration_s;

  // Where to look, in the picture as displayed.
  std::optional<UserAim> aim;
  std::optional<NearSide> near_side;            // the side of the picture at which the ground is nearer
  std::optional<PictureLength> contact_y;       // the row at which the subject touches the ground
  bool trust_centre = false;                    // judge the centre of the frame as if it were the aim

  // How much blur is too much. At most one of the first two.
  std::optional<double> acceptable_blur_um;
  std::optional<double> acceptable_blur_px;
  std::optional<int> delivered_width_px;        // the frame's width, at most 4000 px

  // How the measuring is done.
  MeasureLevel level = MeasureLevel::full;
  bool tiles = false;                           // keep the tile map in the record
};

// Why a text on the command line or in the settings is not a quantity: one sentence.
template <class T>
using Parsed = tl::expected<T, std::string>;

// Readers of quantities with units. A bare number has the unit named first.
Parsed<double> parse_focal_length_mm(const std::string& text);   // mm, cm, m, in
Parsed<double> parse_distance_m(const std::string& text);        // m, mm, cm, km, ft, in; "inf", "infinity"
Parsed<double> parse_f_number(const std::string& text);          // 2.8, f/2.8, F2.8
Parsed<double> parse_time_s(const std::string& text);            // s, ms, us; 1/2000
Parsed<double> parse_iso_speed(const std::string& text);         // 800, ISO800
Parsed<double> parse_pixel_pitch_um(const std::string& text);    // um (or µm), mm, nm
Parsed<SensorSize> parse_sensor_mm(const std::string& text);     // 36x24mm, 36x24
Parsed<double> parse_speed_m_s(const std::string& text);         // m/s, km/h, mph, kn
Parsed<double> parse_angular_rate_rad_s(const std::string& text);  // deg/s, rad/s
Parsed<double> parse_factor(const std::string& text);            // 1.4, 1.4x, 2
Parsed<PictureLength> parse_picture_length(const std::string& text);  // 0.25, 25%, 640px
Parsed<UserAim> parse_aim(const std::string& text);              // x,y,width,height, each as above
Parsed<NearSide> parse_near_side(const std::string& text);       // bottom, top, left, right
Parsed<DistanceOrigin> parse_distance_origin(const std::string& text);  // sensor, lens

// Sets the one field of `values` that "0.02mm", "20um" or "3px" names.
tl::expected<void, std::string> set_acceptable_blur(UserValues& values, const std::string& text);

// One thing a person may say: --focal-length on the command line, focal_length in the settings.
struct ValueOption {
  enum class Group { shot, picture, blur, motion, place };
  std::string_view name;          // "focal-length"
  std::string_view placeholder;   // "MM", shown in the help
  std::string_view help;          // with the unit and the default
  Group group = Group::shot;
  tl::expected<void, std::string> (*set)(UserValues&, const std::string&) = nullptr;
};

// All of them, in the order of the help. A switch such as `trust_centre` is no value and not in the table.
std::span<const ValueOption> value_options();

}  // namespace focusfall
