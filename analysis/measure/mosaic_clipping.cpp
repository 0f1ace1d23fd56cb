#include "analysis/measure/mosaic_clipping.h"

#include <algorithm>
#include <bit>
#include <cassert>
#include <cmath>

namespace focusfall {
namespace {

constexpr std::size_t kCodes = 65536;
constexpr std::uint8_t kLight = 8;   // beside the bits 1, 2, 4 of saturated red, green, blue
constexpr int kWordCells = 64;

std::size_t index(int i) { return static_cast<std::size_t>(i); }

// The code at place ceil(q n) in ascending order, counted from 1.
std::size_t quantile(const std::vector<std::uint32_t>& counts, double q) {
  std::uint64_t total = 0, below = 0;
  for (const std::uint32_t count : counts) total += count;
  const auto place = std::max<std::uint64_t>(1, static_cast<std::uint64_t>(std::ceil(q * static_cast<double>(total))));
  for (std::size_t code = 0; code < counts.size(); ++code) {
    below += counts[code];
    if (below >= place) return code;
  }
  return counts.size() - 1;
}

double fraction(std::int64_t part, std::int64_t whole) {
  return whole > 0 ? static_cast<double>(part) / static_cast<double>(whole) : 0;
}

}  // namespace

void MosaicAccumulator::start(const MosaicFormat& format, const MosaicClippingOptions& options) {
  assert(format.sites.size() == (format.linear_rgb ? 3U : index(format.period_x * format.period_y)));
  format_ = format;
  counts_ = {};
  patches_.start();
  const int columns = format.width_px / format.cell_px, rows = format.height_px / format.cell_px;
  cell_flags_.assign(index(columns), 0);
  mask_.assign(index((columns + kWordCells - 1) / kWordCells), 0);
  for (auto& histogram : histograms_) histogram.assign(kCodes, 0);
  aim_green_.assign(kCodes, 0);

  aim_ = {};
  if (options.aim) {
    const auto cell = [](double part, int cells) { return std::clamp(static_cast<int>(std::lround(part * cells)), 0, cells); };
    aim_.x = cell(options.aim->x, columns);
    aim_.y = cell(options.aim->y, rows);
    aim_.width = cell(options.aim->x + options.aim->width, columns) - aim_.x;
    aim_.height = cell(options.aim->y + options.aim->height, rows) - aim_.y;
  }

  // The span of a colour is the mean over its sites; they differ by a few codes of black.
  std::array<double, 3> sum{}, sites{};
  for (const MosaicSite& site : format.sites) {
    sum[site.channel] += static_cast<double>(site.white - site.black);
    ++sites[site.channel];
  }
  for (std::size_t c = 0; c < 3; ++c) span_[c] = sites[c] > 0 ? std::max(sum[c] / sites[c], 1.0) : 1.0;
}

void MosaicAccumulator::take(const MosaicStrip& strip) {
  assert(strip.codes.type() == (format_.linear_rgb ? CV_16UC3 : CV_16UC1) && strip.codes.cols == format_.width_px);
  for (int row = 0; row < strip.codes.rows; ++row) {
    const int y = strip.first_row + row;
    if (y % format_.cell_px == 0) std::fill(cell_flags_.begin(), cell_flags_.end(), std::uint8_t{0});
    count_row(y, strip.codes, row);
    if (y % format_.cell_px == format_.cell_px - 1) finish_cells(y / format_.cell_px);
  }
  counts_.largest_patch = patches_.largest();
}

void MosaicAccumulator::count_row(int y, const cv::Mat& codes, int row) {
  const int step = format_.linear_rgb ? 3 : 1;                 // codes of one pixel
  const int phases = format_.linear_rgb ? 3 : format_.period_x;
  const MosaicSite* sites = format_.sites.data() + (format_.linear_rgb ? 0 : y % format_.period_y * format_.period_x);
  const auto* first = codes.ptr<std::uint16_t>(row);
  const int count = format_.width_px * step;
  const int cell_codes = format_.cell_px * step;
  const int cells = format_.width_px / format_.cell_px;
  const bool row_in_aim = y / format_.cell_px >= aim_.y && y / format_.cell_px < aim_.y + aim_.height;

  for (int phase = 0; phase < phases; ++phase) {
    const MosaicSite& site = sites[phase];
    const int white = static_cast<int>(std::ceil(site.white)), black = static_cast<int>(std::lround(site.black));
    const auto saturated_bit = static_cast<std::uint8_t>(1 << site.channel);
    auto* histogram = histograms_[site.channel].data();
    std::int64_t saturated = 0, sites_seen = 0;
    for (int x = phase; x < count; x += phases) {
      const int code = first[x];
      const std::size_t level = index(std::max(code - black, 0));
      ++histogram[level];
      ++sites_seen;
      std::uint8_t flags = static_cast<float>(code) > site.black ? kLight : std::uint8_t{0};
      if (code >= white) {
        ++saturated;
        flags = static_cast<std::uint8_t>(flags | saturated_bit);
      }
      const int cell = x / cell_codes;
      if (cell < cells) cell_flags_[index(cell)] = static_cast<std::uint8_t>(cell_flags_[index(cell)] | flags);
      if (row_in_aim && site.channel == 1 && cell >= aim_.x && cell < aim_.x + aim_.width) ++aim_green_[level];
    }
    counts_.saturated[site.channel] += saturated;
    counts_.photosites[site.channel] += sites_seen;
  }
}

void MosaicAccumulator::finish_cells(int cell_row) {
  std::fill(mask_.begin(), mask_.end(), std::uint64_t{0});
  const bool in_aim = cell_row >= aim_.y && cell_row < aim_.y + aim_.height;
  for (std::size_t cell = 0; cell < cell_flags_.size(); ++cell) {
    const std::uint8_t flags = cell_flags_[cell];
    const int colours = std::popcount(static_cast<unsigned>(flags & 7));
    counts_.any += colours >= 1;
    counts_.two_or_more += colours >= 2;
    counts_.shadows += flags == 0;
    if (colours >= 2) mask_[cell / kWordCells] |= std::uint64_t{1} << (cell % kWordCells);
    if (!in_aim || static_cast<int>(cell) < aim_.x || static_cast<int>(cell) >= aim_.x + aim_.width) continue;
    ++counts_.aim_cells;
    counts_.aim_any += colours >= 1;
    counts_.aim_two_or_more += colours >= 2;
  }
  counts_.cells += static_cast<std::int64_t>(cell_flags_.size());
  patches_.take_row(mask_.data(), static_cast<int>(mask_.size()));
}

Clipping MosaicAccumulator::clipping() const {
  Clipping clipping;
  clipping.red = fraction(counts_.saturated[0], counts_.photosites[0]);
  clipping.green = fraction(counts_.saturated[1], counts_.photosites[1]);
  clipping.blue = fraction(counts_.saturated[2], counts_.photosites[2]);
  clipping.any = fraction(counts_.any, counts_.cells);
  clipping.two_or_more = fraction(counts_.two_or_more, counts_.cells);
  clipping.aim_any = fraction(counts_.aim_any, counts_.aim_cells);
  clipping.aim_two_or_more = fraction(counts_.aim_two_or_more, counts_.aim_cells);
  clipping.largest_patch = fraction(counts_.largest_patch, counts_.cells);
  clipping.shadows_any = fraction(counts_.shadows, counts_.cells);
  clipping.measured_on = ClippedOn::mosaic;
  clipping.kind = clipped_kind(clipping);
  return clipping;
}

std::optional<Tone> MosaicAccumulator::tone() const {
  if (counts_.photosites[1] == 0) return std::nullopt;
  const auto level = [&](std::size_t code) { return std::min(static_cast<double>(code) / span_[1], 1.0); };
  const auto& green = histograms_[1];
  double sum = 0;
  for (std::size_t code = 0; code < kCodes; ++code) sum += level(code) * green[code];
  Tone tone;
  tone.mean_linear = sum / static_cast<double>(counts_.photosites[1]);
  tone.median_linear = level(quantile(green, 0.5));
  tone.p99_linear = level(quantile(green, 0.99));
  if (std::any_of(aim_green_.begin(), aim_green_.end(), [](std::uint32_t count) { return count > 0; })) {
    tone.aim_median_linear = level(quantile(aim_green_, 0.5));
  }
  return tone;
}

std::optional<double> MosaicAccumulator::headroom_ev(const Clipping& picture) const {
  const std::array<double, 3> clipped = {picture.red, picture.green, picture.blue};
  std::optional<double> least;
  for (std::size_t c = 0; c < 3; ++c) {
    const double wanted = clipped[c] * static_cast<double>(counts_.photosites[c]);
    if (wanted < 1) continue;   // less than one photosite tells nothing
    double above = 0;
    std::size_t code = kCodes;
    while (code > 1 && above < wanted) above += histograms_[c][--code];
    const double level = std::min(static_cast<double>(code) / span_[c], 1.0);
    const double stops = level < 1 ? -std::log2(level) : 0.0;
    least = std::min(least.value_or(stops), stops);
  }
  return least;
}

}  // namespace focusfall
