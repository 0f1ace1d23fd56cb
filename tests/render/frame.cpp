#include "tests/render/frame.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <opencv2/core/utility.hpp>

#include "tests/render/optics.h"

namespace focusfall::render {
namespace {

// Rays for a pixel in focus, and more for a wide disc, whose share of light per ray would be too coarse.
constexpr double kRaysInFocus = 36, kRaysPerDiscPx = 2.2, kMostRays = 160;
// Width of the texture that a ray reads, as a part of the side of its share of the disc's area.
constexpr double kShareRead = 0.6;

// What of a surface does not change along a row.
struct Prepared {
  const Surface* surface;
  cv::Vec3d normal, u_axis, v_axis;  // u = u_axis . (hit - origin), texels
  double height;                     // normal . origin
  cv::Vec2d motion;                  // px
  cv::Rect2d seen;                   // part of the frame it can reach, px
  bool facing;                       // upright and square to the axis: one depth, axes along x and y
};

struct LensNumbers {
  double px_per_tangent, centre_x, centre_y, focus_m, opening_radius_m, disc_scale;
  double tangent_per_px, per_focus_m;
};

LensNumbers numbers_of(const LensSpec& lens) {
  const double v = image_distance_m(lens);
  const double opening = lens.focal_length_mm / lens.f_number / 1000;
  const double px_per_tangent = v / (lens.pitch_um * 1e-6);
  return {px_per_tangent, (lens.width_px - 1) / 2.0, (lens.height_px - 1) / 2.0,
          lens.focus_m,   opening / 2,               opening * px_per_tangent,
          1 / px_per_tangent, 1 / lens.focus_m};
}

cv::Rect2d reach_of(const Surface& surface, const LensSpec& lens, const cv::Vec2d& motion) {
  const cv::Rect2d everything(-1e9, -1e9, 2e9, 2e9);
  if (surface.texture->tiled()) return everything;
  double left = 1e9, right = -1e9, top = 1e9, bottom = -1e9, blur = 0;
  for (int corner = 0; corner < 4; ++corner) {
    const cv::Vec3d point = surface.origin + (corner & 1) * surface.texture->width() * surface.along_u +
                            (corner >> 1) * surface.texture->height() * surface.along_v;
    if (point[2] <= 0.01) return everything;
    const cv::Point2d at = project(lens, point);
    left = std::min(left, at.x);
    right = std::max(right, at.x);
    top = std::min(top, at.y);
    bottom = std::max(bottom, at.y);
    blur = std::max(blur, std::abs(signed_disc_px(lens, point[2])));
  }
  const double margin = blur / 2 + std::abs(motion[0]) / 2 + std::abs(motion[1]) / 2 + 2;
  return {left - margin, top - margin, right - left + 2 * margin, bottom - top + 2 * margin};
}

Prepared prepare(const Surface& surface, const FrameSpec& spec) {
  Prepared p;
  p.surface = &surface;
  p.normal = surface.along_u.cross(surface.along_v);
  p.height = p.normal.dot(surface.origin);
  // The two axes are at right angles, therefore each coordinate is a plain projection.
  p.u_axis = surface.along_u / surface.along_u.dot(surface.along_u);
  p.v_axis = surface.along_v / surface.along_v.dot(surface.along_v);
  p.facing = surface.along_u[1] == 0 && surface.along_u[2] == 0 && surface.along_v[0] == 0 && surface.along_v[2] == 0;
  p.motion = surface.motion_px + spec.camera_motion_px;
  p.seen = reach_of(surface, spec.lens, p.motion);
  return p;
}

std::uint64_t mix(std::uint64_t z) {
  z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9ULL;
  z = (z ^ (z >> 27)) * 0x94D049BB133111EBULL;
  return z ^ (z >> 31);
}

// Five numbers in [0, 1): position in the pixel, in the lens, in time. Additive recurrence with the powers of the
// positive root of x^6 = x + 1 (Roberts 2018, "The unreasonable effectiveness of quasirandom sequences"), shifted
// anew for every pixel (Cranley, Patterson 1976).
// Kept as fractions of 2^32, which wrap by themselves.
struct Sequence {
  explicit Sequence(std::uint64_t key) {
    for (std::uint32_t& value : state) {
      key += 0x9E3779B97F4A7C15ULL;
      value = static_cast<std::uint32_t>(mix(key) >> 32);
    }
  }
  void next() {
    // .8812714616, .7766393891, .6844301296, .6031687407, .5315553978 of 2^32, made odd.
    static constexpr std::array<std::uint32_t, 5> kStep{3785032107U, 3335640777U, 2939605023U, 2590590015U, 2283013049U};
    for (std::size_t i = 0; i < 5; ++i) state[i] += kStep[i];
  }
  std::array<double, 5> at() const {
    std::array<double, 5> values;
    for (std::size_t i = 0; i < 5; ++i) values[i] = state[i] * 0x1.0p-32;
    return values;
  }
  std::array<std::uint32_t, 5> state{};
};

// A point of the unit disc from two numbers, area kept (Shirley, Chiu 1997). The angle stays within 45 degrees of an
// axis, where these series are exact to 1e-6.
cv::Vec2d disc_point(double a, double b) {
  const double x = 2 * a - 1, y = 2 * b - 1;
  const bool wide = std::abs(x) > std::abs(y);
  const double radius = wide ? x : y, other = wide ? y : x;
  // Nowhere is radius 0 but in the middle; the addend changes nothing else.
  const double t = std::numbers::pi / 4 * (other / (radius + 1e-300)), t2 = t * t;
  const double cosine = 1 - t2 / 2 * (1 - t2 / 12 * (1 - t2 / 30 * (1 - t2 / 56)));
  const double sine = t * (1 - t2 / 6 * (1 - t2 / 20 * (1 - t2 / 42)));
  return {radius * (wide ? cosine : sine), radius * (wide ? sine : cosine)};
}

// A surface at one pixel: which mip level its rays read.
struct Layer {
  const Prepared* prepared;
  int level;
};

class Tracer {
 public:
  explicit Tracer(const FrameSpec& spec) : spec_(spec), lens_(numbers_of(spec.lens)) {
    for (const Surface& surface : spec.surfaces) prepared_.push_back(prepare(surface, spec));
  }

  cv::Vec3f pixel(int x, int y) const {
    std::array<Layer, 64> layers;
    std::array<double, 64> texels_per_px{};
    int count = 0;
    double widest = 0;
    for (const Prepared& p : prepared_) {
      if (count == 64 || !p.seen.contains(cv::Point2d(x, y))) continue;
      const double depth = visible_depth(p, x, y);
      if (depth <= 0) continue;
      widest = std::max(widest, std::min(300.0, std::abs(lens_.disc_scale * (1 / depth - 1 / lens_.focus_m))));
      texels_per_px[static_cast<std::size_t>(count)] = texels_per_px_at(p, x, y, depth);
      layers[static_cast<std::size_t>(count++)] = {&p, 0};
    }
    const int rays =
        static_cast<int>(std::clamp(kRaysInFocus + kRaysPerDiscPx * widest, kRaysInFocus, kMostRays) * spec_.effort);
    for (int i = 0; i < count; ++i) set_level(layers[static_cast<std::size_t>(i)],
                                              texels_per_px[static_cast<std::size_t>(i)], x, y, rays);
    Sequence sequence(mix(spec_.random_key * 0xD1342543DE82EF95ULL) + static_cast<std::uint64_t>(y) * 0x100000001B3ULL +
                      static_cast<std::uint64_t>(x) * 0x9E3779B97F4A7C55ULL);
    std::array<double, 3> sum{};
    for (int i = 0; i < rays; ++i, sequence.next()) {
      // Ray by ray in turn through the four images of the low-pass filter.
      const double fx = x + spec_.low_pass_px * ((i & 1) - 0.5), fy = y + spec_.low_pass_px * ((i >> 1 & 1) - 0.5);
      trace(fx, fy, sequence.at(), {layers.data(), static_cast<std::size_t>(count)}, sum);
    }
    const double scale = 1.0 / rays;
    return {static_cast<float>(sum[0] * scale), static_cast<float>(sum[1] * scale), static_cast<float>(sum[2] * scale)};
  }

 private:
  // Depth of the surface along the ray through the middle of the lens; <= 0 where there is none.
  double depth_at(const Prepared& p, double x, double y) const {
    const cv::Vec3d direction((x - lens_.centre_x) / lens_.px_per_tangent, (y - lens_.centre_y) / lens_.px_per_tangent, 1);
    const double along = p.normal.dot(direction);
    if (std::abs(along) < 1e-30) return -1;
    return p.height / along;
  }

  // Above the horizon of an endless plane the rim of the lens may still see it: far away.
  double visible_depth(const Prepared& p, double x, double y) const {
    const double depth = depth_at(p, x, y);
    if (p.surface->texture->tiled() && (depth <= 0 || depth > p.surface->farthest_m)) return std::min(1e4, p.surface->farthest_m);
    return depth;
  }

  // The finer of the two scales: what is seen at a slant keeps its detail across and is averaged by the rays.
  double texels_per_px_at(const Prepared& p, double x, double y, double depth) const {
    const double step = depth / lens_.px_per_tangent;
    const double next = visible_depth(p, x, y + 1);
    const double across = step * cv::norm(p.u_axis);
    if (next <= 0) return across;
    const cv::Vec3d here(depth * (x - lens_.centre_x) / lens_.px_per_tangent, depth * (y - lens_.centre_y) / lens_.px_per_tangent, depth);
    const cv::Vec3d there(next * (x - lens_.centre_x) / lens_.px_per_tangent, next * (y + 1 - lens_.centre_y) / lens_.px_per_tangent, next);
    return std::min(across, std::abs(p.v_axis.dot(there - here)));
  }

  void set_level(Layer& layer, double texels_per_px, double x, double y, int rays) const {
    const double depth = visible_depth(*layer.prepared, x, y);
    const double disc = std::abs(lens_.disc_scale * (1 / depth - 1 / lens_.focus_m));
    const double motion = cv::norm(layer.prepared->motion);
    const double area = std::numbers::pi / 4 * disc * disc + 1 + disc + motion * (1 + disc);
    const double read = kShareRead * std::sqrt(area / rays) * texels_per_px;
    const int level = read > 1 ? static_cast<int>(std::log2(read)) : 0;
    layer.level = std::min(level, layer.prepared->surface->texture->levels() - 1);
  }

  void trace(double x, double y, const std::array<double, 5>& at, std::span<const Layer> layers, std::array<double, 3>& sum) const {
    const cv::Vec2d lens_point = lens_.opening_radius_m * disc_point(at[2], at[3]);
    const double px = x + at[0] - 0.5 - lens_.centre_x, py = y + at[1] - 0.5 - lens_.centre_y, time = at[4] - 0.5;
    float open = 1;
    for (const Layer& layer : layers) {
      const Texel* texel = hit(layer, px - time * layer.prepared->motion[0], py - time * layer.prepared->motion[1], lens_point);
      if (texel == nullptr || (*texel)[3] <= 0) continue;
      const float weight = open * static_cast<float>(layer.prepared->surface->brightness);
      for (std::size_t i = 0; i < 3; ++i) sum[i] += static_cast<double>(weight * (*texel)[i]);
      open *= 1 - (*texel)[3];
      if (open < 1e-3f) return;
    }
    for (std::size_t i = 0; i < 3; ++i) sum[i] += static_cast<double>(open * spec_.air[i]);
  }

  // What the ray from lens_point to the place (px, py), counted from the axis, meets of one surface.
  const Texel* hit(const Layer& layer, double px, double py, const cv::Vec2d& lens_point) const {
    const Prepared& p = *layer.prepared;
    const cv::Vec3d& o = p.surface->origin;
    // The ray leaves the lens at lens_point and meets, in the plane of focus, the ray through the middle.
    const double dx = px * lens_.tangent_per_px - lens_point[0] * lens_.per_focus_m;
    const double dy = py * lens_.tangent_per_px - lens_point[1] * lens_.per_focus_m;
    if (p.facing)
      return p.surface->texture->at(p.u_axis[0] * (lens_point[0] + o[2] * dx - o[0]), p.v_axis[1] * (lens_point[1] + o[2] * dy - o[1]), layer.level);
    const double along = p.normal[0] * dx + p.normal[1] * dy + p.normal[2];
    const double depth = (p.height - p.normal[0] * lens_point[0] - p.normal[1] * lens_point[1]) / along;
    if (!(depth > 0) || depth > p.surface->farthest_m) return nullptr;
    const double hx = lens_point[0] + depth * dx - o[0], hy = lens_point[1] + depth * dy - o[1], hz = depth - o[2];
    return p.surface->texture->at(p.u_axis[0] * hx + p.u_axis[1] * hy + p.u_axis[2] * hz,
                                  p.v_axis[0] * hx + p.v_axis[1] * hy + p.v_axis[2] * hz, layer.level);
  }

  const FrameSpec& spec_;
  LensNumbers lens_;
  std::vector<Prepared> prepared_;
};

// Diffraction of the whole frame: a product with the OTF of a circular opening, by FFT over a mirrored border.
void diffract(cv::Mat& light, double lambda_n_over_p) {
  const int border = static_cast<int>(std::ceil(10 * lambda_n_over_p));
  std::vector<cv::Mat> planes;
  cv::split(light, planes);
  for (cv::Mat& plane : planes) {
    cv::Mat wide, spectrum;
    const int width = cv::getOptimalDFTSize(plane.cols + 2 * border), height = cv::getOptimalDFTSize(plane.rows + 2 * border);
    cv::copyMakeBorder(plane, wide, border, height - plane.rows - border, border, width - plane.cols - border,
                       cv::BORDER_REFLECT_101);
    cv::dft(wide, spectrum, cv::DFT_COMPLEX_OUTPUT);
    for (int y = 0; y < height; ++y) {
      const double fy = static_cast<double>(y <= height / 2 ? y : y - height) / height;
      auto* line = spectrum.ptr<cv::Vec2f>(y);
      for (int x = 0; x < width; ++x) {
        const double fx = static_cast<double>(x <= width / 2 ? x : x - width) / width;
        line[x] *= static_cast<float>(diffraction_otf(lambda_n_over_p, std::hypot(fx, fy)));
      }
    }
    cv::dft(spectrum, wide, cv::DFT_INVERSE | cv::DFT_REAL_OUTPUT | cv::DFT_SCALE);
    plane = wide(cv::Rect(border, border, plane.cols, plane.rows)).clone();
  }
  cv::merge(planes, light);
}

}  // namespace

double image_distance_m(const LensSpec& lens) {
  const double f = lens.focal_length_mm / 1000;
  return std::isinf(lens.focus_m) ? f : lens.focus_m * f / (lens.focus_m - f);
}

double focus_from_sensor_m(const LensSpec& lens) { return lens.focus_m + image_distance_m(lens); }

double working_f_number(const LensSpec& lens) {
  return lens.f_number * image_distance_m(lens) / (lens.focal_length_mm / 1000);
}

double signed_disc_px(const LensSpec& lens, double depth_m) {
  return numbers_of(lens).disc_scale * (1 / depth_m - 1 / lens.focus_m);
}

double focus_for_disc_m(const LensSpec& lens, double depth_m, double signed_disc) {
  // disc = A / p * v(s) (1/d - 1/s), with v(s) = s f / (s - f): linear in 1/s after multiplying by (1 - f/s).
  const double f = lens.focal_length_mm / 1000;
  const double scale = f / lens.f_number * f / (lens.pitch_um * 1e-6);
  const double inverse = (scale / depth_m - signed_disc) / (scale - signed_disc * f);
  return 1 / inverse;
}

cv::Point2d project(const LensSpec& lens, const cv::Vec3d& point) {
  const LensNumbers n = numbers_of(lens);
  return {n.centre_x + n.px_per_tangent * point[0] / point[2], n.centre_y + n.px_per_tangent * point[1] / point[2]};
}

double metres_per_px(const LensSpec& lens, double depth_m) { return depth_m / numbers_of(lens).px_per_tangent; }

PlaneTruth plane_truth(const LensSpec& lens, const Surface& surface) {
  // On the plane n . P = k: 1/z = (n_x tx + n_y ty + n_z) / k, tx = (x - cx) / px_per_tangent.
  const LensNumbers n = numbers_of(lens);
  const cv::Vec3d normal = surface.along_u.cross(surface.along_v);
  const double height = normal.dot(surface.origin);
  PlaneTruth truth;
  truth.x_gradient = n.disc_scale * normal[0] / height / n.px_per_tangent;
  truth.y_gradient = n.disc_scale * normal[1] / height / n.px_per_tangent;
  truth.offset = n.disc_scale * (normal[2] / height - 1 / n.focus_m) - truth.x_gradient * n.centre_x - truth.y_gradient * n.centre_y;
  return truth;
}

cv::Mat render_linear_frame(const FrameSpec& spec) {
  cv::Mat light(spec.lens.height_px, spec.lens.width_px, CV_32FC3);
  const Tracer tracer(spec);
  cv::parallel_for_(cv::Range(0, light.rows), [&](const cv::Range& rows) {
    for (int y = rows.start; y < rows.end; ++y)
      for (int x = 0; x < light.cols; ++x) light.at<cv::Vec3f>(y, x) = tracer.pixel(x, y);
  });
  if (spec.wavelength_um > 0) diffract(light, spec.wavelength_um * working_f_number(spec.lens) / spec.lens.pitch_um);
  return light * spec.exposure;
}

Picture render_frame(const FrameSpec& spec) {
  return develop(render_linear_frame(spec), spec.camera, Random(spec.random_key).branch(2));
}

ClippedTruth clipped_truth(const cv::Mat& rgb, cv::Rect area) {
  if (area.area() == 0) area = {0, 0, rgb.cols, rgb.rows};
  std::array<int, 3> channel{};
  int any = 0, two = 0;
  for (int y = area.y; y < area.y + area.height; ++y) {
    for (int x = area.x; x < area.x + area.width; ++x) {
      const auto& pixel = rgb.at<cv::Vec3b>(y, x);
      int clipped = 0;
      for (int i = 0; i < 3; ++i) {
        channel[static_cast<std::size_t>(i)] += pixel[i] == 255;
        clipped += pixel[i] == 255;
      }
      any += clipped > 0;
      two += clipped > 1;
    }
  }
  const double pixels = area.area();
  return {channel[0] / pixels, channel[1] / pixels, channel[2] / pixels, any / pixels, two / pixels};
}

}  // namespace focusfall::render
