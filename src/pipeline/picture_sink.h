// What the pipeline keeps of a picture while it passes by: the luma plane, the clipping counts and the tone.
#pragma once

#include <opencv2/core.hpp>
#include <optional>
#include <vector>

#include "analysis/conventions.h"
#include "analysis/measure/clipping.h"
#include "analysis/measure/highlights.h"
#include "analysis/measure/luma_picture.h"
#include "analysis/measure/tone.h"
#include "src/decode/decoder.h"

namespace focusfall {

// Luma of a picture that is not coded as YCbCr is made with the JFIF weights .299, .587, .114 of the codes, so that
// the same picture stored as JPEG and as TIFF is measured alike.
class PictureSink final : public StripSink {
 public:
  // The aim, in fractions of the unrotated frame, of the picture that comes next.
  void set_aim(const FractionBox& aim) { aim_ = aim; }

  void start(const PictureFormat& format) override;
  void take(const YccStrip& strip) override;
  void take(const RgbStrip& strip) override;
  cv::Mat luma_destination(int padded_width, int padded_height) override;

  // After the last strip. The codes point into memory that the next picture overwrites.
  const LumaPicture& luma() const { return luma_; }
  Clipping clipping() const { return clipping_.clipping(); }
  std::vector<float> clipped_tiles(int tile_px) const { return clipping_.clipped_tiles(tile_px); }
  std::optional<Tone> tone() const { return tone_.tone(luma_.linear_of_code); }
  std::optional<Highlights> highlights() const { return highlights_.highlights(luma_.linear_of_code); }
  LevelGrid levels() const;   // with the clipped fraction of each tile

 private:
  cv::Mat plane(int width, int height, int type);

  FractionBox aim_;
  std::vector<std::byte> memory_;     // of the luma plane: grows to the largest picture
  LumaPicture luma_;
  bool curve_is_srgb_ = false;        // the curve kept from the last picture
  ClippingAccumulator clipping_;
  ToneAccumulator tone_;
  HighlightAccumulator highlights_;
  PictureFormat format_;
};

}  // namespace focusfall
