// Flat textured pieces of which the frames are built.
#pragma once

#include <array>
#include <memory>
#include <opencv2/core.hpp>
#include <vector>

namespace focusfall::render {

// Linear light multiplied by opacity, and the opacity: R, G, B, A.
using Texel = std::array<float, 4>;

// A picture with its box-filtered halves, quarters and so on.
class MipTexture {
 public:
  // premultiplied: CV_32FC4. A tiled texture repeats without end and needs sides that are powers of two; any other is
  // transparent outside and is padded to whole coarse texels.
  MipTexture(const cv::Mat& premultiplied, bool tiled);

  // The texel of `level` that holds position (u, v), both in texels of level 0. No interpolation: a nearest texel
  // blurs by side^2/12 and its box filter by as much again, bilinear interpolation by half more.
  const Texel* at(double u, double v, int level) const {
    const Level& m = levels_[static_cast<std::size_t>(level)];
    long x = static_cast<long>(u < 0 ? u - 1 : u) >> level, y = static_cast<long>(v < 0 ? v - 1 : v) >> level;
    if (tiled_) {
      x &= m.width - 1;
      y &= m.height - 1;
    } else if (u < 0 || v < 0 || x >= m.width || y >= m.height) {
      return nullptr;
    }
    return &m.texels[static_cast<std::size_t>(y * m.width + x)];
  }
  int levels() const { return static_cast<int>(levels_.size()); }
  int width() const { return static_cast<int>(levels_.front().width); }
  int height() const { return static_cast<int>(levels_.front().height); }
  bool tiled() const { return tiled_; }

 private:
  struct Level {
    long width = 0, height = 0;
    std::vector<Texel> texels;
  };
  std::vector<Level> levels_;
  bool tiled_;
};

// Camera coordinates, metres: x to the right, y down, z along the optical axis, the lens at the origin.
struct Surface {
  std::shared_ptr<const MipTexture> texture;
  cv::Vec3d origin;                 // where texel (0, 0) has its outer corner
  cv::Vec3d along_u, along_v;       // one texel to the right, one texel down, metres
  cv::Vec2d motion_px{0, 0};        // its own image motion during the exposure, beside the camera's
  double farthest_m = 1e9;          // hits beyond are not there: a ground that ends at the background
  double brightness = 1;            // factor on its light
};

// An upright piece that faces the camera at depth_m; left and bottom in metres beside and below the axis.
struct BillboardPlace {
  double depth_m = 10;
  double left_m = 0;
  double bottom_m = 0;              // y of its lower edge
  double texel_m = 0.001;
};
Surface billboard(std::shared_ptr<const MipTexture> texture, const BillboardPlace& place);

// An endless plane that meets the optical axis' vertical plane at height_m below the lens; pitch_deg > 0: the camera
// looks down. texel_x_m across, texel_z_m along the ground away from the camera.
struct GroundPlace {
  double height_m = 1.5;
  double pitch_deg = 0;
  double texel_x_m = 0.001;
  double texel_z_m = 0.01;
  double farthest_m = 1e9;          // depth along the axis at which it ends
};
Surface ground(std::shared_ptr<const MipTexture> texture, const GroundPlace& place);

}  // namespace focusfall::render
