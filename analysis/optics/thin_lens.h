// The thin lens: conjugate distances, magnification, working f-number, blur disc.
//
// Distances called `..._mm` without another word are measured from the lens, from its front principal plane; the
// sensor then lies at the image distance behind the rear one. The gap between the two planes is taken as nought: it is
// a few centimetres in a long lens, unpublished, and shifts every distance from the sensor alike. Infinity is
// std::numeric_limits<double>::infinity().
#pragma once

#include <optional>

namespace focusfall {

struct Lens {
  double focal_length_mm = 0;        // > 0
  double f_number = 0;               // > 0, as marked
  double pupil_magnification = 1;    // P: diameter of the exit pupil / of the entrance pupil; 1 = symmetric
};

// Where the sharp image of a plane at `focus_mm` > f lies: v = f s / (s - f); f for infinity.
double image_distance_mm(double focal_length_mm, double focus_mm);

// The inverse: the plane that is sharp at the image distance v >= f, s = f v / (v - f); infinity for v = f.
double focus_distance_mm(double focal_length_mm, double image_distance_mm);

// Image size / object size, m = f / (s - f); 0 for infinity.
double magnification(double focal_length_mm, double focus_mm);

// Distance from the sensor to the plane in focus: s + v = f (2 + m + 1/m). 4 f at m = 1 is the least there is.
double sensor_distance_mm(double focal_length_mm, double focus_mm);

// The inverse, of the two solutions the one with m <= 1: s = (D + sqrt(D^2 - 4 f D)) / 2. nullopt for D < 4 f, where
// a thin lens forms no sharp image (a real lens shortens its focal length to focus there).
std::optional<double> lens_distance_mm(double focal_length_mm, double sensor_distance_mm);

// f-number of the cone of light that reaches the sensor, N (1 + m / P).
double working_f_number(const Lens& lens, double magnification);

// Diameter of the opening as seen from the front, f / N.
double entrance_pupil_mm(const Lens& lens);

// Distance from the entrance pupil of a point at `distance_mm`: d - f + f / P. The two are the same for P = 1.
double distance_from_pupil_mm(const Lens& lens, double distance_mm);

// Diameter on the sensor of the blur disc of a point at `subject_mm` with the lens focused at `focus_mm`, both > f:
//   m (f / N) (s - d) / d', d' from the entrance pupil; for P = 1 and without sign f^2 / (N (s - f)) |d - s| / d.
// Positive where focus fell behind the point (back focus), negative where it fell in front of it.
double signed_blur_disc_mm(const Lens& lens, double focus_mm, double subject_mm);

// The same without its sign, for a symmetric lens.
double blur_disc_mm(double focal_length_mm, double f_number, double focus_mm, double subject_mm);

// A length on the sensor in pixels.
inline double sensor_length_px(double length_mm, double pixel_pitch_um) { return 1000 * length_mm / pixel_pitch_um; }

}  // namespace focusfall
