#include "analysis/optics/solve.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "analysis/optics/depth_of_field.h"
#include "analysis/optics/diffraction.h"
#include "analysis/optics/exposure.h"
#include "analysis/optics/predict.h"
#include "analysis/optics/thin_lens.h"

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

template <class... Values>
tl::unexpected<NoSolution> no_solution(fmt::format_string<const Values&...> text, const Values&... values) {
  return tl::make_unexpected(NoSolution{fmt::format(text, values...)});
}

Solved<double> acceptable_blur_mm(const OpticalSetup& setup) {
  const auto blur_um = acceptable_blur(setup).um;
  if (!blur_um || !(*blur_um > 0)) {
    return no_solution("What counts as sharp is not known: give an acceptable blur, or the size of the sensor.");
  }
  return *blur_um / 1000;
}

Solved<double> known_focus_mm(const OpticalSetup& setup) {
  if (!setup.focus_distance_m) return no_solution("The focus distance is not known.");
  if (const auto focus_mm = focus_from_lens_mm(setup)) return *focus_mm;
  return tl::make_unexpected(NoSolution{*focus_distance_problem(setup)});
}

// Distances of two limits from the entrance pupil, for a lens focused at `focus_mm`.
struct PupilLimits {
  double near_mm = 0, far_mm = 0;
};

PupilLimits from_pupil(const OpticalSetup& setup, double focus_mm, double near_m, double far_m) {
  const Lens lens = lens_of(setup);
  const double offset_mm = origin_offset_mm(setup, focus_mm);
  return {distance_from_pupil_mm(lens, 1000 * near_m - offset_mm), distance_from_pupil_mm(lens, 1000 * far_m - offset_mm)};
}

Solved<double> checked_limits(const OpticalSetup& setup, double near_m, double far_m) {
  if (!(near_m > 0) || !(far_m >= near_m)) {
    return no_solution("The near limit, {:.4g} m, must be positive and no farther than the far limit, {:.4g} m.", near_m,
                       far_m);
  }
  const bool from_sensor = setup.distance_from == DistanceOrigin::sensor;
  const double nearest_m = (from_sensor ? 4 : 2) * setup.focal_length_mm / 1000;
  if (near_m < nearest_m) {
    return no_solution("The near limit of {:.4g} m is closer than 1:1, which is {:.4g} m for a lens of {:g} mm.", near_m,
                       nearest_m, setup.focal_length_mm);
  }
  return near_m;
}

// Puts an f-number into its setting: what it covers, and what diffraction makes of it.
Solved<SolvedFNumber> settled(const OpticalSetup& setup, double f_number, double focus_mm, double blur_mm) {
  if (!(f_number <= kNarrowestFNumber)) {
    return no_solution("This would need f/{:.3g}; no lens closes beyond f/{:g}.", f_number, kNarrowestFNumber);
  }
  Lens lens = lens_of(setup);
  lens.f_number = std::max(f_number, kWidestFNumber);
  const DepthLimits limits = depth_limits(lens, focus_mm, blur_mm);
  const double offset_mm = origin_offset_mm(setup, focus_mm);
  const double m = magnification(lens.focal_length_mm, focus_mm);
  const double airy_um = airy_diameter(setup.wavelength_um, working_f_number(lens, m));
  return SolvedFNumber{.f_number = lens.f_number,
                       .focus_distance_m = (focus_mm + offset_mm) / 1000,
                       .near_limit_m = (limits.near_mm + offset_mm) / 1000,
                       .far_limit_m = (limits.far_mm + offset_mm) / 1000,
                       .airy_diameter_um = airy_um,
                       .diffraction_exceeds_blur = airy_um > 1000 * blur_mm};
}

// f-number at which the limits lie at u / (1 +- q), since q = N c / (f m).
double f_number_of(double q, double focal_length_mm, double focus_mm, double blur_mm) {
  return q * focal_length_mm * magnification(focal_length_mm, focus_mm) / blur_mm;
}

// Focus between two limits: 1/u is the mean of 1/near and 1/far, u from the pupil. Distances from the sensor move with
// the focus by the extension of the lens, f m, so the step is repeated; it contracts by about m^2.
double best_focus_mm(const OpticalSetup& setup, double near_m, double far_m) {
  const double f = setup.focal_length_mm;
  const double pupil_mm = f - f / setup.pupil_magnification;
  double focus_mm = std::max(2 * f, 1000 * near_m - 2 * f);
  for (int i = 0; i < 200; ++i) {
    const PupilLimits limits = from_pupil(setup, focus_mm, near_m, far_m);
    const double next_mm = 2 / (1 / limits.near_mm + 1 / limits.far_mm) + pupil_mm;
    const double change_mm = next_mm - focus_mm;
    focus_mm = std::max(next_mm, 1.000001 * f);
    if (std::abs(change_mm) <= 1e-12 * focus_mm) break;
  }
  return focus_mm;
}

Solved<double> known_light(const OpticalSetup& setup, double level) {
  if (!setup.scene_luminance_cd_m2) return no_solution("The luminance of the scene is not known.");
  if (!setup.iso_speed) return no_solution("The sensitivity (ISO) is not known.");
  if (!(level > 0 && level <= 1)) return no_solution("A level of {:g} is not between 0 and 1, the clipping level.", level);
  return exposure_of_level_lx_s(level, *setup.iso_speed);
}

}  // namespace

Solved<SolvedFNumber> f_number_for_limits(const OpticalSetup& setup, double near_m, double far_m) {
  const auto blur_mm = acceptable_blur_mm(setup);
  if (!blur_mm) return tl::make_unexpected(blur_mm.error());
  if (const auto checked = checked_limits(setup, near_m, far_m); !checked) return tl::make_unexpected(checked.error());
  if (std::isinf(near_m)) return settled(setup, kWidestFNumber, kInfinity, *blur_mm);

  const double focus_mm = best_focus_mm(setup, near_m, far_m);
  const PupilLimits limits = from_pupil(setup, focus_mm, near_m, far_m);
  const double ratio = limits.near_mm / limits.far_mm;   // 0 for an infinite far limit
  const double q = (1 - ratio) / (1 + ratio);
  return settled(setup, f_number_of(q, setup.focal_length_mm, focus_mm, *blur_mm), focus_mm, *blur_mm);
}

Solved<SolvedFNumber> f_number_for_limits_at_focus(const OpticalSetup& setup, double near_m, double far_m) {
  const auto blur_mm = acceptable_blur_mm(setup);
  if (!blur_mm) return tl::make_unexpected(blur_mm.error());
  const auto focus_mm = known_focus_mm(setup);
  if (!focus_mm) return tl::make_unexpected(focus_mm.error());
  if (const auto checked = checked_limits(setup, near_m, far_m); !checked) return tl::make_unexpected(checked.error());

  // The blur disc is proportional to 1/N, so whichever limit blurs more decides.
  Lens open = lens_of(setup);
  open.f_number = 1;
  const double offset_mm = origin_offset_mm(setup, *focus_mm);
  double f_number = 0;
  for (const double limit_m : {near_m, far_m}) {
    const double limit_mm = 1000 * limit_m - offset_mm;
    if (!(limit_mm > setup.focal_length_mm)) return no_solution("{:.4g} m lies within the lens.", limit_m);
    f_number = std::max(f_number, std::abs(signed_blur_disc_mm(open, *focus_mm, limit_mm)) / *blur_mm);
  }
  return settled(setup, f_number, *focus_mm, *blur_mm);
}

Solved<SolvedFNumber> f_number_for_depth(const OpticalSetup& setup, double depth_m) {
  const auto blur_mm = acceptable_blur_mm(setup);
  if (!blur_mm) return tl::make_unexpected(blur_mm.error());
  const auto focus_mm = known_focus_mm(setup);
  if (!focus_mm) return tl::make_unexpected(focus_mm.error());
  if (!(depth_m > 0)) return no_solution("A depth of {:g} m is not positive.", depth_m);
  if (std::isinf(*focus_mm)) {
    return no_solution("Focused at infinity the depth of field is infinite at every f-number; give a near limit.");
  }
  // 2 u q / (1 - q^2) = T, the positive root, written without cancellation: q = T / (u + sqrt(u^2 + T^2)).
  const double u_mm = distance_from_pupil_mm(lens_of(setup), *focus_mm), depth_mm = 1000 * depth_m;
  const double q = std::isinf(depth_m) ? 1 : depth_mm / (u_mm + std::hypot(u_mm, depth_mm));
  return settled(setup, f_number_of(q, setup.focal_length_mm, *focus_mm, *blur_mm), *focus_mm, *blur_mm);
}

Solved<SolvedFNumber> f_number_for_blur(const OpticalSetup& setup, double distance_m, double blur_um) {
  if (!(blur_um > 0)) return no_solution("A blur of {:g} um is not positive.", blur_um);
  OpticalSetup with_limit = setup;
  with_limit.acceptable_blur_um = blur_um;
  return f_number_for_limits_at_focus(with_limit, distance_m, distance_m);
}

Solved<double> f_number_for_level(const OpticalSetup& setup, double level) {
  if (!setup.exposure_time_s) return no_solution("The exposure time is not known.");
  const auto wanted_lx_s = known_light(setup, level);
  if (!wanted_lx_s) return wanted_lx_s;
  OpticalSetup open = setup;
  open.f_number = 1;
  const double f_number = std::sqrt(luminous_exposure_lx_s(open, *setup.scene_luminance_cd_m2) / *wanted_lx_s);
  if (f_number < kWidestFNumber || f_number > kNarrowestFNumber) {
    return no_solution("This would need f/{:.3g}; lenses reach from f/{:g} to f/{:g}.", f_number, kWidestFNumber,
                       kNarrowestFNumber);
  }
  return f_number;
}

Solved<double> f_number_for_exposure_value(const OpticalSetup& setup, double ev) {
  if (!setup.exposure_time_s) return no_solution("The exposure time is not known.");
  const double f_number = std::exp2(0.5 * (ev - time_value(*setup.exposure_time_s)));
  if (f_number < kWidestFNumber || f_number > kNarrowestFNumber) {
    return no_solution("EV {:.3g} at {:g} s would need f/{:.3g}; lenses reach from f/{:g} to f/{:g}.", ev,
                       *setup.exposure_time_s, f_number, kWidestFNumber, kNarrowestFNumber);
  }
  return f_number;
}

Solved<double> distance_for_depth_m(const OpticalSetup& setup, double depth_m) {
  const auto blur_mm = acceptable_blur_mm(setup);
  if (!blur_mm) return tl::make_unexpected(blur_mm.error());
  if (!(depth_m > 0)) return no_solution("A depth of {:g} m is not positive.", depth_m);
  const Lens lens = lens_of(setup);
  const double closest_mm = 2 * lens.focal_length_mm, hyperfocal = hyperfocal_mm(lens, *blur_mm);
  const double closest_depth_mm = depth_limits(lens, closest_mm, *blur_mm).depth_mm();
  if (!(closest_depth_mm <= 1000 * depth_m)) {
    return no_solution("The depth of field is more than that at every distance: {:.3g} m even at 1:1.",
                       closest_depth_mm / 1000);
  }
  // The depth grows with the focus distance from 1:1 up to the hyperfocal distance, where it becomes infinite.
  double low_mm = closest_mm, high_mm = std::max(closest_mm, hyperfocal);
  if (std::isinf(depth_m)) low_mm = high_mm;
  for (int i = 0; i < 80; ++i) {
    const double middle_mm = 0.5 * (low_mm + high_mm);
    (depth_limits(lens, middle_mm, *blur_mm).depth_mm() < 1000 * depth_m ? low_mm : high_mm) = middle_mm;
  }
  return (high_mm + origin_offset_mm(setup, high_mm)) / 1000;
}

Solved<SolvedRange> range_for_blur_m(const OpticalSetup& setup, double blur_um) {
  const auto focus_mm = known_focus_mm(setup);
  if (!focus_mm) return tl::make_unexpected(focus_mm.error());
  if (!(blur_um > 0)) return no_solution("A blur of {:g} um is not positive.", blur_um);
  const DepthLimits limits = depth_limits(lens_of(setup), *focus_mm, blur_um / 1000);
  const double offset_mm = origin_offset_mm(setup, *focus_mm);
  return SolvedRange{.near_m = (limits.near_mm + offset_mm) / 1000, .far_m = (limits.far_mm + offset_mm) / 1000};
}

Solved<double> exposure_time_for_motion_s(const OpticalSetup& setup, double blur_um) {
  if (!(blur_um > 0)) return no_solution("A blur of {:g} um is not positive.", blur_um);
  if (!setup.angular_rate_rad_s && !setup.subject_speed_m_s) {
    return no_solution("Neither the turning rate of the camera nor the speed of the subject is known.");
  }
  const auto speed_um_s = image_speed_um_s(setup);
  if (!speed_um_s) return no_solution("The subject's speed in the image needs a focus distance that the lens reaches.");
  if (!(*speed_um_s > 0)) return no_solution("Nothing moves in the image, so any exposure time holds this blur.");
  return blur_um / *speed_um_s;
}

Solved<double> exposure_time_for_level_s(const OpticalSetup& setup, double level) {
  const auto wanted_lx_s = known_light(setup, level);
  if (!wanted_lx_s) return wanted_lx_s;
  OpticalSetup one_second = setup;
  one_second.exposure_time_s = 1;
  return *wanted_lx_s / luminous_exposure_lx_s(one_second, *setup.scene_luminance_cd_m2);
}

Solved<double> exposure_time_for_exposure_value_s(const OpticalSetup& setup, double ev) {
  return std::exp2(aperture_value(setup.f_number) - ev);
}

}  // namespace focusfall
