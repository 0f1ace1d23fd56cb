// Small helpers shared by the drawings.
#pragma once

#include <opencv2/imgproc.hpp>

#include "tests/render/samples/art.h"

namespace focusfall::render {

using Points = std::vector<cv::Point2d>;

inline Light scaled(const Light& light, double factor) {
  const auto f = static_cast<float>(factor);
  return {light[0] * f, light[1] * f, light[2] * f};
}
// Mostly another brightness, a little another colour, as things of one kind differ.
inline Light varied(const Light& light, double spread, Random& random) {
  Light out{};
  const double brightness = spread * random.normal();
  for (std::size_t i = 0; i < 3; ++i)
    out[i] = light[i] * static_cast<float>(std::exp(brightness + 0.1 * spread * random.normal()));
  return out;
}
inline Canvas metre_canvas(double width_m, double height_m, double texel_m) {
  return Canvas(cv::Size(static_cast<int>(width_m / texel_m), static_cast<int>(height_m / texel_m)), 4, 1 / texel_m);
}
inline void line(Canvas& canvas, cv::Point2d a, cv::Point2d b, double width, const Light& light) {
  canvas.fill_limb(a, width / 2, b, width / 2, light);
}
// Digits and letters of straight strokes, for sail numbers.
void strokes(Canvas& canvas, const std::string& text, cv::Point2d top_left, double height, double width, const Light& light);
// Multiplies the light of a canvas, not its opacity, by exp(strength * field).
void weave(cv::Mat& picture, double exponent, double strength, Random& random);

}  // namespace focusfall::render
