// Reads a PNG by libpng, for tests: an independent reader of what the program draws.
#pragma once

#include <map>
#include <opencv2/core.hpp>
#include <string>

namespace focusfall {

struct ReadPng {
  cv::Mat grey;                              // CV_8UC1
  bool is_grey = true;                       // red = green = blue everywhere
  std::map<std::string, std::string> texts;  // tEXt chunks, checked by their CRC
};

// Throws std::runtime_error where libpng refuses the bytes.
ReadPng read_png(const std::string& bytes);

}  // namespace focusfall
