#include "tests/bench/bench_frames.h"

#include <array>
#include <cmath>
#include <fmt/core.h>
#include <fstream>
#include <opencv2/imgproc.hpp>

#include "tests/render/frame.h"
#include "tests/render/tile.h"

namespace focusfall::bench {
namespace {

constexpr int kTile = 1000;
constexpr double kLeastBytesPerPixel = 0.30, kMostBytesPerPixel = 0.40;

// What one square of the frame shows: the subject in focus, a lawn in front of and behind it, the far background.
enum Zone { subject, near_lawn, far_lawn, background, sky, kZones };
constexpr std::array<std::pair<render::Texture, double>, kZones> kZoneLook = {{
    {render::Texture::mixed, 1.6},
    {render::Texture::grass, 5.0},
    {render::Texture::grass, 9.0},
    {render::Texture::dead_leaves, 36.0},
    {render::Texture::smooth, 0.0},
}};
// Six columns by four rows.
constexpr std::array<std::array<Zone, 6>, 4> kLayout = {{
    {sky, background, background, background, background, sky},
    {background, background, subject, subject, background, background},
    {far_lawn, far_lawn, subject, subject, far_lawn, far_lawn},
    {near_lawn, near_lawn, near_lawn, near_lawn, near_lawn, near_lawn},
}};

// Linear light of every zone, drawn once.
const cv::Mat& zone_tile(Zone zone) {
  static std::array<cv::Mat, kZones> tiles;
  if (tiles[zone].empty()) {
    render::TileSpec spec;
    spec.size_px = kTile;
    spec.texture = kZoneLook[zone].first;
    spec.blur.disc_px = kZoneLook[zone].second;
    spec.colour = 0.5;
    spec.random_key = 100 + static_cast<std::uint64_t>(zone);
    tiles[zone] = render::render_linear_tile(spec);
  }
  return tiles[zone];
}

cv::Mat linear_frame(int index) {
  cv::Mat frame(kFrameHeight, kFrameWidth, CV_32FC3);
  for (int row = 0; row < 4; ++row) {
    for (int column = 0; column < 6; ++column) {
      cv::Mat tile;
      // Mirrored differently in every place and frame, so that no two are alike.
      cv::flip(zone_tile(kLayout[static_cast<std::size_t>(row)][static_cast<std::size_t>(column)]), tile,
               (row + 2 * column + index) % 3 - 1);
      const cv::Mat place = frame(cv::Rect(column * kTile, row * kTile, kTile, kTile));
      tile.convertTo(place, -1, 0.7 + 0.05 * ((index + column) % 7));
    }
  }
  return frame;
}

std::vector<std::uint8_t> frame_bytes(int index) {
  const cv::Mat linear = linear_frame(index);
  const render::CameraSpec camera{.iso_speed = 1600};
  const render::Picture picture = render::develop(linear, camera, render::Random(static_cast<std::uint64_t>(index)));
  // The quality that gives a camera's size.
  constexpr double kPixels = static_cast<double>(kFrameWidth) * kFrameHeight;
  for (int quality = 82; quality <= 98; quality += 2) {
    auto jpeg = render::encode_jpeg(picture.rgb, quality, render::ChromaSampling::half);
    const double bytes_per_pixel = static_cast<double>(jpeg.size()) / kPixels;
    if (bytes_per_pixel < kLeastBytesPerPixel && quality < 98) continue;
    if (bytes_per_pixel > kMostBytesPerPixel) fmt::print(stderr, "frame {}: {:.2f} byte/px\n", index, bytes_per_pixel);
    render::LensSpec lens;
    lens.width_px = kFrameWidth;
    lens.height_px = kFrameHeight;
    lens.pitch_um = 6;
    render::CaptureData data;
    data.iso_speed = 1600;
    data.focus_area = cv::Rect(2700, 1700, 500, 400);
    data.taken_at = fmt::format("2026:06:14 10:{:02}:{:02}", index / 60 % 60, index % 60);
    return render::with_capture_data(jpeg, lens, data);
  }
  return {};
}

}  // namespace

std::vector<std::filesystem::path> ensure_frames(const std::filesystem::path& folder, int count) {
  std::filesystem::create_directories(folder);
  std::vector<std::filesystem::path> paths;
  for (int i = 0; i < count; ++i) {
    paths.push_back(folder / fmt::format("bench-{:03}.jpg", i));
    if (std::filesystem::exists(paths.back())) continue;
    const auto bytes = frame_bytes(i);
    std::ofstream file(paths.back(), std::ios::binary);
    file.write(reinterpret_cast<const char*>(bytes.data()), static_cast<std::streamsize>(bytes.size()));
  }
  return paths;
}

}  // namespace focusfall::bench
