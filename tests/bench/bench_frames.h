// Frames for the benchmark: 24 MP JPEGs of 0.3 to 0.4 byte a pixel, as a camera writes them of a sharp subject before
// a blurred background over a lawn.
#pragma once

#include <filesystem>
#include <vector>

namespace focusfall::bench {

inline constexpr int kFrameWidth = 6000, kFrameHeight = 4000;

// Makes what is missing of `count` frames in `folder`; returns their paths. The same count gives the same files.
std::vector<std::filesystem::path> ensure_frames(const std::filesystem::path& folder, int count);

}  // namespace focusfall::bench
