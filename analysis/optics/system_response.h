// The optical system between an ideal edge and the pixels, as one transfer function: defocus, diffraction,
// a Gaussian, linear motion and the pixel's own aperture.
//
// All of them are symmetric, so the transfer function is real; it turns negative where contrast is reversed.
// Frequencies are cycles per pixel, angles degrees from +x towards +y (down), as in conventions.h.
#pragma once

#include <optional>
#include <vector>

namespace focusfall {

struct SystemResponse {
  double disc_px = 0;                   // diameter of the geometric blur disc, >= 0; 0 = exactly in focus
  double airy_lambda_n_over_p_px = 0;   // wavelength x working f-number / pixel pitch; 0 = no diffraction
  double gaussian_sigma_px = 0;         // s0: whatever else is unsharp (lens aberrations, filter); 0 = none
  double motion_length_px = 0;          // straight path at constant speed; 0 = none
  double motion_angle_deg = 0;          // direction of that path
  double pixel_aperture_px = 1;         // side of the square that a pixel gathers light from; 0 = a point

  bool operator==(const SystemResponse&) const = default;
};

// Wavefront error at the rim of the pupil in wavelengths, W20 = c / (8 lambda N); nullopt without diffraction.
std::optional<double> defocus_waves(const SystemResponse& response);

// Optical transfer function at the frequency (fx, fy), 1 at zero frequency. Defocus and diffraction together are the
// exact defocused aperture up to kExactDefocusWaves (diffraction.h), geometric disc times Airy pattern beyond.
double otf(const SystemResponse& response, double fx_cycles_per_px, double fy_cycles_per_px);

// The image of an ideal step from 0 to 1 across a straight edge, sampled along the edge's normal at
// x = -half_width ... +half_width in steps of step_px (2 round(half_width / step) + 1 values, the middle one at x = 0,
// where it is 1/2 by symmetry). It is the integral of the line-spread function, which is the inverse Fourier transform
// of the slice of the transfer function along the normal:
//   E(x) = 1/2 + integral over f > 0 of H(f) sin(2 pi f x) / (pi f).
// Accuracy 2e-3 at the corners of an axis-parallel pixel box with nothing else (its spectrum is cut at 32 cycles per
// pixel), 2e-5 with a lens of lambda N / p = .8 px in front (against quadrature).
std::vector<double> edge_spread(const SystemResponse& response, double normal_angle_deg, double step_px,
                                double half_width_px);

// Distance over which that edge climbs from 10 to 90 % of the step, px. nullopt where blur of some hundred pixels
// leaves the range that is computed.
std::optional<double> edge_rise_px(const SystemResponse& response, double normal_angle_deg);

// Lowest frequency along the normal at which the transfer function falls to one half, cycles per pixel; nullopt for
// a response without any blur, which never does.
std::optional<double> mtf50_cycles_per_px(const SystemResponse& response, double normal_angle_deg);

// The same two for the unit in which blur is stored: a uniform disc of diameter c, c >= 0, and a square pixel of one
// pixel, the edge parallel to its sides. Closed form and direct solution, both monotone in c:
//   c = 0 gives the pixel alone, .8 px and .6033546 cycles/px; c >> 1 tends to .6870488 c and .7050848 / c.
double disc_edge_rise_px(double disc_px);
double disc_mtf50_cycles_per_px(double disc_px);

}  // namespace focusfall
