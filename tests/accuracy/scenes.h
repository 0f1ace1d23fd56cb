// Frames for the plane and cause sets: a ground, a standing figure, a background, all textured at random.
#pragma once

#include <optional>

#include "analysis/optics/prediction.h"
#include "tests/render/frame.h"

namespace focusfall::accuracy {

enum class GroundTexture { polygons, leaves, gravel, grass };
const char* ground_name(GroundTexture texture);
inline bool is_bold(GroundTexture t) { return t == GroundTexture::polygons || t == GroundTexture::leaves; }

// The limit of these frames: 2 px of a picture delivered as wide as it is.
inline constexpr double kAcceptablePx = 2;
inline constexpr int kSceneWidth = 1200, kSceneHeight = 800;

struct SceneSpec {
  std::uint64_t key = 0;
  double gradient = 0.02;            // k: signed blur per px down the ground
  double contact_disc = 0;           // signed blur where the subject meets the ground
  bool ground = true;                // false: nothing but the figure and the background
  bool figure = true;                // false: the aim lies on the ground
  bool plain_figure = false;         // a figure without any marking: nothing to measure inside it
  std::optional<double> background_disc{}; // |signed blur| of the background; else three to ten times as far as the subject
  GroundTexture texture = GroundTexture::polygons;
  double lambda_n_over_p = 0;        // diffraction
  cv::Vec2d subject_motion{0, 0}, camera_motion{0, 0};
};

struct Scene {
  render::FrameSpec frame;
  cv::Rect aim;                      // px
  cv::Point2d contact;               // px
  render::PlaneTruth plane;          // where there is a ground
  double subject_depth_m = 0;        // from the lens
};

Scene make_scene(const SceneSpec& spec);

// What the program would know about the frame from its file.
OpticalSetup setup_of(const Scene& scene, bool with_focus_distance = true);

}  // namespace focusfall::accuracy
