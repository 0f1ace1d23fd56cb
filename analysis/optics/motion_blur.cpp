#include "analysis/optics/motion_blur.h"

namespace focusfall {

double camera_motion_um(double image_distance_mm, double angular_rate_rad_s, double time_s) {
  return 1000 * image_distance_mm * angular_rate_rad_s * time_s;
}

double subject_motion_um(double magnification, double speed_m_s, double time_s) {
  return 1e6 * magnification * speed_m_s * time_s;
}

}  // namespace focusfall
