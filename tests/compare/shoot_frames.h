// From a rendered shoot to what the audit takes, through the same measuring that the program does.
#pragma once

#include <vector>

#include "analysis/compare/exposure_audit.h"
#include "analysis/measure/clipping.h"
#include "analysis/measure/highlights.h"
#include "analysis/measure/level_grid.h"
#include "analysis/measure/tone.h"
#include "tests/render/exposure_shoot.h"

namespace focusfall {

inline ExposureFrame measured_frame(const render::ShootFrame& shot) {
  const cv::Mat rgb = shot.picture.rgb;
  LumaPicture luma;
  luma.codes = shot.picture.luma;
  luma.linear_of_code = srgb_linear_of_code(256);

  ClippingAccumulator clipping;
  clipping.start(rgb.cols, rgb.rows, {});
  clipping.take(RgbStrip{0, rgb});
  HighlightAccumulator highlights;
  highlights.start(rgb.cols, rgb.rows, {}, 256);
  highlights.take(RgbStrip{0, rgb});
  ToneAccumulator tone;
  tone.start(256, {});
  tone.take(0, luma.codes);

  ExposureFrame frame;
  frame.group = "invented";
  frame.taken_at_s = shot.taken_at_s;
  frame.f_number = shot.f_number;
  frame.exposure_time_s = shot.exposure_time_s;
  frame.iso_speed = shot.iso_speed;
  frame.manual_exposure = true;
  frame.flash_fired = false;
  frame.clipping = clipping.clipping();
  frame.tone = tone.tone(luma.linear_of_code);
  frame.levels = level_grid(luma);
  const auto clipped = clipping.clipped_tiles(frame.levels->tile_px);
  const int columns = (rgb.cols + frame.levels->tile_px - 1) / frame.levels->tile_px;
  for (int row = 0; row < frame.levels->rows; ++row) {
    const auto first = clipped.begin() + static_cast<std::ptrdiff_t>(row) * columns;
    frame.levels->clipped.insert(frame.levels->clipped.end(), first, first + frame.levels->columns);
  }
  frame.highlights = highlights.highlights(luma.linear_of_code);
  return frame;
}

inline std::vector<ExposureFrame> measured_frames(const render::Shoot& shoot) {
  std::vector<ExposureFrame> frames;
  for (const render::ShootFrame& shot : shoot.frames) frames.push_back(measured_frame(shot));
  return frames;
}

}  // namespace focusfall
