#include "tests/render/scene.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <opencv2/imgproc.hpp>
#include <vector>

namespace focusfall::render {
namespace {

constexpr double kPi = std::numbers::pi;
// Reflectances of everyday surfaces, about five stops; black cloth to white paper. Common practice, no source.
constexpr double kDarkest = 0.03, kBrightest = 0.9, kMeanReflectance = 0.18;
// Shapes are painted back to front until their areas add up to this many times the canvas: e^-5, less than 1 % of the
// ground, shows through.
constexpr double kCover = 5;

// Reaches the same average in every octave of size: the painting stops by area, so that large and small shapes cover
// alike. The radii follow r^-3 in number (Lee, Mumford, Huang 2001), which is r^-1 in area.
template <class Paint>
void cover(const Canvas& canvas, double smallest_px, double largest_px, Random& random, Paint paint) {
  const double extent = canvas.extent_px();
  double area = kCover * (extent + 2 * largest_px) * (extent + 2 * largest_px);
  while (area > 0) {
    // Inverse of the distribution of r^-3 between the limits.
    const double u = random.uniform();
    const double a = 1 / (smallest_px * smallest_px), b = 1 / (largest_px * largest_px);
    const double radius = 1 / std::sqrt(a - u * (a - b));
    const double low = canvas.origin_px() - largest_px, high = canvas.origin_px() + extent + largest_px;
    const cv::Point2d centre(random.uniform(low, high), random.uniform(low, high));
    area -= paint(centre, radius);
  }
}

std::vector<cv::Point2d> convex_corners(cv::Point2d centre, double radius, int count, double squash, Random& random) {
  std::vector<double> angles;
  for (int i = 0; i < count; ++i) angles.push_back(2 * kPi * (i + random.uniform(-0.3, 0.3)) / count);
  const double turn = random.uniform(0, 2 * kPi);
  std::vector<cv::Point2d> corners;
  for (const double angle : angles) {
    const double u = radius * std::cos(angle), v = radius * squash * std::sin(angle);
    corners.emplace_back(centre.x + u * std::cos(turn) - v * std::sin(turn),
                         centre.y + u * std::sin(turn) + v * std::cos(turn));
  }
  return corners;  // on an ellipse, therefore convex
}

void draw_step(Canvas& canvas, const TileSpec& spec) {
  const auto low = static_cast<float>(spec.edge_low), high = static_cast<float>(spec.edge_high);
  canvas.clear({low, low, low});
  const double angle = spec.edge_angle_deg * kPi / 180;
  const cv::Point2d centre((spec.size_px - 1) / 2.0, (spec.size_px - 1) / 2.0);
  const cv::Point2d across(std::cos(angle), std::sin(angle)), along(-across.y, across.x);
  const double far = 4 * canvas.extent_px();
  const std::vector<cv::Point2d> half{centre - far * along, centre + far * along,
                                      centre + far * along + far * across, centre - far * along + far * across};
  canvas.fill_convex(half, {high, high, high});
}

void multiply_by_field(Canvas& canvas, const cv::Mat& field, double strength) {
  cv::Mat factor;
  cv::exp(field * strength, factor);
  if (canvas.picture().channels() == 3) cv::merge(std::vector<cv::Mat>{factor, factor, factor}, factor);
  canvas.picture() = canvas.picture().mul(factor);
}

// A sum of few long waves in the logarithm of light: nothing shorter than the tile.
void draw_smooth(Canvas& canvas, const TileSpec& spec, Random& random) {
  canvas.clear({0.2f, 0.2f, 0.2f});
  struct Wave {
    double fx, fy, phase, amplitude;
  };
  std::vector<Wave> waves;
  for (int i = 0; i < 6; ++i) {
    const double angle = random.uniform(0, 2 * kPi), f = random.uniform(0.2, 1.0) / spec.size_px;
    waves.push_back({f * std::cos(angle), f * std::sin(angle), random.uniform(0, 2 * kPi), random.uniform(0.1, 0.3)});
  }
  cv::Mat& picture = canvas.picture();
  const int channels = picture.channels();
  for (int row = 0; row < picture.rows; ++row) {
    auto* line = picture.ptr<float>(row);
    const double y = canvas.origin_px() + row / canvas.scale();
    for (int column = 0; column < picture.cols; ++column) {
      const double x = canvas.origin_px() + column / canvas.scale();
      double sum = 0;
      for (const Wave& w : waves) sum += w.amplitude * std::cos(2 * kPi * (w.fx * x + w.fy * y) + w.phase);
      for (int channel = 0; channel < channels; ++channel)
        line[column * channels + channel] *= static_cast<float>(std::exp(sum));
    }
  }
}

}  // namespace

Light shape_light(const ShapeStyle& style, Random& random) {
  double level = random.log_uniform(kDarkest, kBrightest);
  level = kMeanReflectance * std::pow(level / kMeanReflectance, style.contrast);
  if (style.highlight_share > 0 && random.uniform() < style.highlight_share) level = random.log_uniform(1.5, 8);
  Light light{};
  double mean = 0;
  constexpr std::array<double, 3> kWeights{0.2126, 0.7152, 0.0722};
  for (std::size_t i = 0; i < 3; ++i) {
    light[i] = static_cast<float>(style.colour > 0 ? std::exp(style.colour * random.uniform(-1, 1)) : 1.0);
    mean += kWeights[i] * light[i];
  }
  for (float& value : light) value = static_cast<float>(value * level / mean);
  return light;
}

cv::Mat power_law_field(int samples, double exponent, Random& random) {
  cv::Mat noise(samples, samples, CV_32FC1), spectrum, field;
  for (int y = 0; y < samples; ++y)
    for (int x = 0; x < samples; ++x)  // uniform numbers suffice: every frequency sums very many of them
      noise.at<float>(y, x) = static_cast<float>(random.uniform(-1, 1));
  cv::dft(noise, spectrum, cv::DFT_COMPLEX_OUTPUT);
  for (int y = 0; y < samples; ++y) {
    const double fy = y <= samples / 2 ? y : y - samples;
    auto* line = spectrum.ptr<cv::Vec2f>(y);
    for (int x = 0; x < samples; ++x) {
      const double fx = x <= samples / 2 ? x : x - samples;
      const double f2 = fx * fx + fy * fy;
      line[x] *= f2 > 0 ? static_cast<float>(std::pow(f2, -exponent / 2)) : 0.0f;
    }
  }
  cv::dft(spectrum, field, cv::DFT_INVERSE | cv::DFT_REAL_OUTPUT | cv::DFT_SCALE);
  cv::Scalar mean, deviation;
  cv::meanStdDev(field, mean, deviation);
  return (field - mean[0]) / deviation[0];
}

void draw_leaves(Canvas& canvas, double smallest_px, double largest_px, const ShapeStyle& style, Random& random) {
  cover(canvas, smallest_px, largest_px, random, [&](cv::Point2d centre, double radius) {
    canvas.fill_disc(centre, radius, shape_light(style, random));
    return kPi * radius * radius;
  });
}

void draw_polygons(Canvas& canvas, double smallest_px, double largest_px, const ShapeStyle& style, Random& random) {
  cover(canvas, smallest_px, largest_px, random, [&](cv::Point2d centre, double radius) {
    const int corners = 3 + random.below(4);
    const double squash = random.uniform(0.4, 1);
    canvas.fill_convex(convex_corners(centre, radius, corners, squash, random), shape_light(style, random));
    return 2.2 * squash * radius * radius;  // mean area of such a polygon, near enough for covering
  });
}

void draw_blades(Canvas& canvas, double width_px, double length_px, const ShapeStyle& style, Random& random) {
  cover(canvas, 0.25 * length_px, 0.5 * length_px, random, [&](cv::Point2d foot, double half_length) {
    const double lean = 0.35 * random.normal(), width = width_px * random.uniform(0.5, 1.6);
    const cv::Point2d tip = foot + 2 * half_length * cv::Point2d(std::sin(lean), -std::cos(lean));
    const std::vector<cv::Point2d> blade{foot - cv::Point2d(width / 2, 0), foot + cv::Point2d(width / 2, 0), tip};
    canvas.fill_convex(blade, shape_light(style, random), {0, -0.15 / half_length});
    return width * half_length;
  });
}

void draw_stones(Canvas& canvas, double smallest_px, double largest_px, const ShapeStyle& style, Random& random) {
  cover(canvas, smallest_px, largest_px, random, [&](cv::Point2d centre, double radius) {
    const auto corners = convex_corners(centre, radius, 6 + random.below(4), random.uniform(0.6, 1), random);
    // A shadow to the lower right, then the stone, lit from the upper left.
    std::vector<cv::Point2d> shadow;
    for (const auto& corner : corners) shadow.push_back(corner + cv::Point2d(0.22 * radius, 0.28 * radius));
    canvas.fill_convex(shadow, {0.012f, 0.012f, 0.012f});
    canvas.fill_convex(corners, shape_light(style, random), {-0.35 / radius, -0.45 / radius});
    return 2.0 * radius * radius;
  });
}

void draw_scene(Canvas& canvas, const TileSpec& spec) {
  Random random = Random(spec.random_key).branch(1);
  const ShapeStyle style{spec.contrast, spec.colour, spec.highlight_share};
  const double s = spec.size_factor;
  canvas.clear({0.18f, 0.18f, 0.18f});
  switch (spec.texture) {
    case Texture::polygons: draw_polygons(canvas, 8 * s, 90 * s, style, random); break;
    case Texture::dead_leaves: draw_leaves(canvas, 1 * s, 80 * s, style, random); break;
    case Texture::mixed: {
      draw_leaves(canvas, 2 * s, 40 * s, style, random);
      const double extent = canvas.extent_px();
      for (double area = 0.5 * extent * extent; area > 0;) {
        const double radius = random.log_uniform(15 * s, 80 * s);
        const cv::Point2d centre(canvas.origin_px() + random.uniform(0, extent),
                                 canvas.origin_px() + random.uniform(0, extent));
        canvas.fill_convex(convex_corners(centre, radius, 3 + random.below(4), 1, random), shape_light(style, random));
        area -= 2.2 * radius * radius;
      }
      multiply_by_field(canvas, power_law_field(canvas.picture().cols, 1.3, random), 0.12);
      break;
    }
    case Texture::grass:
      draw_blades(canvas, 1.6 * s, 34 * s, {0.7 * spec.contrast, spec.colour, spec.highlight_share}, random);
      break;
    case Texture::gravel:
      draw_stones(canvas, 2 * s, 22 * s, {0.7 * spec.contrast, spec.colour, spec.highlight_share}, random);
      multiply_by_field(canvas, power_law_field(canvas.picture().cols, 0.9, random), 0.10);
      break;
    case Texture::step_edges: draw_step(canvas, spec); break;
    case Texture::power_law:
      multiply_by_field(canvas, power_law_field(canvas.picture().cols, 1.2, random), 0.6 * spec.contrast);
      break;
    case Texture::smooth: draw_smooth(canvas, spec, random); break;
    case Texture::flat: {
      const auto level = static_cast<float>(spec.edge_high);
      canvas.clear({level, level, level});
      break;
    }
  }
}

}  // namespace focusfall::render
