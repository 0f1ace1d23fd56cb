#include "analysis/measure/tone.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <cstring>
#include <span>

namespace focusfall {
namespace {

// Neighbouring pixels often have the same code; counted into one table, each would wait for the one before.
constexpr int kLanes = 4;

void count_8bit(const std::uint8_t* codes, int count, std::uint32_t* lanes) {
  int x = 0;
  for (; x + 8 <= count; x += 8) {
    std::uint64_t eight;
    std::memcpy(&eight, codes + x, sizeof eight);
    for (unsigned i = 0; i < 8; ++i) ++lanes[((eight >> (8 * i)) & 0xFF) * kLanes + i % kLanes];
  }
  for (; x < count; ++x) ++lanes[codes[x] * kLanes];
}

// The table of 16-bit codes is large as it is: one lane.
void count_16bit(const std::uint16_t* codes, int count, std::uint32_t* counts) {
  for (int x = 0; x < count; ++x) ++counts[codes[x]];
}

int quantile_code(std::span<const std::uint64_t> counts, std::uint64_t total, double quantile) {
  const auto place = std::max<std::uint64_t>(1, static_cast<std::uint64_t>(std::ceil(quantile * static_cast<double>(total))));
  std::uint64_t below = 0;
  for (std::size_t code = 0; code < counts.size(); ++code) {
    below += counts[code];
    if (below >= place) return static_cast<int>(code);
  }
  return static_cast<int>(counts.size()) - 1;
}

}  // namespace

void ToneAccumulator::start(int code_count, PixelRect aim) {
  assert(code_count == 256 || code_count == 65536);
  code_count_ = code_count;
  aim_ = aim;
  lanes_.assign(static_cast<std::size_t>(code_count) * static_cast<std::size_t>(code_count == 256 ? kLanes : 1), 0);
  aim_lanes_.assign(lanes_.size(), 0);
}

void ToneAccumulator::take(int first_row, const cv::Mat& luma) {
  assert(luma.type() == (code_count_ == 256 ? CV_8UC1 : CV_16UC1));
  const int left = std::clamp(aim_.x, 0, luma.cols);
  const int right = std::clamp(aim_.x + aim_.width, left, luma.cols);
  for (int row = 0; row < luma.rows; ++row) {
    const int y = first_row + row;
    const bool in_aim = y >= aim_.y && y < aim_.y + aim_.height && right > left;
    if (code_count_ == 256) {
      count_8bit(luma.ptr<std::uint8_t>(row), luma.cols, lanes_.data());
      if (in_aim) count_8bit(luma.ptr<std::uint8_t>(row) + left, right - left, aim_lanes_.data());
    } else {
      count_16bit(luma.ptr<std::uint16_t>(row), luma.cols, lanes_.data());
      if (in_aim) count_16bit(luma.ptr<std::uint16_t>(row) + left, right - left, aim_lanes_.data());
    }
  }
}

std::vector<std::uint64_t> ToneAccumulator::counts(const std::vector<std::uint32_t>& lanes) const {
  std::vector<std::uint64_t> counts(static_cast<std::size_t>(code_count_), 0);
  const std::size_t per_code = lanes.size() / counts.size();
  for (std::size_t i = 0; i < lanes.size(); ++i) counts[i / per_code] += lanes[i];
  return counts;
}

std::optional<Tone> ToneAccumulator::tone(const std::vector<float>& linear_of_code) const {
  assert(static_cast<int>(linear_of_code.size()) == code_count_);
  const auto all = counts(lanes_);
  std::uint64_t total = 0;
  double sum = 0;
  for (std::size_t code = 0; code < all.size(); ++code) {
    total += all[code];
    sum += static_cast<double>(all[code]) * static_cast<double>(linear_of_code[code]);
  }
  if (total == 0) return std::nullopt;
  const auto linear = [&](int code) { return static_cast<double>(linear_of_code[static_cast<std::size_t>(code)]); };
  Tone tone;
  tone.mean_linear = sum / static_cast<double>(total);
  tone.median_linear = linear(quantile_code(all, total, 0.5));
  tone.p99_linear = linear(quantile_code(all, total, 0.99));

  const auto aim = counts(aim_lanes_);
  std::uint64_t aim_total = 0;
  for (const auto count : aim) aim_total += count;
  if (aim_total > 0) tone.aim_median_linear = linear(quantile_code(aim, aim_total, 0.5));
  return tone;
}

}  // namespace focusfall
