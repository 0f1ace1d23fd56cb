#include "src/pipeline/picture_sink.h"

#include <cmath>
#include <cstdint>
#include <opencv2/imgproc.hpp>

#include "analysis/measure/level_grid.h"

namespace focusfall {
namespace {

PixelRect whole_pixels(const FractionBox& box, int width, int height) {
  const int x0 = std::clamp(static_cast<int>(std::lround(box.x * width)), 0, width);
  const int y0 = std::clamp(static_cast<int>(std::lround(box.y * height)), 0, height);
  const int x1 = std::clamp(static_cast<int>(std::lround((box.x + box.width) * width)), x0, width);
  const int y1 = std::clamp(static_cast<int>(std::lround((box.y + box.height) * height)), y0, height);
  return {x0, y0, x1 - x0, y1 - y0};
}

}  // namespace

// A plane in the memory that is kept; it grows to the largest picture and is never given back in between.
cv::Mat PictureSink::plane(int width, int height, int type) {
  const std::size_t bytes = static_cast<std::size_t>(width) * static_cast<std::size_t>(height) * CV_ELEM_SIZE(type);
  if (memory_.size() < bytes) {
    memory_ = {};   // first give back, then take: never both at once
    memory_.resize(bytes);
  }
  return {height, width, type, memory_.data()};
}

void PictureSink::start(const PictureFormat& format) {
  format_ = format;
  const int code_count = format.bits > 8 ? 65536 : 256;
  if (!format.linear_of_code.empty()) {
    luma_.linear_of_code = format.linear_of_code;
    curve_is_srgb_ = false;
  } else if (!curve_is_srgb_ || static_cast<int>(luma_.linear_of_code.size()) != code_count) {
    luma_.linear_of_code = srgb_linear_of_code(code_count);
    curve_is_srgb_ = true;
  }
  luma_.coding_step_codes = format.coding_step_codes;
  luma_.codes = plane(format.width_px, format.height_px, format.bits > 8 ? CV_16UC1 : CV_8UC1);
  const PixelRect aim = whole_pixels(aim_, format.width_px, format.height_px);
  clipping_.start(format.width_px, format.height_px, aim);
  tone_.start(code_count, aim);
  highlights_.start(format.width_px, format.height_px, aim, code_count);
}

LevelGrid PictureSink::levels() const {
  LevelGrid grid = level_grid(luma_);
  // Clipping is counted in cut tiles at the right and the bottom too; the grid holds whole ones only.
  const std::vector<float> clipped = clipping_.clipped_tiles(grid.tile_px);
  const int clipped_columns = (luma_.codes.cols + grid.tile_px - 1) / grid.tile_px;
  for (int row = 0; row < grid.rows; ++row) {
    const auto first = clipped.begin() + static_cast<std::ptrdiff_t>(row) * clipped_columns;
    grid.clipped.insert(grid.clipped.end(), first, first + grid.columns);
  }
  return grid;
}

cv::Mat PictureSink::luma_destination(int padded_width, int padded_height) {
  const cv::Mat padded = plane(padded_width, padded_height, CV_8UC1);
  luma_.codes = padded(cv::Rect(0, 0, format_.width_px, format_.height_px));
  return padded;
}

void PictureSink::take(const YccStrip& strip) {
  cv::Mat kept = luma_.codes.rowRange(strip.first_row, strip.first_row + strip.y.rows);
  if (kept.data != strip.y.data) strip.y.copyTo(kept);
  clipping_.take(strip);
  highlights_.take(strip);
  tone_.take(strip.first_row, strip.y);
}

void PictureSink::take(const RgbStrip& strip) {
  cv::Mat kept = luma_.codes.rowRange(strip.first_row, strip.first_row + strip.rgb.rows);
  if (strip.rgb.channels() == 1) {
    strip.rgb.copyTo(kept);
  } else {
    cv::cvtColor(strip.rgb, kept, cv::COLOR_RGB2GRAY);   // .299 .587 .114, rounded, 8 and 16 bits
  }
  clipping_.take(strip);
  highlights_.take(strip);
  tone_.take(strip.first_row, kept);
}

}  // namespace focusfall
