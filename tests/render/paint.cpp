#include "tests/render/paint.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

namespace focusfall::render {
namespace {

// A side of a convex shape: inside where x * nx + y * ny + offset > 0, in samples.
struct Side {
  double nx, ny, offset;
};

std::vector<Side> sides_of(std::span<const cv::Point2d> corners) {
  double area = 0;
  for (std::size_t i = 0; i < corners.size(); ++i) {
    const auto& a = corners[i];
    const auto& b = corners[(i + 1) % corners.size()];
    area += a.x * b.y - a.y * b.x;
  }
  const double sign = area >= 0 ? 1 : -1;
  std::vector<Side> sides;
  for (std::size_t i = 0; i < corners.size(); ++i) {
    const auto& a = corners[i];
    const auto& b = corners[(i + 1) % corners.size()];
    const double length = std::hypot(b.x - a.x, b.y - a.y);
    if (length < 1e-9) continue;
    const double nx = -sign * (b.y - a.y) / length;
    const double ny = sign * (b.x - a.x) / length;
    sides.push_back({nx, ny, -(nx * a.x + ny * a.y)});
  }
  return sides;
}

// Narrows [low, high] to the x for which every side's distance is above `distance` in row y.
void clip_row(const std::vector<Side>& sides, double y, double distance, double& low, double& high) {
  for (const Side& side : sides) {
    const double rest = distance - side.ny * y - side.offset;  // nx * x > rest
    if (std::abs(side.nx) < 1e-12) {
      if (rest > 0) high = low - 1;
    } else if (side.nx > 0) {
      low = std::max(low, rest / side.nx);
    } else {
      high = std::min(high, rest / side.nx);
    }
  }
}

}  // namespace

Canvas::Canvas(int samples, int channels, double scale, double origin_px)
    : picture_(samples, samples, CV_32FC(channels), cv::Scalar::all(0)), scale_(scale), origin_px_(origin_px) {}

Canvas::Canvas(cv::Size samples, int channels, double scale)
    : picture_(samples, CV_32FC(channels), cv::Scalar::all(0)), scale_(scale), origin_px_(0) {}

void Canvas::clear(const Light& light) { picture_.setTo(cv::Scalar(light[0], light[1], light[2], 1)); }

void Canvas::blend(float* sample, float coverage, const Light& light, float factor) const {
  const int channels = picture_.channels();
  if (only_where_painted_) {
    // Paint over what is there, without changing its outline.
    coverage *= sample[3];
    for (int channel = 0; channel < 3; ++channel) {
      const float own = sample[3] > 0 ? sample[channel] / sample[3] : 0.0f;
      sample[channel] += coverage * (light[static_cast<std::size_t>(channel)] * factor - own);
    }
    return;
  }
  for (int channel = 0; channel < channels; ++channel) {
    const float value = channel == 3 ? 1.0f : light[static_cast<std::size_t>(channel)] * factor;
    sample[channel] += coverage * (value - sample[channel]);
  }
}

void Canvas::fill_limb(cv::Point2d from, double from_radius_px, cv::Point2d to, double to_radius_px,
                       const Light& light, cv::Point2d shade) {
  const cv::Point2d axis = to - from;
  const double length = std::hypot(axis.x, axis.y);
  fill_disc(from, from_radius_px, light);
  fill_disc(to, to_radius_px, light);
  if (length < 1e-9) return;
  const cv::Point2d side(-axis.y / length, axis.x / length);
  const std::array<cv::Point2d, 4> band{from + from_radius_px * side, to + to_radius_px * side,
                                        to - to_radius_px * side, from - from_radius_px * side};
  fill_convex(band, light, shade);
}

void Canvas::fill_convex(std::span<const cv::Point2d> corners_px, const Light& light, cv::Point2d shade) {
  std::vector<cv::Point2d> corners;
  cv::Point2d centre(0, 0);
  double top = std::numeric_limits<double>::max(), bottom = std::numeric_limits<double>::lowest();
  for (const auto& corner : corners_px) {
    corners.emplace_back((corner.x - origin_px_) * scale_, (corner.y - origin_px_) * scale_);
    centre += corners.back() / static_cast<double>(corners_px.size());
    top = std::min(top, corners.back().y);
    bottom = std::max(bottom, corners.back().y);
  }
  const std::vector<Side> sides = sides_of(corners);
  const int channels = picture_.channels();
  const bool shaded = shade.x != 0 || shade.y != 0;
  const int first = std::max(0, static_cast<int>(std::floor(top - 0.5)));
  const int last = std::min(picture_.rows - 1, static_cast<int>(std::ceil(bottom + 0.5)));
  for (int row = first; row <= last; ++row) {
    // Samples touched at all, and those covered wholly in between.
    double low = 0, high = picture_.cols - 1;
    clip_row(sides, row, -0.5, low, high);
    if (high < low) continue;
    double full_low = low, full_high = high;
    clip_row(sides, row, 0.5, full_low, full_high);
    auto* line = picture_.ptr<float>(row);
    for (int x = static_cast<int>(std::ceil(low)); x <= static_cast<int>(std::floor(high)); ++x) {
      double coverage = 1;
      if (!(x >= full_low && x <= full_high)) {
        for (const Side& side : sides)
          coverage = std::min(coverage, side.nx * x + side.ny * row + side.offset + 0.5);
        if (coverage <= 0) continue;
      }
      double factor = 1;
      if (shaded)
        factor = std::max(0.05, 1 + ((x - centre.x) * shade.x + (row - centre.y) * shade.y) / scale_);
      blend(line + x * channels, static_cast<float>(coverage), light, static_cast<float>(factor));
    }
  }
}

void Canvas::fill_disc(cv::Point2d centre_px, double radius_px, const Light& light) {
  const double cx = (centre_px.x - origin_px_) * scale_, cy = (centre_px.y - origin_px_) * scale_;
  const double radius = radius_px * scale_;
  const int channels = picture_.channels();
  const int first = std::max(0, static_cast<int>(std::floor(cy - radius - 0.5)));
  const int last = std::min(picture_.rows - 1, static_cast<int>(std::ceil(cy + radius + 0.5)));
  for (int row = first; row <= last; ++row) {
    const double dy = row - cy;
    const double outer = (radius + 0.5) * (radius + 0.5) - dy * dy;
    if (outer <= 0) continue;
    const double inner = radius > 0.5 ? (radius - 0.5) * (radius - 0.5) - dy * dy : -1;
    const double half = std::sqrt(outer), full = inner > 0 ? std::sqrt(inner) : -1;
    auto* line = picture_.ptr<float>(row);
    const int left = std::max(0, static_cast<int>(std::ceil(cx - half)));
    const int right = std::min(picture_.cols - 1, static_cast<int>(std::floor(cx + half)));
    for (int x = left; x <= right; ++x) {
      const double dx = x - cx;
      double coverage = 1;
      if (std::abs(dx) > full) coverage = std::clamp(radius + 0.5 - std::sqrt(dx * dx + dy * dy), 0.0, 1.0);
      blend(line + x * channels, static_cast<float>(coverage), light, 1);
    }
  }
}

}  // namespace focusfall::render
