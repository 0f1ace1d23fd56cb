// Frames of simple scenes through a thin lens, with their truth.
//
// Every pixel gathers rays from points of its own area through points of the lens opening; the rays pass upright and
// lying textured planes from front to back. Depth of field on both sides of focus, partial occlusion at outlines and
// motion come out of this geometry; no blur is applied to a picture. Diffraction alone is a convolution afterwards.
// Sampling: a shifted additive recurrence in five dimensions; each ray reads the texture at the width of its own share
// of the disc, which adds about 1/N to the variance of the blur for N rays (less than .5 % of c).
#pragma once

#include <cstdint>
#include <opencv2/core.hpp>
#include <optional>
#include <string>
#include <vector>

#include "tests/render/camera.h"
#include "tests/render/paint.h"
#include "tests/render/surface.h"

namespace focusfall::render {

struct LensSpec {
  double focal_length_mm = 200;
  double f_number = 2.8;
  double focus_m = 20;              // from the lens to the plane of focus
  double pitch_um = 22.5;
  int width_px = 1600;
  int height_px = 1067;
};

double image_distance_m(const LensSpec& lens);
double focus_from_sensor_m(const LensSpec& lens);
double working_f_number(const LensSpec& lens);
// Signed blur disc of a point at depth_m: positive where it lies nearer than the plane of focus (back focus).
double signed_disc_px(const LensSpec& lens, double depth_m);
// The focus distance from the lens that gives a point at depth_m this signed disc.
double focus_for_disc_m(const LensSpec& lens, double depth_m, double signed_disc);
// Frame position (px, pixel centres at integers) of a point in camera coordinates, and back at a depth.
cv::Point2d project(const LensSpec& lens, const cv::Vec3d& point);
double metres_per_px(const LensSpec& lens, double depth_m);

// l(x, y) = x_gradient x + y_gradient y + offset, px on px positions.
struct PlaneTruth {
  double x_gradient = 0, y_gradient = 0, offset = 0;
  double at(double x, double y) const { return x_gradient * x + y_gradient * y + offset; }
};
PlaneTruth plane_truth(const LensSpec& lens, const Surface& surface);

struct FrameSpec {
  LensSpec lens;
  std::vector<Surface> surfaces{};  // front to back
  cv::Vec2d camera_motion_px{0, 0}; // image motion of everything: shake, or the background of a panned frame
  double wavelength_um = 0;         // 0 = no diffraction
  double low_pass_px = 0;           // birefringent filter before the sensor: four images of every point, so far apart
  Light air{0.5f, 0.55f, 0.6f};     // what a ray sees that meets nothing
  CameraSpec camera{};
  double exposure = 1;
  double effort = 1;                // factor on the number of rays
  std::uint64_t random_key = 1;
};

cv::Mat render_linear_frame(const FrameSpec& spec);  // CV_32FC3, R, G, B
Picture render_frame(const FrameSpec& spec);

// Shares of pixels at the clipping level (code 255), counted in the delivered picture.
struct ClippedTruth {
  double red = 0, green = 0, blue = 0, any = 0, two_or_more = 0;
};
ClippedTruth clipped_truth(const cv::Mat& rgb, cv::Rect area = {});

// What the camera writes beside the picture. Distances from the sensor plane.
struct CaptureData {
  std::string make = "Invented", model = "Invented One", lens = "Invented 200 mm f/2.8";
  std::string body_serial = "1001", lens_serial = "2001";
  std::string taken_at = "2026:06:14 10:00:00", subsecond = "00";
  double exposure_time_s = 0.001;
  double iso_speed = 100;
  std::optional<double> focus_distance_m{};   // Exif SubjectDistance; infinity is written as the standard's 0xffffffff
  std::optional<cv::Rect> focus_area{};       // Exif SubjectArea, px of the stored picture
  int orientation = 1;
  bool manual_exposure = true;
};
std::vector<std::uint8_t> with_capture_data(const std::vector<std::uint8_t>& jpeg, const LensSpec& lens,
                                            const CaptureData& data);

}  // namespace focusfall::render
