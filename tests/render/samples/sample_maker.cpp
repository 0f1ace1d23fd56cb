// Renders the invented shoot of sample-images/ and writes its truth.
//   sample_maker FOLDER [WORD...]   only frames whose name contains one of the words; the truth always lists all asked for
#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fmt/format.h>
#include <fstream>
#include <iostream>

#include "tests/render/samples/shoot.h"

namespace focusfall::render {
namespace {

// A usual filter before a Bayer mosaic, so that sharp edges show no coloured steps (judgement).
constexpr double kLowPassPx = 0.7;
constexpr double kAcceptableBlurPx = 2;  // 2 px of a delivered picture as wide as the frame (design of the program)

// The stored frame: what orientation 8 shows turned by a quarter against the clock.
struct Stored {
  LensSpec lens;
  cv::Rect aim;
  PlaneTruth plane;
};

Stored stored_of(const SampleFrame& frame, const std::vector<Surface>& surfaces) {
  Stored stored{frame.lens, frame.aim, {}};
  for (const Surface& surface : surfaces)
    if (frame.plane >= 0 && surface.texture->tiled()) stored.plane = plane_truth(frame.lens, surface);
  if (frame.orientation == 8) {
    const int height = frame.lens.height_px;
    std::swap(stored.lens.width_px, stored.lens.height_px);
    stored.aim = {height - frame.aim.y - frame.aim.height, frame.aim.x, frame.aim.height, frame.aim.width};
    const PlaneTruth p = stored.plane;
    stored.plane = {-p.y_gradient, p.x_gradient, p.offset + p.y_gradient * (height - 1)};
  }
  return stored;
}

std::string number(double value) { return fmt::format("{:.6g}", std::abs(value) < 1e-9 ? 0.0 : value); }

std::string truth_line(const SampleFrame& frame, const Stored& stored, const Picture& picture) {
  const double disc = signed_disc_px(frame.lens, frame.aim_depth_m);
  const ClippedTruth all = clipped_truth(picture.rgb), aim = clipped_truth(picture.rgb, stored.aim);
  const double width = stored.lens.width_px, height = stored.lens.height_px;
  const bool plane = stored.plane.x_gradient != 0 || stored.plane.y_gradient != 0;
  const cv::Vec2d subject = frame.subject_motion_px + frame.camera_motion_px;
  std::vector<std::string> cells{
      frame.file + ".jpg", frame.scene, frame.what, frame.focus, frame.cause, number(disc),
      number(disc * frame.lens.pitch_um * working_f_number(frame.lens)), number(disc / kAcceptableBlurPx),
      number(focus_from_sensor_m(frame.lens)), number(frame.aim_depth_m + image_distance_m(frame.lens)),
      number(subject[0]), number(subject[1]), number(frame.camera_motion_px[0]), number(frame.camera_motion_px[1]),
      plane ? number(stored.plane.x_gradient * width) : "", plane ? number(stored.plane.y_gradient * height) : "",
      number(stored.aim.x / width), number(stored.aim.y / height), number(stored.aim.width / width),
      number(stored.aim.height / height), number(all.red), number(all.green), number(all.blue), number(all.any),
      number(all.two_or_more), number(aim.any)};
  std::string line;
  for (const std::string& cell : cells) line += (line.empty() ? "" : ",") + (cell.find(',') == std::string::npos ? cell : '"' + cell + '"');
  return line;
}

constexpr const char* kHeader =
    "file,scene,what,focus,cause,defocus_px,defocus_um,defocus_limits,focus_distance_m,subject_distance_m,"
    "subject_motion_x_px,subject_motion_y_px,background_motion_x_px,background_motion_y_px,"
    "plane_x_gradient_px,plane_y_gradient_px,aim_x,aim_y,aim_width,aim_height,"
    "clipped_red,clipped_green,clipped_blue,clipped_any,clipped_two_or_more,clipped_aim_any";

std::string make(const SampleFrame& frame, std::uint64_t key, const std::filesystem::path& folder) {
  FrameSpec spec{.lens = frame.lens, .surfaces = frame.build(frame)};
  spec.camera_motion_px = frame.camera_motion_px;
  spec.wavelength_um = frame.wavelength_um;
  spec.exposure = frame.exposure;
  spec.low_pass_px = kLowPassPx;
  spec.effort = frame.scene == "regatta" ? 2.5 : 1.2;  // glints are small and bright
  spec.air = {0.32f, 0.47f, 0.70f};
  if (frame.scene != "regatta") spec.air = {0, 0, 0};
  spec.random_key = key;
  const Stored stored = stored_of(frame, spec.surfaces);
  cv::Mat linear = render_linear_frame(spec);
  if (frame.orientation == 8) cv::rotate(linear, linear, cv::ROTATE_90_CLOCKWISE);
  const Picture picture = develop(linear, frame.camera, Random(key).branch(2));
  CaptureData data = frame.data;
  data.iso_speed = frame.camera.iso_speed;
  data.orientation = frame.orientation;
  if (!data.lens.empty()) data.focus_distance_m = focus_from_sensor_m(frame.lens);
  if (frame.record_aim) data.focus_area = stored.aim;
  const auto bytes = with_capture_data(picture.jpeg, stored.lens, data);
  std::ofstream out(folder / (frame.file + ".jpg"), std::ios::binary);
  out.write(reinterpret_cast<const char*>(bytes.data()), static_cast<std::streamsize>(bytes.size()));
  if (!out) throw std::runtime_error("cannot write " + (folder / (frame.file + ".jpg")).string());
  return truth_line(frame, stored, picture);
}

int run(int count, char** arguments) {
  if (count < 2) {
    std::cerr << "usage: sample_maker FOLDER [WORD...]\n";
    return 2;
  }
  const std::filesystem::path folder = arguments[1];
  std::filesystem::create_directories(folder);
  std::string truth = std::string(kHeader) + "\n";
  std::uint64_t key = 1000;
  for (const auto& list : {regatta_frames(), stage_frames(), bench_frames()}) {
    for (const SampleFrame& frame : list) {
      ++key;
      const bool wanted = count == 2 || std::any_of(arguments + 2, arguments + count, [&](const char* word) { return frame.file.find(word) != std::string::npos; });
      if (!wanted) continue;
      truth += make(frame, key, folder) + "\n";
      std::cerr << frame.file << "\n";
    }
  }
  std::ofstream(folder / "truth.csv") << truth;
  return 0;
}

}  // namespace
}  // namespace focusfall::render

int main(int count, char** arguments) {
  try {
    return focusfall::render::run(count, arguments);
  } catch (const std::exception& error) {
    std::cerr << "sample_maker: " << error.what() << "\n";
    return 3;
  }
}
