#include "src/decode/preview.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <opencv2/imgproc.hpp>
#include <utility>

namespace focusfall {
namespace {

// Sinks down as the strips pass: whole blocks of rows are averaged at once, so that no full picture is ever held.
class PreviewSink final : public StripSink {
 public:
  explicit PreviewSink(const PreviewOptions& options) : options_(options) {}

  void start(const PictureFormat& format) override {
    format_ = format;
    // Twice the wanted side is kept, so that the last step can still choose its size freely.
    const int longer = std::max(format.width_px, format.height_px);
    factor_ = std::max(1, longer / (2 * options_.whole_side_px));
    crop_ = aim_crop();
  }

  void take(const YccStrip& strip) override {
    if (strip.cb.empty()) {
      take_rows(strip.first_row, strip.y);
      return;
    }
    cv::Mat full_cb, full_cr, ycc, rgb;
    const cv::Rect seen(0, 0, strip.y.cols, strip.y.rows);
    const auto widen = [&](const cv::Mat& plane, cv::Mat& full) {
      cv::resize(plane, full, {plane.cols * strip.chroma_step_x, plane.rows * strip.chroma_step_y}, 0, 0,
                 cv::INTER_NEAREST);
      if (full.cols < seen.width || full.rows < seen.height) {
        cv::copyMakeBorder(full, full, 0, std::max(0, seen.height - full.rows), 0, std::max(0, seen.width - full.cols),
                           cv::BORDER_REPLICATE);
      }
      full = full(seen);
    };
    widen(strip.cb, full_cb);
    widen(strip.cr, full_cr);
    cv::merge(std::array{strip.y, full_cr, full_cb}, ycc);
    cv::cvtColor(ycc, rgb, cv::COLOR_YCrCb2RGB);
    take_rows(strip.first_row, rgb);
  }

  void take(const RgbStrip& strip) override {
    cv::Mat rows = strip.rgb;
    if (rows.depth() == CV_16U) rows.convertTo(rows, CV_8U, 1.0 / 257);
    take_rows(strip.first_row, rows);
  }

  // After the last strip; both in the unrotated frame.
  cv::Mat whole() {
    if (!pending_.empty()) average(pending_.rows);
    cv::Mat joined;
    if (!averaged_.empty()) cv::vconcat(averaged_, joined);
    return joined;
  }
  cv::Mat aim() const {
    cv::Mat joined;
    if (!crop_rows_.empty()) cv::vconcat(crop_rows_, joined);
    return joined;
  }

 private:
  // The middle of the aim, inside the frame.
  cv::Rect aim_crop() const {
    const FractionBox& box = options_.aim;
    if (box.width <= 0 || box.height <= 0) return {};
    const auto along = [this](double start, double extent, int size) {
      const int length = std::clamp(static_cast<int>(std::lround(extent * size)), 1, std::min(options_.aim_side_px, size));
      const int first = static_cast<int>(std::lround((start + extent / 2) * size)) - length / 2;
      return std::pair(std::clamp(first, 0, size - length), length);
    };
    const auto [x, width] = along(box.x, box.width, format_.width_px);
    const auto [y, height] = along(box.y, box.height, format_.height_px);
    return {x, y, width, height};
  }

  void take_rows(int first_row, const cv::Mat& rows) {
    const int top = std::max(first_row, crop_.y), bottom = std::min(first_row + rows.rows, crop_.y + crop_.height);
    if (top < bottom) {
      crop_rows_.push_back(
          rows(cv::Rect(crop_.x, top - first_row, crop_.width, bottom - top)).clone());
    }
    if (pending_.empty()) {
      pending_ = rows.clone();
    } else {
      cv::vconcat(pending_, rows, pending_);
    }
    if (const int whole_blocks = pending_.rows / factor_ * factor_; whole_blocks > 0) average(whole_blocks);
  }

  // The first `rows` pending rows; a remainder at the end of the picture makes one row of its own.
  void average(int rows) {
    cv::Mat small;
    const cv::Size size(std::max(1, pending_.cols / factor_), std::max(1, rows / factor_));
    cv::resize(pending_.rowRange(0, rows), small, size, 0, 0, cv::INTER_AREA);
    averaged_.push_back(small);
    pending_ = rows < pending_.rows ? pending_.rowRange(rows, pending_.rows).clone() : cv::Mat();
  }

  const PreviewOptions& options_;
  PictureFormat format_;
  int factor_ = 1;
  cv::Rect crop_;
  cv::Mat pending_;
  std::vector<cv::Mat> averaged_, crop_rows_;
};

// Exif orientation 1..8, applied to pixels.
cv::Mat upright(const cv::Mat& picture, int orientation) {
  cv::Mat turned = picture;
  if (orientation >= 5 && orientation <= 8) cv::transpose(picture, turned);
  cv::Mat result = turned;
  switch (orientation) {
    case 2: case 6: cv::flip(turned, result, 1); break;    // left and right exchanged
    case 3: case 7: cv::flip(turned, result, -1); break;
    case 4: case 8: cv::flip(turned, result, 0); break;    // top and bottom exchanged
    default: break;
  }
  return result;
}

// Qualities that are tried, best first; below the last one the picture is made smaller (judgement).
constexpr std::array kQualities = {80, 70, 60, 50, 40, 30};

std::string encoded_within(cv::Mat picture, std::size_t bytes) {
  while (!picture.empty()) {
    for (const int quality : kQualities) {
      std::string encoded = encode_jpeg(picture, quality);
      if (encoded.size() <= bytes) return encoded;
    }
    if (std::min(picture.cols, picture.rows) < 16) break;
    cv::resize(picture, picture, {}, 0.75, 0.75, cv::INTER_AREA);
  }
  return {};
}

// The aim keeps its scale: where it is too large even at the lowest quality, less of it is shown.
std::string cut_within(cv::Mat picture, std::size_t bytes) {
  while (!picture.empty()) {
    for (const int quality : kQualities) {
      std::string encoded = encode_jpeg(picture, quality);
      if (encoded.size() <= bytes) return encoded;
    }
    if (std::min(picture.cols, picture.rows) < 16) break;
    const int width = picture.cols * 4 / 5, height = picture.rows * 4 / 5;
    picture = picture(cv::Rect((picture.cols - width) / 2, (picture.rows - height) / 2, width, height));
  }
  return {};
}

}  // namespace

Decoded<Previews> make_previews(std::span<const std::byte> file, const PreviewOptions& options) {
  PreviewSink sink(options);
  if (auto decoded = decode_picture(file, sink); !decoded) return tl::unexpected(decoded.error());
  cv::Mat whole = sink.whole();
  if (const int longer = std::max(whole.cols, whole.rows); longer > options.whole_side_px) {
    const double scale = static_cast<double>(options.whole_side_px) / longer;
    cv::resize(whole, whole, {}, scale, scale, cv::INTER_AREA);
  }
  return Previews{.whole = encoded_within(upright(whole, options.orientation), options.whole_bytes),
                  .aim = cut_within(upright(sink.aim(), options.orientation), options.aim_bytes)};
}

}  // namespace focusfall
