// Diffraction at a circular aperture, and what defocus does to it.
//
// s = nu lambda N is the spatial frequency in units of the cut-off: 0 at zero frequency, 1 where the transfer
// function ends. N is the working f-number, nu in cycles per mm, lambda in mm.
#pragma once

namespace focusfall {

// Up to this wavefront error at the rim of the pupil, in wavelengths, defocus is computed exactly; beyond it geometric
// disc times Airy pattern is close enough: the product's MTF50 is low by about 9 % / W. Judgement: 1 % at the change-over.
inline constexpr double kExactDefocusWaves = 10;

// 2 J1(x) / x, the transfer function of a uniform disc of diameter c at x = pi c nu; 1 at x = 0.
double jinc(double x);

// sin(pi x) / (pi x), the transfer function of a box of unit width at the frequency x; 1 at x = 0.
double sinc(double x);

// Incoherent transfer function of the circular aperture in focus, 0 for s >= 1:
//   (2/pi) (acos s - s sqrt(1 - s^2)).   J. W. Goodman, Introduction to Fourier Optics, 6.4 (from memory).
double circular_aperture_mtf(double s);

// The same aperture with a defocus of `waves` = W20 / lambda at the rim of the pupil:
//   (4/pi) integral from 0 to 1 - s of sqrt(1 - (x + s)^2) cos(8 pi W s x) dx
// after H. H. Hopkins, The frequency response of a defocused optical system, Proc. R. Soc. A 231 (1955) 91.
// Even in `waves`; 0 for s >= 1; error below 1e-9 for |waves| <= 2 kExactDefocusWaves.
double defocused_aperture_otf(double s, double waves);

// Diameter of the first dark ring of the Airy pattern: 2 x 1.21967 lambda N, in the unit of `wavelength`.
double airy_diameter(double wavelength, double f_number);

// Frequency above which nothing is passed, 1 / (lambda N).
double cutoff_cycles_per_mm(double wavelength_um, double f_number);

// Defocus at the rim of the pupil, wavelengths, for a geometric blur disc of `disc` (same unit as wavelength):
//   W20 / lambda = c / (8 lambda N), since the focus error at the image is dz = c N = 8 N^2 W20.
double disc_waves(double disc, double wavelength, double f_number);

}  // namespace focusfall
