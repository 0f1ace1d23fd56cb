// The invented shoot, frame by frame.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "tests/render/frame.h"

namespace focusfall::render {

// One frame before it is rendered. `build` draws the scene, so that a list of all frames costs nothing.
struct SampleFrame {
  std::string file;                 // name without .jpg
  std::string scene;                // "regatta", "stage", "bench"
  std::string what;                 // what was done to it, in a few words
  std::string focus;                // verdict that the truth calls for
  std::string cause;                // "" where there is none
  LensSpec lens;                    // as displayed: width and height before the turn into the stored frame
  double aim_depth_m = 0;           // depth of what the aim is meant for
  cv::Rect aim;                     // px, as displayed
  bool record_aim = true;           // false: the file holds no focus area
  cv::Vec2d subject_motion_px{0, 0}, camera_motion_px{0, 0};
  double wavelength_um = 0;
  double exposure = 1;
  CameraSpec camera{};
  CaptureData data{};
  int orientation = 1;              // 1 or 8
  int plane = -1;                   // index of the surface that carries the subject, -1 = none in the frame
  std::function<std::vector<Surface>(const SampleFrame&)> build;
};

std::vector<SampleFrame> regatta_frames();
std::vector<SampleFrame> stage_frames();
std::vector<SampleFrame> bench_frames();

}  // namespace focusfall::render
