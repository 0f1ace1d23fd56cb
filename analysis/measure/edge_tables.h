// From the fitted width of an edge to the disc that would have blurred an ideal edge as much.
#pragma once

#include <functional>
#include <optional>

namespace focusfall {

// S, px^2 of level 0, for a Gaussian edge width `sigma_level_px` fitted on `level`. Widths narrower than that of an
// unblurred edge continue linearly in sigma^2, so that S < 0; wider than the table likewise.
float squared_disc_of_width(int level, float sigma_level_px);

// The width that the fit reports on `level` for an ideal edge with the spread `edge(u)` (u in level-0 px along the
// normal, 0 at the dark side, 1 at the bright, pixel aperture *not* included), the normal at `angle_rad`: the pixel
// box and the pyramid's own filters are added here, then pixels are drawn and fitted. nullopt if the fit fails.
std::optional<float> width_of_drawn_edge(int level, double angle_rad, const std::function<double(double)>& edge);

// Integrated line spread of a uniform disc of diameter c: 1/2 + (asin t + t sqrt(1 - t^2))/pi, t = 2u/c.
double disc_edge_spread(double disc_px, double u_px);

}  // namespace focusfall
