// Writes a rendered shoot as camera files, for the tests of the command line.
//   shoot_maker FOLDER [--frames N] [--wrong F_NUMBER EV] [--light drift|cloud] [--curve s] [--automatic]
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <string>
#include <vector>

#include "tests/render/exposure_shoot.h"
#include "tests/render/frame.h"

namespace focusfall::render {
namespace {

std::string clock_time(double seconds) {
  const int whole = static_cast<int>(seconds);
  char text[32];
  std::snprintf(text, sizeof text, "2026:06:14 11:%02d:%02d", whole / 60 % 60, whole % 60);
  return text;
}

void write_shoot(const std::string& folder, const ShootSpec& spec, bool manual) {
  const Shoot shoot = render_shoot(spec);
  for (std::size_t i = 0; i < shoot.frames.size(); ++i) {
    const ShootFrame& frame = shoot.frames[i];
    LensSpec lens;
    lens.f_number = frame.f_number;
    lens.width_px = spec.width_px;
    lens.height_px = spec.height_px;
    CaptureData data;
    data.exposure_time_s = frame.exposure_time_s;
    data.iso_speed = frame.iso_speed;
    data.taken_at = clock_time(frame.taken_at_s);
    data.manual_exposure = manual;
    const auto bytes = with_capture_data(frame.picture.jpeg, lens, data);
    const std::string number = std::to_string(100 + i);
    std::ofstream file(folder + "/frame-" + number.substr(1) + ".jpg", std::ios::binary);
    file.write(reinterpret_cast<const char*>(bytes.data()), static_cast<std::streamsize>(bytes.size()));
  }
}

}  // namespace
}  // namespace focusfall::render

int main(int count, char** arguments) {
  using namespace focusfall::render;
  const std::vector<std::string> words(arguments + 1, arguments + count);
  if (words.empty()) return 2;
  ShootSpec spec;
  spec.key = 77;
  bool manual = true;
  for (std::size_t i = 1; i < words.size(); ++i) {
    if (words[i] == "--frames") spec.frames = std::stoi(words.at(++i));
    else if (words[i] == "--wrong") spec.wrong_f_number = std::stod(words.at(++i)), spec.wrong_ev = std::stod(words.at(++i));
    else if (words[i] == "--light") spec.light = words.at(++i) == "drift" ? LightCourse::drift : LightCourse::cloud;
    else if (words[i] == "--curve") spec.curve = words.at(++i) == "s" ? ToneCurve::s_shaped : ToneCurve::srgb;
    else if (words[i] == "--automatic") manual = false;
    else return 2;
  }
  std::filesystem::create_directories(words[0]);
  write_shoot(words[0], spec, manual);
  return 0;
}
