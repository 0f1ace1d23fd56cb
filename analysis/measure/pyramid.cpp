#include "analysis/measure/pyramid.h"

#include <algorithm>
#include <cstdint>

#include "analysis/measure/vector_kernel.h"

namespace focusfall {
namespace {

constexpr int kAlignment = 16;   // 2^(kLevels - 1): the corner of the region is a pixel corner on every level

// Halves a row: out[i] = (a[2i - 1] + 3 a[2i] + 3 a[2i + 1] + a[2i + 2]) / 8, edge pixels repeated.
// `padded` has one extra sample before index 0 and at least one after the end.
FOCUSFALL_VECTOR void halve_row(const float* __restrict padded, int out_width, float* __restrict out) {
  const float* a = padded + 1;
  for (int i = 0; i < out_width; ++i) {
    out[i] = 0.125f * (a[2 * i - 1] + 3.0f * (a[2 * i] + a[2 * i + 1]) + a[2 * i + 2]);
  }
}

FOCUSFALL_VECTOR void combine_rows(const float* __restrict r0, const float* __restrict r1, const float* __restrict r2,
                  const float* __restrict r3, int width, float* __restrict out) {
  for (int i = 0; i < width; ++i) out[i] = 0.125f * (r0[i] + 3.0f * (r1[i] + r2[i]) + r3[i]);
}

// `load(y, row)` writes source row y into row[0..in_width).
template <class LoadRow>
void halve(int in_width, int in_height, const LoadRow& load, cv::Mat& out) {
  const int out_width = in_width / 2;
  const int out_height = in_height / 2;
  out.create(out_height, out_width, CV_32FC1);
  std::vector<float> padded(static_cast<std::size_t>(in_width) + 3);
  std::vector<float> ring(4 * static_cast<std::size_t>(out_width));
  auto ring_row = [&](int y) { return ring.data() + static_cast<std::ptrdiff_t>(((y % 4) + 4) % 4) * out_width; };

  int loaded = -2;   // last source row whose halved copy is in the ring
  auto ensure = [&](int y) {
    while (loaded < y) {
      ++loaded;
      const int source = std::clamp(loaded, 0, in_height - 1);
      load(source, padded.data() + 1);
      padded[0] = padded[1];
      padded[static_cast<std::size_t>(in_width) + 1] = padded[static_cast<std::size_t>(in_width)];
      halve_row(padded.data(), out_width, ring_row(loaded));
    }
  };
  for (int y = 0; y < out_height; ++y) {
    ensure(2 * y + 2);
    combine_rows(ring_row(2 * y - 1), ring_row(2 * y), ring_row(2 * y + 1), ring_row(2 * y + 2), out_width,
                 out.ptr<float>(y));
  }
}

template <class Code>
void linearise_row(const Code* __restrict codes, const float* __restrict curve, int width, float* __restrict out) {
  for (int i = 0; i < width; ++i) out[i] = curve[codes[i]];
}

PixelRect aligned_region(const cv::Mat& codes, PixelRect region) {
  const int x0 = std::max(region.x, 0) / kAlignment * kAlignment;
  const int y0 = std::max(region.y, 0) / kAlignment * kAlignment;
  const int x1 = std::min(region.x + region.width + kAlignment - 1, codes.cols);
  const int y1 = std::min(region.y + region.height + kAlignment - 1, codes.rows);
  return {x0, y0, std::max(x1 - x0, 0), std::max(y1 - y0, 0)};
}

}  // namespace

int Pyramid::width(int level) const { return region.width >> level; }
int Pyramid::height(int level) const { return region.height >> level; }

void build_pyramid(const LumaPicture& picture, PixelRect region, int coarsest, Pyramid& pyramid) {
  pyramid.picture = &picture;
  pyramid.region = aligned_region(picture.codes, region);
  pyramid.levels.resize(Pyramid::kLevels);
  const PixelRect r = pyramid.region;
  const float* curve = picture.linear_of_code.data();
  for (int level = 1; level < Pyramid::kLevels; ++level) {
    const int in_width = r.width >> (level - 1);
    const int in_height = r.height >> (level - 1);
    if (level > coarsest || in_width < 2 || in_height < 2) {
      pyramid.levels[static_cast<std::size_t>(level)].release();
      continue;
    }
    cv::Mat& out = pyramid.levels[static_cast<std::size_t>(level)];
    if (level == 1) {
      const bool wide = picture.codes.depth() == CV_16U;
      halve(in_width, in_height,
            [&](int y, float* row) {
              if (wide) {
                linearise_row(picture.codes.ptr<std::uint16_t>(r.y + y) + r.x, curve, in_width, row);
              } else {
                linearise_row(picture.codes.ptr<std::uint8_t>(r.y + y) + r.x, curve, in_width, row);
              }
            },
            out);
    } else {
      const cv::Mat& source = pyramid.levels[static_cast<std::size_t>(level - 1)];
      halve(in_width, in_height,
            [&](int y, float* row) { std::copy_n(source.ptr<float>(y), in_width, row); }, out);
    }
  }
}

}  // namespace focusfall
