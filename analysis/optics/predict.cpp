#include "analysis/optics/predict.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "analysis/optics/acceptable_blur.h"
#include "analysis/optics/depth_of_field.h"
#include "analysis/optics/diffraction.h"
#include "analysis/optics/exposure.h"
#include "analysis/optics/motion_blur.h"
#include "analysis/optics/series.h"

namespace focusfall {
namespace {

// What camera processing adds to S where nothing is known about the body: a normal prior of mean 0 and standard
// deviation 3 px^2, the spread of in-camera sharpening (-2.7 to -5.6) and demosaicing (+3 to +5) on rendered frames.
constexpr double kBaselinePriorSigmaPx2 = 3;
constexpr double kNormal95 = 1.959964;

double mm_from_m(double length_m) { return 1000 * length_m; }
double m_from_mm(double length_mm) { return length_mm / 1000; }

// Focus distance from the lens for one as given in the setup's own terms; nullopt where no image is formed.
std::optional<double> reachable_mm(const OpticalSetup& setup, double distance_m) {
  const double distance_mm = mm_from_m(distance_m);
  if (setup.distance_from == DistanceOrigin::sensor) return lens_distance_mm(setup.focal_length_mm, distance_mm);
  if (!(distance_mm > setup.focal_length_mm)) return std::nullopt;
  return distance_mm;
}

// The same for an end of an interval: what lies nearer than 1:1 is taken at 1:1.
double end_mm(const OpticalSetup& setup, double distance_m) {
  return reachable_mm(setup, distance_m).value_or(2 * setup.focal_length_mm);
}

struct FrameSize {
  double width_mm = 0, height_mm = 0;
};

std::optional<FrameSize> frame_size(const OpticalSetup& setup) {
  if (setup.sensor_width_mm && setup.sensor_height_mm) return FrameSize{*setup.sensor_width_mm, *setup.sensor_height_mm};
  const auto pitch_um = pixel_pitch_um(setup);
  if (!pitch_um || setup.width_px <= 0 || setup.height_px <= 0) return std::nullopt;
  return FrameSize{setup.width_px * *pitch_um / 1000, setup.height_px * *pitch_um / 1000};
}

// The working f-number over the marked one; 1 where the focus distance is not known.
double working_ratio(const OpticalSetup& setup) {
  const auto focus_mm = focus_from_lens_mm(setup);
  if (!focus_mm) return 1;
  const double m = magnification(setup.focal_length_mm, *focus_mm);
  return working_f_number(lens_of(setup), m) / setup.f_number;
}

Interval sorted(double value, double first, double second) {
  return {value, std::min({value, first, second}), std::max({value, first, second})};
}

// Limits in metres from where the setup counts, for a focus distance from the lens.
struct LimitsM {
  double near_m = 0, far_m = 0;
};

LimitsM limits_m(const OpticalSetup& setup, double focus_mm, double blur_mm) {
  const DepthLimits limits = depth_limits(lens_of(setup), focus_mm, blur_mm);
  const double offset_mm = origin_offset_mm(setup, focus_mm);
  return {m_from_mm(limits.near_mm + offset_mm), m_from_mm(limits.far_mm + offset_mm)};
}

void predict_depth(const OpticalSetup& setup, double blur_mm, Prediction& prediction) {
  const Lens lens = lens_of(setup);
  const double hyperfocal = hyperfocal_mm(lens, blur_mm);
  prediction.hyperfocal_m = m_from_mm(hyperfocal + origin_offset_mm(setup, hyperfocal));
  const auto focus_mm = focus_from_lens_mm(setup);
  if (!focus_mm) return;

  const LimitsM limits = limits_m(setup, *focus_mm, blur_mm);
  const LimitsM at_low = limits_m(setup, end_mm(setup, setup.focus_distance_m->low), blur_mm);
  const LimitsM at_high = limits_m(setup, end_mm(setup, setup.focus_distance_m->high), blur_mm);
  prediction.near_limit_m = limits.near_m;
  prediction.far_limit_infinite = std::isinf(limits.far_m);
  if (!prediction.far_limit_infinite) prediction.far_limit_m = limits.far_m;
  prediction.near_limit_bounds_m = sorted(limits.near_m, at_low.near_m, at_high.near_m);
  prediction.far_limit_bounds_m = sorted(limits.far_m, at_low.far_m, at_high.far_m);

  const double m = magnification(setup.focal_length_mm, *focus_mm);
  prediction.depth_of_focus_um = 1000 * depth_of_focus_mm(lens, m, blur_mm);
}

void predict_exposure(const OpticalSetup& setup, Prediction& prediction) {
  if (!setup.exposure_time_s) return;
  prediction.exposure_value = exposure_value(setup.f_number, *setup.exposure_time_s);
  if (!setup.iso_speed || !setup.scene_luminance_cd_m2) return;
  const double level = picture_level(luminous_exposure_lx_s(setup, *setup.scene_luminance_cd_m2), *setup.iso_speed);
  prediction.mid_tone_level = std::min(level, 1.0);
}

}  // namespace

Lens lens_of(const OpticalSetup& setup) {
  return {.focal_length_mm = setup.focal_length_mm,
          .f_number = setup.f_number,
          .pupil_magnification = setup.pupil_magnification};
}

std::optional<double> pixel_pitch_um(const OpticalSetup& setup) {
  if (setup.pixel_pitch_um) return setup.pixel_pitch_um->value;
  if (setup.sensor_width_mm && setup.width_px > 0) return 1000 * *setup.sensor_width_mm / setup.width_px;
  return std::nullopt;
}

std::optional<double> focus_from_lens_mm(const OpticalSetup& setup) {
  if (!setup.focus_distance_m) return std::nullopt;
  return reachable_mm(setup, setup.focus_distance_m->value);
}

double origin_offset_mm(const OpticalSetup& setup, double focus_mm) {
  return setup.distance_from == DistanceOrigin::sensor ? image_distance_mm(setup.focal_length_mm, focus_mm) : 0;
}

std::optional<std::string> focus_distance_problem(const OpticalSetup& setup) {
  if (!setup.focus_distance_m || focus_from_lens_mm(setup)) return std::nullopt;
  const double distance_m = setup.focus_distance_m->value, f_mm = setup.focal_length_mm;
  if (setup.distance_from == DistanceOrigin::lens) {
    return fmt::format("The focus distance of {:.3g} m lies within the focal length of {:g} mm.", distance_m, f_mm);
  }
  return fmt::format(
      "The focus distance of {:.3g} m is less than four focal lengths ({:.3g} m), the least that a lens of {:g} mm "
      "needs from the sensor; it may count from the lens.",
      distance_m, m_from_mm(4 * f_mm), f_mm);
}

AcceptableBlur acceptable_blur(const OpticalSetup& setup) {
  AcceptableBlur blur{.px = setup.acceptable_blur_px, .um = setup.acceptable_blur_um};
  const bool has_picture = setup.width_px > 0 && setup.height_px > 0;
  const bool by_picture = setup.acceptable_blur_rule == AcceptableBlurRule::delivered_picture;
  if (!blur.px && !blur.um && has_picture && by_picture) {
    blur.px = acceptable_blur_px(setup.width_px, setup.height_px, setup.delivered_width_px);
  } else if (!blur.px && !blur.um) {
    if (const auto size = frame_size(setup)) blur.um = 1000 * circle_of_confusion(size->width_mm, size->height_mm);
    if (has_picture) blur.px = circle_of_confusion(setup.width_px, setup.height_px);
  }
  // A length that the user gave wins over a number of pixels; the other of the two follows from the pitch.
  if (const auto pitch_um = pixel_pitch_um(setup)) {
    if (blur.um) blur.px = *blur.um / *pitch_um;
    else if (blur.px) blur.um = *blur.px * *pitch_um;
  }
  return blur;
}

std::optional<double> motion_time_s(const OpticalSetup& setup) {
  if (!setup.flash_fired) return setup.exposure_time_s;
  if (!setup.flash_duration_s || !setup.exposure_time_s) return setup.flash_duration_s;
  return std::min(*setup.flash_duration_s, *setup.exposure_time_s);
}

std::optional<double> image_speed_um_s(const OpticalSetup& setup) {
  const auto focus_mm = focus_from_lens_mm(setup);
  const double f = setup.focal_length_mm;
  std::optional<double> speed_um_s;
  if (setup.angular_rate_rad_s) {
    const double image_mm = focus_mm ? image_distance_mm(f, *focus_mm) : f;
    speed_um_s = std::abs(camera_motion_um(image_mm, *setup.angular_rate_rad_s, 1));
  }
  if (setup.subject_speed_m_s) {
    if (!focus_mm) return std::nullopt;
    const double subject_um = std::abs(subject_motion_um(magnification(f, *focus_mm), *setup.subject_speed_m_s, 1));
    speed_um_s = speed_um_s.value_or(0) + subject_um;
  }
  return speed_um_s;
}

double luminous_exposure_lx_s(const OpticalSetup& setup, double luminance_cd_m2) {
  const double f_number = exact_f_number(setup.f_number).value_or(setup.f_number);
  const double time_s = exact_exposure_time_s(*setup.exposure_time_s).value_or(*setup.exposure_time_s);
  LensLoss loss;
  loss.transmittance = setup.transmittance.value_or(loss.transmittance);
  return focal_plane_exposure_lx_s(luminance_cd_m2, f_number * working_ratio(setup), time_s, loss);
}

Prediction predict(const OpticalSetup& setup) {
  Prediction prediction;
  prediction.distance_from = setup.distance_from;
  const AcceptableBlur blur = acceptable_blur(setup);
  prediction.acceptable_blur_px = blur.px;
  prediction.acceptable_blur_um = blur.um;
  if (const auto size = frame_size(setup)) {
    prediction.circle_of_confusion_um = 1000 * circle_of_confusion(size->width_mm, size->height_mm);
  }

  prediction.entrance_pupil_mm = entrance_pupil_mm(lens_of(setup));
  if (const auto focus_mm = focus_from_lens_mm(setup)) {
    prediction.image_distance_mm = image_distance_mm(setup.focal_length_mm, *focus_mm);
    prediction.magnification = magnification(setup.focal_length_mm, *focus_mm);
    prediction.working_f_number = setup.f_number * working_ratio(setup);
  }
  if (blur.um && *blur.um > 0) predict_depth(setup, *blur.um / 1000, prediction);

  if (const auto pitch_um = pixel_pitch_um(setup)) {
    const double working = setup.f_number * working_ratio(setup);
    prediction.airy_diameter_px = airy_diameter(setup.wavelength_um, working) / *pitch_um;
    const auto speed_um_s = image_speed_um_s(setup), time_s = motion_time_s(setup);
    if (speed_um_s && time_s) prediction.motion_blur_px = *speed_um_s * *time_s / *pitch_um;
  }
  const double half_width_px2 = kNormal95 * kBaselinePriorSigmaPx2;
  prediction.baseline_px2 = Interval{0, -half_width_px2, half_width_px2};
  prediction.baseline_source = "prior";
  predict_exposure(setup, prediction);
  return prediction;
}

std::optional<SystemResponse> system_response(const OpticalSetup& setup, double disc_px) {
  const auto pitch_um = pixel_pitch_um(setup);
  if (!pitch_um) return std::nullopt;
  const double working = setup.f_number * working_ratio(setup);
  SystemResponse response;
  response.disc_px = disc_px;
  response.airy_lambda_n_over_p_px = setup.wavelength_um * working / *pitch_um;
  return response;
}

std::optional<BlurAtDistance> blur_at(const OpticalSetup& setup, double distance_m) {
  const auto focus_mm = focus_from_lens_mm(setup);
  if (!focus_mm) return std::nullopt;
  // The lens moves a little with the focus setting, and a point at a fixed distance from the sensor with it.
  const auto disc_um = [&](double at_focus_mm) -> std::optional<double> {
    const double subject_mm = mm_from_m(distance_m) - origin_offset_mm(setup, at_focus_mm);
    if (!(subject_mm > setup.focal_length_mm)) return std::nullopt;
    return 1000 * signed_blur_disc_mm(lens_of(setup), at_focus_mm, subject_mm);
  };
  const auto value = disc_um(*focus_mm);
  if (!value) return std::nullopt;
  const double at_low = disc_um(end_mm(setup, setup.focus_distance_m->low)).value_or(*value);
  const double at_high = disc_um(end_mm(setup, setup.focus_distance_m->high)).value_or(*value);

  BlurAtDistance blur;
  blur.distance_m = distance_m;
  blur.signed_disc_um = sorted(*value, at_low, at_high);
  if (const auto acceptable_um = acceptable_blur(setup).um) blur.limits = *value / *acceptable_um;
  if (const auto pitch_um = pixel_pitch_um(setup)) {
    const Interval& um = blur.signed_disc_um;
    blur.signed_disc_px = Interval{um.value / *pitch_um, um.low / *pitch_um, um.high / *pitch_um};
    const auto response = system_response(setup, std::abs(*value) / *pitch_um);
    blur.edge_rise_px = edge_rise_px(*response, 0);
    blur.mtf50_cycles_per_px = mtf50_cycles_per_px(*response, 0);
  }
  return blur;
}

}  // namespace focusfall
