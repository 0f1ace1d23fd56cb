// How far the image moves on the sensor while the shutter is open.
#pragma once

namespace focusfall {

// A camera that turns at a constant angular rate about the lens: image distance x rate x time, micrometres. Exact on
// the axis for small angles; 400 mm focused far away at .03 rad/s for 1/2000 s is 6 um.
double camera_motion_um(double image_distance_mm, double angular_rate_rad_s, double time_s);

// A subject that crosses the axis in the plane of focus: magnification x speed x time, micrometres.
double subject_motion_um(double magnification, double speed_m_s, double time_s);

}  // namespace focusfall
