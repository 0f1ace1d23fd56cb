#include "tests/accuracy/scenes.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <mutex>
#include <numbers>
#include <opencv2/imgproc.hpp>

#include "tests/render/paint.h"
#include "tests/render/scene.h"

namespace focusfall::accuracy {
namespace {

using render::Canvas;
using render::Random;
using render::Surface;
using TexturePtr = std::shared_ptr<const render::MipTexture>;

constexpr int kTileTexels = 1024;
constexpr double kTexelsPerPx = 2.5;       // at the subject: a texel of .4 px, read without interpolation, adds .03 px^2
constexpr double kPitchUm = 30;            // 36 mm over 1200 px
constexpr int kTexturesOfAKind = 4;        // drawn once per family of keys and shared by its frames
constexpr double kFigureWidthPx = 250, kFigureHeightPx = 430;

// Shapes of a ground, as large in the picture at the subject as they are drawn here divided by kTexelsPerPx.
cv::Mat ground_picture(GroundTexture kind, Random random) {
  Canvas canvas(cv::Size(kTileTexels, kTileTexels), 4, 1);
  canvas.clear({0.18f, 0.18f, 0.18f});
  const render::ShapeStyle style{.contrast = random.uniform(0.6, 1), .colour = 0.15};
  switch (kind) {
    case GroundTexture::polygons: render::draw_polygons(canvas, 22, 200, style, random); break;
    case GroundTexture::leaves: render::draw_leaves(canvas, 6, 180, style, random); break;
    case GroundTexture::gravel: render::draw_stones(canvas, 6, 55, {.contrast = 0.7, .colour = 0.1}, random); break;
    case GroundTexture::grass: render::draw_blades(canvas, 4.5, 95, {.contrast = 0.7, .colour = 0.15}, random); break;
  }
  return canvas.picture();
}

// A figure: head, trunk and legs cut out of a patterned cloth.
cv::Mat figure_picture(bool plain, Random random) {
  const int width = static_cast<int>(kFigureWidthPx * kTexelsPerPx), height = static_cast<int>(kFigureHeightPx * kTexelsPerPx);
  // Nothing to measure means that the outline, too, lies outside the aim: a plain wide board.
  Canvas cloth(cv::Size(plain ? 2 * width : width, height), 4, 1);
  const auto level = static_cast<float>(random.uniform(0.25, 0.5));
  cloth.clear({level, level, level});
  if (plain) return cloth.picture();
  Canvas square(cv::Size(std::max(width, height), std::max(width, height)), 4, 1);
  square.clear({level, level, level});
  render::draw_polygons(square, 18, 130, {.contrast = random.uniform(0.6, 1), .colour = 0.3}, random);
  square.picture()(cv::Rect(0, 0, width, height)).copyTo(cloth.picture());
  Canvas mask(cv::Size(width, height), 4, 1);
  const double w = width, h = height;
  const render::Light white{1, 1, 1};
  mask.fill_limb({w * 0.5, h * 0.10}, w * 0.13, {w * 0.5, h * 0.14}, w * 0.12, white);
  const std::vector<cv::Point2d> trunk{{w * 0.12, h * 0.24}, {w * 0.35, h * 0.19}, {w * 0.65, h * 0.19}, {w * 0.88, h * 0.24}, {w * 0.90, h * 0.62}, {w * 0.10, h * 0.62}};
  mask.fill_convex(trunk, white);
  for (const double side : {0.28, 0.72}) mask.fill_limb({w * side, h * 0.6}, w * 0.17, {w * (0.5 + 0.95 * (side - 0.5)), h * 0.97}, w * 0.10, white);
  const std::vector<cv::Point2d> feet{{w * 0.14, h * 0.95}, {w * 0.86, h * 0.95}, {w * 0.9, h}, {w * 0.1, h}};
  cv::Mat& out = cloth.picture();
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < width; ++x) out.at<cv::Vec4f>(y, x) *= mask.picture().at<cv::Vec4f>(y, x)[3];
  return out;
}

TexturePtr shared_texture(const std::string& name, bool tiled, const std::function<cv::Mat()>& draw) {
  static std::mutex lock;
  static std::map<std::string, TexturePtr> textures;
  const std::lock_guard guard(lock);
  auto& texture = textures[name];
  if (!texture) texture = std::make_shared<render::MipTexture>(draw(), tiled);
  return texture;
}

// Textures of the tuning and the held-out family are different ones.
TexturePtr ground_texture(GroundTexture kind, std::uint64_t key) {
  const std::uint64_t family = key / 1'000'000, index = key % kTexturesOfAKind;
  const std::uint64_t drawn = family * 1000 + static_cast<std::uint64_t>(kind) * 10 + index;
  return shared_texture("ground " + std::to_string(drawn), true, [&] { return ground_picture(kind, Random(drawn)); });
}

TexturePtr figure_texture(bool plain, std::uint64_t key) {
  const std::uint64_t drawn = key / 1'000'000 * 1000 + 500 + (plain ? 50 : 0) + key % kTexturesOfAKind;
  return shared_texture("figure " + std::to_string(drawn), false, [&] { return figure_picture(plain, Random(drawn)); });
}

struct Layout {
  render::LensSpec lens;
  double height_m = 1, pitch_rad = 0, depth_m = 10;
  cv::Point2d contact;
};

// A lens and a camera height that give the wanted gradient: k = f cos(pitch) / (N h).
Layout layout_of(const SceneSpec& spec, Random& random) {
  constexpr double kFocal[] = {85, 135, 200, 300, 400}, kStops[] = {1.8, 2, 2.8, 4, 5.6};
  Layout best;
  for (int attempt = 0; attempt < 200; ++attempt) {
    Layout layout;
    layout.lens = {.focal_length_mm = kFocal[random.below(5)], .f_number = kStops[random.below(5)], .pitch_um = kPitchUm, .width_px = kSceneWidth, .height_px = kSceneHeight};
    // The figure is 1.75 m tall and kFigureHeightPx high.
    const double f = layout.lens.focal_length_mm / 1000;
    layout.depth_m = 1.75 * f / (kFigureHeightPx * kPitchUm * 1e-6);
    layout.contact = {kSceneWidth * random.uniform(0.35, 0.65), kSceneHeight * random.uniform(0.66, 0.84)};
    layout.height_m = f / layout.lens.f_number / spec.gradient;
    const double ty = (layout.contact.y - (kSceneHeight - 1) / 2.0) * kPitchUm * 1e-6 / f;
    // Foot at depth d and slope ty below the axis: h = d (ty cos + sin).
    const double sine = layout.height_m / layout.depth_m / std::hypot(1, ty);
    best = layout;
    if (sine > 0.85) continue;
    layout.pitch_rad = std::asin(sine) - std::atan(ty);
    best = layout;
    if (layout.height_m > 0.3 && layout.height_m < 15) break;
  }
  return best;
}

}  // namespace

const char* ground_name(GroundTexture texture) {
  constexpr const char* kNames[] = {"polygons", "dead leaves", "gravel", "grass"};
  return kNames[static_cast<int>(texture)];
}

Scene make_scene(const SceneSpec& spec) {
  Random random(spec.key);
  Layout layout = layout_of(spec, random);
  Scene scene;
  render::LensSpec& lens = layout.lens;
  if (spec.lambda_n_over_p > 0 || spec.background_disc) {
    // Only for frames without a call on the plane: the f-number follows from what is asked.
    if (spec.lambda_n_over_p > 0) lens.f_number = spec.lambda_n_over_p * kPitchUm / 0.55;
  }
  lens.focus_m = render::focus_for_disc_m(lens, layout.depth_m, spec.contact_disc);
  scene.subject_depth_m = layout.depth_m;
  scene.contact = layout.contact;
  const double step = render::metres_per_px(lens, layout.depth_m);
  const double below = (layout.contact.y - (kSceneHeight - 1) / 2.0) * step;
  double background = layout.depth_m * random.uniform(3, 10);
  if (spec.background_disc) {
    // |disc| of the background: scale (1/s - 1/b) with scale from two depths.
    const double scale = (render::signed_disc_px(lens, layout.depth_m) - render::signed_disc_px(lens, 2 * layout.depth_m)) * 2 * layout.depth_m;
    const double inverse = 1 / layout.depth_m - (*spec.background_disc + spec.contact_disc) / scale;
    background = inverse > 1 / (30 * layout.depth_m) ? 1 / inverse : 30 * layout.depth_m;
  }
  std::vector<Surface>& surfaces = scene.frame.surfaces;
  if (spec.figure) {
    const double texel = step / kTexelsPerPx;
    const double left = (layout.contact.x - (kSceneWidth - 1) / 2.0 - kFigureWidthPx / 2 * (spec.plain_figure ? 2 : 1)) * step;
    Surface figure = render::billboard(figure_texture(spec.plain_figure, spec.key), {.depth_m = layout.depth_m, .left_m = left, .bottom_m = 0, .texel_m = texel});
    figure.origin[1] = below - kFigureHeightPx * step;
    figure.motion_px = spec.subject_motion;
    surfaces.push_back(figure);
  }
  if (spec.ground) {
    // Texels that look square at the contact: one row of the picture there spans this much ground.
    const double depth_per_row = layout.depth_m * layout.depth_m * std::cos(layout.pitch_rad) / (layout.height_m * layout.depth_m / step);
    Surface ground = render::ground(ground_texture(spec.texture, spec.key),
                                    {.height_m = layout.height_m, .pitch_deg = layout.pitch_rad * 180 / std::numbers::pi, .texel_x_m = step / kTexelsPerPx,
                                     .texel_z_m = depth_per_row / std::cos(layout.pitch_rad) / kTexelsPerPx, .farthest_m = background});
    ground.origin += random.uniform(0, kTileTexels) * ground.along_u + random.uniform(0, kTileTexels) * ground.along_v;
    scene.plane = render::plane_truth(lens, ground);
    surfaces.push_back(ground);
  }
  const double background_step = render::metres_per_px(lens, background) / 1.5;
  Surface wall;
  wall.texture = ground_texture(GroundTexture::leaves, spec.key + 1);
  wall.origin = {0, 0, background};
  wall.along_u = {background_step, 0, 0};
  wall.along_v = {0, background_step, 0};
  surfaces.push_back(wall);
  scene.frame.lens = lens;
  scene.frame.camera_motion_px = spec.camera_motion;
  scene.frame.wavelength_um = spec.lambda_n_over_p > 0 ? 0.55 : 0;
  scene.frame.exposure = random.uniform(0.8, 1.4);
  scene.frame.effort = 0.6;
  scene.frame.random_key = spec.key;
  scene.frame.camera = {.iso_speed = random.log_uniform(100, 3200), .jpeg_quality = 85 + random.below(11)};
  // The chest of the figure, or a box on the ground about the contact.
  const cv::Point2d middle = spec.figure ? cv::Point2d(layout.contact.x, layout.contact.y - 0.60 * kFigureHeightPx) : layout.contact;
  const int side = 192;
  scene.aim = {static_cast<int>(middle.x) - side / 2, std::clamp(static_cast<int>(middle.y) - side / 2, 0, kSceneHeight - side), side, side};
  if (!spec.figure) scene.contact = {scene.aim.x + side / 2.0, scene.aim.y + side / 2.0};
  return scene;
}

OpticalSetup setup_of(const Scene& scene, bool with_focus_distance) {
  const render::LensSpec& lens = scene.frame.lens;
  OpticalSetup setup;
  setup.focal_length_mm = lens.focal_length_mm;
  setup.f_number = lens.f_number;
  if (with_focus_distance) {
    const double s = render::focus_from_sensor_m(lens);
    setup.focus_distance_m = Interval{s, 0.97 * s, 1.03 * s};
  }
  setup.pixel_pitch_um = Interval{lens.pitch_um, lens.pitch_um, lens.pitch_um};
  setup.width_px = lens.width_px;
  setup.height_px = lens.height_px;
  setup.exposure_time_s = 0.005;
  setup.iso_speed = scene.frame.camera.iso_speed;
  return setup;
}

}  // namespace focusfall::accuracy
