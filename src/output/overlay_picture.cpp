#include "src/output/overlay_picture.h"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <opencv2/imgproc.hpp>

namespace focusfall {
namespace {

// ITU-T T.871, clause 7, in 16 fractional bits as libjpeg has it.
constexpr int kRedOfCr = 91881, kGreenOfCb = 22554, kGreenOfCr = 46802, kBlueOfCb = 116130, kHalf = 1 << 15;

std::uint8_t full_if(bool clipped) { return clipped ? 255 : 0; }

// Keeps the luma and, for each channel, where it is clipped.
class OverlaySink final : public StripSink {
 public:
  void start(const PictureFormat& format) override {
    grey.create(format.height_px, format.width_px, CV_8UC1);
    for (cv::Mat& plane : clipped) plane.create(format.height_px, format.width_px, CV_8UC1);
  }

  void take(const YccStrip& strip) override {
    for (int row = 0; row < strip.y.rows; ++row) take_ycc_row(strip, row);
  }

  void take(const RgbStrip& strip) override {
    const bool wide = strip.rgb.depth() == CV_16U;
    const cv::Range rows(strip.first_row, strip.first_row + strip.rgb.rows);
    cv::Mat luma = strip.rgb;
    if (strip.rgb.channels() == 3) cv::cvtColor(strip.rgb, luma, cv::COLOR_RGB2GRAY);
    luma.convertTo(grey.rowRange(rows), CV_8U, wide ? 1 / 257.0 : 1.0);
    cv::Mat planes[3];
    if (strip.rgb.channels() == 3) {
      cv::split(strip.rgb, planes);
    } else {
      for (cv::Mat& plane : planes) plane = strip.rgb;
    }
    for (int i = 0; i < 3; ++i) {
      cv::Mat kept = clipped[i].rowRange(rows);
      cv::compare(planes[i], cv::Scalar(wide ? 65535 : 255), kept, cv::CMP_EQ);
    }
  }

  cv::Mat grey;
  cv::Mat clipped[3];

 private:
  void take_ycc_row(const YccStrip& strip, int row) {
    const int y_row = strip.first_row + row;
    const auto* y = strip.y.ptr<std::uint8_t>(row);
    std::copy(y, y + strip.y.cols, grey.ptr<std::uint8_t>(y_row));
    std::uint8_t* out[] = {clipped[0].ptr<std::uint8_t>(y_row), clipped[1].ptr<std::uint8_t>(y_row),
                           clipped[2].ptr<std::uint8_t>(y_row)};
    const bool colour = !strip.cb.empty();
    const auto* cb_row = colour ? strip.cb.ptr<std::uint8_t>(row / strip.chroma_step_y) : nullptr;
    const auto* cr_row = colour ? strip.cr.ptr<std::uint8_t>(row / strip.chroma_step_y) : nullptr;
    for (int x = 0; x < strip.y.cols; ++x) {
      const int cb = colour ? cb_row[x / strip.chroma_step_x] - 128 : 0;
      const int cr = colour ? cr_row[x / strip.chroma_step_x] - 128 : 0;
      out[0][x] = full_if(y[x] + ((kRedOfCr * cr + kHalf) >> 16) >= 255);
      out[1][x] = full_if(y[x] + ((-kGreenOfCb * cb - kGreenOfCr * cr + kHalf) >> 16) >= 255);
      out[2][x] = full_if(y[x] + ((kBlueOfCb * cb + kHalf) >> 16) >= 255);
    }
  }
};

// As Exif 2.32, tag 0x0112 has it.
cv::Mat turned(const cv::Mat& stored, int orientation) {
  cv::Mat result;
  switch (orientation) {
    case 2: cv::flip(stored, result, 1); return result;
    case 3: cv::rotate(stored, result, cv::ROTATE_180); return result;
    case 4: cv::flip(stored, result, 0); return result;
    case 5: cv::transpose(stored, result); return result;
    case 6: cv::rotate(stored, result, cv::ROTATE_90_CLOCKWISE); return result;
    case 7:
      cv::transpose(stored, result);
      cv::rotate(result, result, cv::ROTATE_180);
      return result;
    case 8: cv::rotate(stored, result, cv::ROTATE_90_COUNTERCLOCKWISE); return result;
    default: return stored;
  }
}

cv::Size fitting_size(cv::Size stored, bool on_its_side, LargestSize largest) {
  constexpr double kMostEnlarged = 4;   // beyond, a pixel is a visible square (judgement)
  if (on_its_side) std::swap(largest.width_px, largest.height_px);
  const double scale = std::min({static_cast<double>(largest.width_px) / stored.width,
                                 static_cast<double>(largest.height_px) / stored.height, kMostEnlarged});
  return {std::max(1, static_cast<int>(std::lround(stored.width * scale))),
          std::max(1, static_cast<int>(std::lround(stored.height * scale)))};
}

}  // namespace

tl::expected<OverlayPicture, DecodeError> read_overlay_picture(std::span<const std::byte> file, int orientation,
                                                               LargestSize largest, DecodeWorkspace& workspace) {
  OverlaySink sink;
  if (const auto decoded = decode_picture(file, sink, workspace); !decoded) {
    return tl::make_unexpected(decoded.error());
  }
  const cv::Size size = fitting_size(sink.grey.size(), orientation >= 5 && orientation <= 8, largest);
  const int method = size.width < sink.grey.cols ? cv::INTER_AREA : cv::INTER_LINEAR;
  OverlayPicture picture;
  cv::Mat reduced;
  cv::resize(sink.grey, reduced, size, 0, 0, method);
  picture.grey = turned(reduced, orientation).clone();
  for (int i = 0; i < 3; ++i) {
    cv::resize(sink.clipped[i], reduced, size, 0, 0, method);
    cv::threshold(reduced, reduced, 127, 255, cv::THRESH_BINARY);
    picture.clipped[i] = turned(reduced, orientation).clone();
  }
  return picture;
}

}  // namespace focusfall
