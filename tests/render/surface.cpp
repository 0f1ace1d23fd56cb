#include "tests/render/surface.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <opencv2/imgproc.hpp>

namespace focusfall::render {
namespace {

constexpr int kPaddedTo = 64;  // texels; six levels divide evenly

}  // namespace

MipTexture::MipTexture(const cv::Mat& premultiplied, bool tiled) : tiled_(tiled) {
  cv::Mat picture = premultiplied;
  if (!tiled) {
    const int right = (kPaddedTo - picture.cols % kPaddedTo) % kPaddedTo;
    const int below = (kPaddedTo - picture.rows % kPaddedTo) % kPaddedTo;
    cv::copyMakeBorder(premultiplied, picture, 0, below, 0, right, cv::BORDER_CONSTANT, cv::Scalar::all(0));
  }
  for (;;) {
    Level level;
    level.width = picture.cols;
    level.height = picture.rows;
    level.texels.resize(picture.total());
    for (int y = 0; y < picture.rows; ++y) {
      const auto* line = picture.ptr<Texel>(y);
      std::copy(line, line + picture.cols, level.texels.begin() + static_cast<long>(y) * picture.cols);
    }
    levels_.push_back(std::move(level));
    if (picture.cols % 2 != 0 || picture.rows % 2 != 0) break;
    cv::Mat half;
    cv::resize(picture, half, {picture.cols / 2, picture.rows / 2}, 0, 0, cv::INTER_AREA);
    picture = half;
  }
}

Surface billboard(std::shared_ptr<const MipTexture> texture, const BillboardPlace& place) {
  Surface surface;
  surface.origin = {place.left_m, place.bottom_m - texture->height() * place.texel_m, place.depth_m};
  surface.along_u = {place.texel_m, 0, 0};
  surface.along_v = {0, place.texel_m, 0};
  surface.texture = std::move(texture);
  return surface;
}

Surface ground(std::shared_ptr<const MipTexture> texture, const GroundPlace& place) {
  const double pitch = place.pitch_deg * std::numbers::pi / 180;
  Surface surface;
  surface.texture = std::move(texture);
  // The foot of the camera, then away from it over the ground: in camera coordinates the ground falls back upwards.
  surface.origin = place.height_m * cv::Vec3d(0, std::cos(pitch), std::sin(pitch));
  surface.along_u = {place.texel_x_m, 0, 0};
  surface.along_v = -place.texel_z_m * cv::Vec3d(0, -std::sin(pitch), std::cos(pitch));
  surface.farthest_m = place.farthest_m;
  return surface;
}

}  // namespace focusfall::render
