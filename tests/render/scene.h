// The scenes of the tiles, drawn on a fine canvas.
#pragma once

#include "tests/render/paint.h"
#include "tests/render/tile.h"

namespace focusfall::render {

void draw_scene(Canvas& canvas, const TileSpec& spec);

// Pieces that the frames use too. Sizes in px of the canvas.
struct ShapeStyle {
  double contrast = 1;
  double colour = 0;
  double highlight_share = 0;
};

// Reflectance or lamp of one shape.
Light shape_light(const ShapeStyle& style, Random& random);

// A field with an amplitude spectrum f^-exponent, mean 0, standard deviation 1, periodic; samples x samples.
cv::Mat power_law_field(int samples, double exponent, Random& random);

void draw_leaves(Canvas& canvas, double smallest_px, double largest_px, const ShapeStyle& style, Random& random);
void draw_polygons(Canvas& canvas, double smallest_px, double largest_px, const ShapeStyle& style, Random& random);
void draw_blades(Canvas& canvas, double width_px, double length_px, const ShapeStyle& style, Random& random);
void draw_stones(Canvas& canvas, double smallest_px, double largest_px, const ShapeStyle& style, Random& random);

}  // namespace focusfall::render
