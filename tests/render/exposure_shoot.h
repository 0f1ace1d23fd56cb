// A shoot of one static scene at many exposures, with its truth: what a diaphragm, a shutter, the light and the tone
// curve of a picture do to levels. No lens is traced; the scene is a picture of linear light.
#pragma once

#include <cstdint>
#include <opencv2/core.hpp>
#include <vector>

#include "tests/render/camera.h"

namespace focusfall::render {

enum class ToneCurve { srgb, s_shaped };
enum class LightCourse { steady, drift, cloud };

struct ShootSpec {
  std::uint64_t key = 1;
  int frames = 40;
  int width_px = 768;
  int height_px = 512;
  ToneCurve curve = ToneCurve::srgb;
  LightCourse light = LightCourse::steady;
  double light_change_ev = 1;         // of a drift or a cloud
  double repeatability_ev = 0.015;    // standard deviation of diaphragm and shutter together
  double wrong_f_number = 0;          // this mark is off by wrong_ev; 0: none
  double wrong_ev = 0;
  double bright_ev = 0;               // added to all exposures: more than 0 clips more of the scene
  double shake_px = 2;                // frames are displaced by up to this
};

struct ShootFrame {
  double f_number = 0, exposure_time_s = 0, iso_speed = 100;   // as marked
  double exposure_ev = 0;        // log2(t S / N^2) at exact values
  double light_ev = 0;           // what the light adds
  double error_ev = 0;           // what the camera adds: mark and repeatability
  double gain_ev = 0;            // all together, of scene light to picture light
  double taken_at_s = 0;
  Picture picture;               // after its JPEG round trip
};

struct Shoot {
  cv::Mat scene;                 // CV_32FC3 linear, R, G, B; picture light is scene x 2^gain_ev, clipped at 1
  std::vector<ShootFrame> frames;
};

// Marks from f/1.4 to f/16 in full stops, round after round, with times that change from frame to frame, so that
// neither control is locked to the other or to the order in time. Wide open the corners darken by .7 stop, one stop
// down by .25.
Shoot render_shoot(const ShootSpec& spec);

// Level of the largest channel above which a share of the scene's pixels lies, in stops from picture clipping at gain 0.
double highlight_truth_ev(const cv::Mat& scene, double share);

}  // namespace focusfall::render
