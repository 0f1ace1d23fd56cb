// Drawing of antialiased shapes in linear light.
#pragma once

#include <array>
#include <opencv2/core.hpp>
#include <span>

namespace focusfall::render {

// Linear light, R, G, B; a canvas of one channel uses the first, one of four carries its opacity in the last and
// its light multiplied by it.
using Light = std::array<float, 3>;

// A float picture whose samples stand every 1/scale px; sample (0, 0) lies at (origin, origin) px. Coverage of a
// sample is that of a straight edge by a box of one sample, so that an edge drawn here is blurred by exactly
// (1/scale)^2/12 px^2, which the caller can divide out.
class Canvas {
 public:
  Canvas(int samples, int channels, double scale, double origin_px);
  Canvas(cv::Size samples, int channels, double scale);  // origin 0

  void clear(const Light& light);
  // Corners in px, convex, either winding. shade: relative change of brightness per px in x and y about the centroid.
  void fill_convex(std::span<const cv::Point2d> corners, const Light& light, cv::Point2d shade = {0, 0});
  void fill_disc(cv::Point2d centre, double radius_px, const Light& light);
  // A limb: two discs and the tapered band between them.
  void fill_limb(cv::Point2d from, double from_radius_px, cv::Point2d to, double to_radius_px, const Light& light,
                 cv::Point2d shade = {0, 0});
  // Only samples that are covered already take paint, as a pattern on a cut-out shape. Channels: 4.
  void set_only_where_painted(bool only) { only_where_painted_ = only; }

  cv::Mat& picture() { return picture_; }
  double scale() const { return scale_; }
  double origin_px() const { return origin_px_; }
  double extent_px() const { return picture_.cols / scale_; }

 private:
  void blend(float* sample, float coverage, const Light& light, float factor) const;

  cv::Mat picture_;  // CV_32FC1, CV_32FC3 or CV_32FC4
  double scale_;
  double origin_px_;
  bool only_where_painted_ = false;
};

}  // namespace focusfall::render
