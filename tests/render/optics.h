// Transfer functions of what blurs a tile: the uniform disc, linear motion, the pixel aperture, diffraction.
// Written for the tests alone and independent of analysis/: the renderer may not share a mistake with what it checks.
#pragma once

#include <vector>

namespace focusfall::render {

// Everything that stands between the scene and the photosites.
struct BlurSpec {
  double disc_px = 0;           // diameter c of the uniform disc
  double motion_px = 0;         // length of a uniform linear motion
  double motion_angle_deg = 0;  // from +x towards +y (down)
  double lambda_n_over_p_px = 0;  // wavelength x working f-number / pixel pitch; 0 = no diffraction
};

// OTF of a circular opening, defocused, on the radial frequency f in cycles/px. Where diffraction is on and the
// wavefront error W20 = c / (8 lambda N / p) wavelengths is below kExactLimit, the exact integral after Hopkins (1955);
// beyond it the product of disc and diffraction, which differs by less than the 4.6 % that check values give at 2.
class RadialOtf {
 public:
  RadialOtf(double disc_px, double lambda_n_over_p_px, double highest_frequency);
  float operator()(float frequency) const {
    const float position = frequency * scale_;
    const auto index = static_cast<std::size_t>(position);
    if (index + 1 >= table_.size()) return table_.back();
    const float part = position - static_cast<float>(index);
    return table_[index] + part * (table_[index + 1] - table_[index]);
  }

 private:
  std::vector<float> table_;
  float scale_ = 1;
};

double disc_otf(double disc_px, double frequency);                       // 2 J1(x)/x, x = pi c f
double diffraction_otf(double lambda_n_over_p_px, double frequency);     // circular opening, in focus
double defocused_otf(double wavefront_error, double reduced_frequency);  // exact, W20 in wavelengths, s = f lambda N / p
double sinc(double x);                                                   // sin(pi x) / (pi x)

}  // namespace focusfall::render
