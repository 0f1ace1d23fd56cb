// Small pictures whose blur is known exactly, for the estimators of analysis/measure.
//
// The scene is drawn in linear light with analytic antialiasing on a grid four times finer than the pixels, taken to
// the frequency domain, multiplied there by the continuous transfer functions of disc, motion, diffraction and pixel
// aperture, and sampled at the pixel centres. No Gaussian stands in for anything. Then the camera of camera.h.
#pragma once

#include <cstdint>
#include <opencv2/core.hpp>

#include "tests/render/camera.h"
#include "tests/render/optics.h"

namespace focusfall::render {

enum class Texture {
  polygons,      // convex polygons of many sizes: long straight edges
  dead_leaves,   // Lee, Mumford, Huang 2001: occluding discs, radii r^-3
  mixed,         // large polygons, dead leaves between them, power-law shading over both
  grass,         // fine blades: micro-texture
  gravel,        // shaded stones
  step_edges,    // one straight step through the centre, see edge_angle_deg
  power_law,     // random field with a 1/f amplitude spectrum: texture without any edge
  smooth,        // soft shading, nothing that could show blur
  flat,          // one level
};

struct TileSpec {
  int size_px = 128;
  Texture texture = Texture::dead_leaves;
  BlurSpec blur{};
  CameraSpec camera{};
  double colour = 0;               // 0 = neutral scene (three times faster), 1 = strongly coloured shapes
  double contrast = 1;             // 0..1: 1 = reflectances over 5 stops, less draws them towards the mean
  double highlight_share = 0;      // share of the shapes that are lamps, 1.5 to 8 times the clipping level
  double exposure = 1;             // factor on the linear scene
  double size_factor = 1;          // factor on the size of everything drawn
  double edge_angle_deg = 5;       // step_edges: direction of the normal, 0 = a vertical edge, bright to the right
  double edge_low = 0.12;          // step_edges: the two levels, linear; flat uses edge_high
  double edge_high = 0.55;
  std::uint64_t random_key = 1;    // same key, same tile
};

// The scene through the optics, noise-free linear light on the photosites: CV_32FC1, or CV_32FC3 where colour > 0.
cv::Mat render_linear_tile(const TileSpec& spec);

// The delivered picture.
Picture render_tile(const TileSpec& spec);

// What the disc, motion and pixel aperture of `blur` add to the variance of a line spread across an edge whose
// normal stands at normal_angle_deg: c^2/16 + L^2/12 cos^2 + 1/12. Diffraction has no second moment and is left out.
double lsf_variance_px2(const BlurSpec& blur, double normal_angle_deg);

const char* texture_name(Texture texture);

}  // namespace focusfall::render
