#include "analysis/measure/edges.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>

#include "analysis/measure/edge_fit.h"
#include "analysis/measure/edge_tables.h"
#include "analysis/measure/vector_kernel.h"

namespace focusfall {
namespace {

constexpr int kBlock = 32;               // px of a level: the grid on which edges are rationed
constexpr int kPanelWidth = 480;         // px: the working set of a panel stays in the second-level cache
constexpr int kGradientReach = 3;        // px on either side of the 7-tap filters
constexpr float kLeastGradient = 8.0f;   // in standard deviations of its noise (measured: 1 false edge in 10^9)
constexpr float kBrightestNear = 0.965f, kDarkestNear = 0.0009f;   // linear; beyond, clipping has eaten the profile
constexpr float kMostOffset = 1.35f;     // px between the gradient's crest and the fitted edge
constexpr float kMostResidual = 0.06f, kMostResidualSaturated = 0.12f;   // rms / amplitude
constexpr float kLeastContrast = 10.0f;  // amplitude in standard deviations of the noise
constexpr float kSaturatedSigma = 2.65f; // level px: wider, the 8 px window no longer holds the edge
constexpr float kSharpestSigma = 0.30f;  // level-0 px: sharper than any optics, a hot pixel or a drawn line
constexpr int kLeastCrowd = 3;           // crests tried before a block may be called crowded
constexpr float kCrowdedShare = 0.5f;    // of them that pass the gates: fewer, and the block is crowded,
constexpr float kNarrowSigma = 1.3f;     //   if half of them fit an edge narrower than this (c of some 4 px on level 1)
constexpr double kTriesPerEdge = 1.5;     // crests fitted at most for each edge kept: crowded ones often fail the gates
constexpr float kNoisePerLevel = 0.4f;   // of the noise survives each halving; .31 if it were white, more after demosaicing

// Derivative of a Gaussian and the Gaussian, standard deviation 1, 7 taps.
struct GradientKernel {
  std::array<float, 7> smooth{}, slope{};
  float noise_gain = 0;   // standard deviation of the gradient for unit white noise
  GradientKernel() {
    double sum = 0, moment = 0;
    for (int i = -3; i <= 3; ++i) sum += std::exp(-0.5 * i * i);
    for (int i = -3; i <= 3; ++i) moment += i * i * std::exp(-0.5 * i * i);
    double s2 = 0, d2 = 0;
    for (int i = -3; i <= 3; ++i) {
      const double s = std::exp(-0.5 * i * i) / sum, d = i * std::exp(-0.5 * i * i) / moment;
      smooth[static_cast<std::size_t>(i + 3)] = static_cast<float>(s);
      slope[static_cast<std::size_t>(i + 3)] = static_cast<float>(d);
      s2 += s * s;
      d2 += d * d;
    }
    noise_gain = static_cast<float>(std::sqrt(s2 * d2));
  }
};

const GradientKernel& kernel() {
  static const GradientKernel instance;
  return instance;
}

// Noise in linear light at linear value v, for `noise` 8-bit codes of it: the slope of the sRGB curve, which above its
// straight start at kDarkest is close to this power.
constexpr float kDarkest = 0.0031f, kSlope = 2.275f / 255.0f, kSlopePower = 0.5833f;
float linear_noise(float v, float noise) { return noise * kSlope * std::pow(std::max(v, kDarkest), kSlopePower); }

// Noise against value, tabulated: the power is too slow for every crest.
class NoiseCurve {
 public:
  explicit NoiseCurve(float noise) {
    for (std::size_t i = 0; i <= kEntries; ++i) {
      sigma_[i] = linear_noise(static_cast<float>(i) / kEntries, noise);
    }
  }
  float at(float v) const {
    return sigma_[static_cast<std::size_t>(std::clamp(v, 0.0f, 1.0f) * kEntries + 0.5f)];
  }

 private:
  static constexpr std::size_t kEntries = 1024;
  std::array<float, kEntries + 1> sigma_{};
};

// A hash of place and level, .5..1: edges are rationed by signal to noise times this, because taking the strongest
// alone would favour the sharpest.
float lottery(int x, int y, int level) {
  std::uint32_t h = static_cast<std::uint32_t>(x) * 0x9E3779B1u ^ static_cast<std::uint32_t>(y) * 0x85EBCA77u ^
                    static_cast<std::uint32_t>(level) * 0xC2B2AE3Du;
  h ^= h >> 15;
  h *= 0x2C1B3C6Du;
  h ^= h >> 12;
  return 0.5f + 0.5f * static_cast<float>(h & 0xFFFF) / 65535.0f;
}

FOCUSFALL_VECTOR void filter_row(const float* __restrict in, int width, float* __restrict smooth, float* __restrict slope) {
  const auto& k = kernel();
  const float s0 = k.smooth[3], s1 = k.smooth[4], s2 = k.smooth[5], s3 = k.smooth[6];
  const float d1 = k.slope[4], d2 = k.slope[5], d3 = k.slope[6];
  for (int i = 0; i < width; ++i) {
    const float* a = in + i + 3;
    smooth[i] = s0 * a[0] + s1 * (a[-1] + a[1]) + s2 * (a[-2] + a[2]) + s3 * (a[-3] + a[3]);
    slope[i] = d1 * (a[1] - a[-1]) + d2 * (a[2] - a[-2]) + d3 * (a[3] - a[-3]);
  }
}

// Combines seven filtered rows, `stride` apart and centred on `smooth`/`slope`, into one row of the gradient.
FOCUSFALL_VECTOR void gradient_row(const float* __restrict smooth, const float* __restrict slope, int stride, int width,
                  float* __restrict gx, float* __restrict gy) {
  const auto& k = kernel();
  const float s0 = k.smooth[3], s1 = k.smooth[4], s2 = k.smooth[5], s3 = k.smooth[6];
  const float d1 = k.slope[4], d2 = k.slope[5], d3 = k.slope[6];
  for (int i = 0; i < width; ++i) {
    const float* a = smooth + i;
    const float* b = slope + i;
    gx[i] = s0 * b[0] + s1 * (b[-stride] + b[stride]) + s2 * (b[-2 * stride] + b[2 * stride]) +
            s3 * (b[-3 * stride] + b[3 * stride]);
    gy[i] = d1 * (a[stride] - a[-stride]) + d2 * (a[2 * stride] - a[-2 * stride]) +
            d3 * (a[3 * stride] - a[-3 * stride]);
  }
}

FOCUSFALL_VECTOR void square_row(const float* __restrict gx, const float* __restrict gy, int n,
                                 float* __restrict square) {
  for (int i = 0; i < n; ++i) square[i] = gx[i] * gx[i] + gy[i] * gy[i];
}

// Marks the pixels of a row that are crests of the gradient along its own direction and may stand out of the noise:
// |g|^2 > scale max(v, .0031), which lies below the exact threshold for every v (see LevelSearch::search_block).
// The neighbours ahead and behind are interpolated between the straight and the diagonal one; everything is multiplied
// by the larger component, which spares the division. `square` points at the row's |g|^2, rows `stride` apart.
FOCUSFALL_VECTOR int mark_crests(const float* __restrict gx, const float* __restrict gy, const float* __restrict square,
                                 int stride, const float* __restrict value, int n, float scale,
                                 std::int32_t* __restrict mark) {
  int any = 0;
  for (int i = 0; i < n; ++i) {
    const float* s = square + i;
    // All eight neighbours are loaded whether needed or not: the choice is then arithmetic and the loop a vector one.
    const float right = s[1], left = s[-1], down = s[stride], up = s[-stride];
    const float down_right = s[stride + 1], up_left = s[-stride - 1];
    const float down_left = s[stride - 1], up_right = s[1 - stride];
    const float x = gx[i], y = gy[i];
    const float ax = x < 0 ? -x : x, ay = y < 0 ? -y : y;
    const bool along_x = ax >= ay;
    const bool falling = x * y >= 0;                      // the gradient points along the falling diagonal
    const float large = along_x ? ax : ay, small = along_x ? ay : ax;
    const float straight1 = along_x ? right : down, straight2 = along_x ? left : up;
    const float rising1 = along_x ? up_right : down_left, rising2 = along_x ? down_left : up_right;
    const float diagonal1 = falling ? down_right : rising1, diagonal2 = falling ? up_left : rising2;
    const float m = s[0] * large;
    const float v = value[i] > kDarkest ? value[i] : kDarkest;
    const int crest = (s[0] > scale * v) & (m > (large - small) * straight1 + small * diagonal1) &
                      (m >= (large - small) * straight2 + small * diagonal2);
    mark[i] = crest;
    any |= crest;
  }
  return any;
}

bool passes_gates(const EdgeFit& fit, const NoiseCurve& noise, int level) {
  if (fit.amplitude <= 0 || std::abs(fit.offset_px) > kMostOffset) return false;
  const bool saturated = fit.sigma_px > kSaturatedSigma;
  if (fit.residual > (saturated ? kMostResidualSaturated : kMostResidual)) return false;
  if (fit.amplitude < kLeastContrast * noise.at(fit.base + 0.5f * fit.amplitude)) return false;
  return level > 0 || fit.sigma_px >= kSharpestSigma;
}

float square(float v) { return v * v; }

struct Crest {
  float x, y, nx, ny;   // level px; unit normal towards the bright side
};

struct Candidate {
  int x, y;             // pixel of the panel
  float rank;
};

// The part of a level that one pass looks at: whole pixels of the level's own region.
struct LevelWindow {
  int level;
  int width, height;         // of the level
  int x0, y0, x1, y1;        // search window, already clear of the border
  int origin_x, origin_y;    // of the level's region in the whole picture, px of the level
};

// Linear values of a level at whole coordinates, level 0 through the curve. row() gives `count` values from (x, y) on,
// in place or written to `space`.
struct LinearPixels {
  const float* values;
  std::size_t stride;
  float operator()(int x, int y) const { return values[static_cast<std::size_t>(y) * stride + x]; }
  const float* row(int x, int y, int, float*) const { return values + static_cast<std::size_t>(y) * stride + x; }
};
template <class Code>
struct CodedPixels {
  const Code* codes;
  std::size_t stride;
  const float* curve;
  float operator()(int x, int y) const { return curve[codes[static_cast<std::size_t>(y) * stride + x]]; }
  const float* row(int x, int y, int count, float* space) const {
    const Code* __restrict in = codes + static_cast<std::size_t>(y) * stride + x;
    for (int i = 0; i < count; ++i) space[i] = curve[in[i]];
    return space;
  }
};

template <class Pixels>
class LevelSearch {
 public:
  LevelSearch(const Pixels& pixels, const LevelWindow& window, float noise, const EdgeSearchOptions& options,
              EdgeSearchBuffers& buffers)
      : pixels_(pixels), window_(window), noise_(noise), codes_of_noise_(noise), options_(options), buffers_(buffers) {}

  // Calls `found(crest, fit)` for every edge that passes the gates, block by block.
  template <class Found>
  void run(const Found& found) {
    for (int y = window_.y0; y < window_.y1; y += kBlock) {
      const int rows = std::min(kBlock, window_.y1 - y);
      int x = window_.x0;
      while (x < window_.x1) {
        const int end = panel_end(x, y, rows);
        if (end == x) {
          x += kBlock;
          continue;
        }
        fill_panel(x, y, end - x, rows);
        for (int bx = 0; bx < end - x; bx += kBlock) {
          search_block(bx, std::min(kBlock, end - x - bx), rows);
          fit_block(x + bx, y, found);
        }
        x = end;
      }
    }
  }

 private:
  // Whether any tile under the block at (x, y) is wanted.
  bool wanted(int x, int y, int columns, int rows) const {
    if (!options_.tiles) return true;
    const int scale = 1 << window_.level;
    return options_.tiles->any({(window_.origin_x + x) * scale, (window_.origin_y + y) * scale, columns * scale,
                                rows * scale});
  }

  // End of the run of wanted blocks that starts at x, at most a panel wide; x itself if the first is not wanted.
  int panel_end(int x, int y, int rows) const {
    const int limit = std::min(x + kPanelWidth, window_.x1);
    int end = x;
    while (end < limit && wanted(end, y, std::min(kBlock, limit - end), rows)) end = std::min(end + kBlock, limit);
    return end;
  }

  // Fits crests, best first, until the block has its share; notes blocks so crowded with fine detail that most fail.
  template <class Found>
  void fit_block(int x, int y, const Found& found) {
    int kept = 0, tried = 0;
    narrow_ = 0;
    for (const Candidate& candidate : candidates_) {
      if (kept >= options_.edges_per_block) break;
      kept += fit_crest(placed(candidate), found);
      ++tried;
    }
    if (!options_.crowded || tried < kLeastCrowd || static_cast<float>(kept) >= kCrowdedShare * static_cast<float>(tried)) return;
    if (2 * narrow_ < tried) return;
    const int scale = 1 << window_.level;
    options_.crowded->push_back({(window_.origin_x + x) * scale, (window_.origin_y + y) * scale, kBlock * scale,
                                 kBlock * scale});
  }

  // Gradient of the panel and one pixel around it.
  void fill_panel(int x0, int y0, int columns, int rows) {
    panel_x_ = x0;
    panel_y_ = y0;
    const int width = columns + 2;                        // gradient columns
    const int loaded = width + 2 * kGradientReach;        // pixels a row
    const int source_rows = rows + 2 + 2 * kGradientReach;
    stride_ = width;
    buffers_.linear.resize(static_cast<std::size_t>(loaded) * source_rows);
    buffers_.smooth_x.resize(static_cast<std::size_t>(width) * source_rows);
    buffers_.slope_x.resize(buffers_.smooth_x.size());
    buffers_.gradient_x.resize(static_cast<std::size_t>(width) * (rows + 2));
    buffers_.gradient_y.resize(buffers_.gradient_x.size());
    buffers_.square.resize(buffers_.gradient_x.size());
    for (int r = 0; r < source_rows; ++r) {
      const int y = y0 - 1 - kGradientReach + r;
      const int x = x0 - 1 - kGradientReach;
      const float* linear = pixels_.row(x, y, loaded, buffers_.linear.data() + r * loaded);
      rows_[static_cast<std::size_t>(r)] = linear;
      filter_row(linear, width, buffers_.smooth_x.data() + r * stride_, buffers_.slope_x.data() + r * stride_);
    }
    for (int r = 0; r < rows + 2; ++r) {
      gradient_row(buffers_.smooth_x.data() + (r + kGradientReach) * stride_,
                   buffers_.slope_x.data() + (r + kGradientReach) * stride_, stride_, width,
                   buffers_.gradient_x.data() + r * stride_, buffers_.gradient_y.data() + r * stride_);
      square_row(buffers_.gradient_x.data() + r * stride_, buffers_.gradient_y.data() + r * stride_, width,
                 buffers_.square.data() + r * stride_);
    }
  }

  // Crests of the gradient in one block of the panel, rationed.
  void search_block(int bx, int columns, int rows) {
    candidates_.clear();
    const float least = kLeastGradient * kernel().noise_gain;
    // sigma(v)^2 = (slope noise)^2 v^(2 power); v^(2 power - 1) falls towards kDarkest, where it is taken for the mark.
    const float scale = square(least * kSlope * codes_of_noise_) * std::pow(kDarkest, 2 * kSlopePower - 1);
    for (int r = 0; r < rows; ++r) {
      const float* gx = buffers_.gradient_x.data() + (r + 1) * stride_ + bx + 1;
      const float* gy = buffers_.gradient_y.data() + (r + 1) * stride_ + bx + 1;
      const float* value = rows_[static_cast<std::size_t>(r + 1 + kGradientReach)] + bx + 1 + kGradientReach;
      const float* squares = buffers_.square.data() + (r + 1) * stride_ + bx + 1;
      std::array<std::int32_t, kBlock> mark;
      if (!mark_crests(gx, gy, squares, stride_, value, columns, scale, mark.data())) continue;
      for (int i = 0; i < columns; ++i) {
        if (mark[static_cast<std::size_t>(i)]) consider(squares[i], value[i], bx + i, r, least);
      }
    }
    ration();
  }

  // Ranks a marked crest, if it stands out of the noise.
  void consider(float square, float value, int x, int y, float least) {
    const float sigma = noise_.at(value);
    if (square < least * least * sigma * sigma) return;
    candidates_.push_back({x, y, std::sqrt(square) / sigma * lottery(window_.origin_x + panel_x_ + x,
                                                                     window_.origin_y + panel_y_ + y, window_.level)});
  }

  // Places a crest to a fraction of a pixel: the vertex of the parabola through the three magnitudes, in steps of the
  // interpolated neighbour's distance.
  Crest placed(const Candidate& candidate) const {
    const std::ptrdiff_t at = (candidate.y + 1) * static_cast<std::ptrdiff_t>(stride_) + candidate.x + 1;
    const float gx = buffers_.gradient_x[static_cast<std::size_t>(at)], gy = buffers_.gradient_y[static_cast<std::size_t>(at)];
    const float* squares = buffers_.square.data() + at;
    const float ax = std::abs(gx), ay = std::abs(gy);
    const bool along_x = ax >= ay;
    const float f = along_x ? ay / ax : ax / ay;
    const int sx = gx >= 0 ? 1 : -1, sy = gy >= 0 ? 1 : -1;
    const std::ptrdiff_t straight = along_x ? sx : sy * stride_;
    const std::ptrdiff_t diagonal = sx + static_cast<std::ptrdiff_t>(sy) * stride_;
    const float m = std::sqrt(squares[0]);
    const float ahead = std::sqrt((1 - f) * squares[straight] + f * squares[diagonal]);
    const float behind = std::sqrt((1 - f) * squares[-straight] + f * squares[-diagonal]);
    const float curvature = ahead + behind - 2 * m;
    const float vertex = curvature < 0 ? 0.5f * (behind - ahead) / curvature : 0.0f;
    const float shift = std::clamp(vertex, -0.5f, 0.5f) * std::sqrt(1 + f * f);
    const float nx = gx / m, ny = gy / m;
    return {static_cast<float>(panel_x_ + candidate.x) + shift * nx, static_cast<float>(panel_y_ + candidate.y) + shift * ny,
            nx, ny};
  }

  // Keeps the best, in order.
  void ration() {
    const auto most = static_cast<std::size_t>(std::ceil(kTriesPerEdge * options_.edges_per_block));
    const std::size_t kept = std::min(most, candidates_.size());
    std::partial_sort(candidates_.begin(), candidates_.begin() + static_cast<std::ptrdiff_t>(kept), candidates_.end(),
                      [](const Candidate& a, const Candidate& b) { return a.rank > b.rank; });
    candidates_.resize(kept);
  }

  template <class Found>
  bool fit_crest(const Crest& crest, const Found& found) {
    gather_profile(pixels_, crest.x, crest.y, crest.nx, crest.ny, profile_);
    if (profile_.highest > kBrightestNear || profile_.lowest < kDarkestNear) return false;
    const auto fit = fit_profile(profile_);
    if (!fit) return false;
    narrow_ += fit->sigma_px < kNarrowSigma;
    if (!passes_gates(*fit, noise_, window_.level)) return false;
    found(crest, *fit);
    return true;
  }


  const Pixels& pixels_;
  const LevelWindow window_;
  const NoiseCurve noise_;
  const float codes_of_noise_;
  const EdgeSearchOptions& options_;
  EdgeSearchBuffers& buffers_;
  std::vector<Candidate> candidates_;
  EdgeProfile profile_;
  std::array<const float*, kBlock + 2 + 2 * kGradientReach> rows_{};   // of the panel and what its filters reach
  int panel_x_ = 0, panel_y_ = 0, stride_ = 0;
  int narrow_ = 0;   // crests of the block whose profile fits a narrow edge, whether it passes the gates or not
};

// The search window of one level for a region of level 0: inside the pyramid, clear of its border.
LevelWindow level_window(const Pyramid& pyramid, PixelRect region, int level) {
  const int width = pyramid.width(level), height = pyramid.height(level);
  const int border = kProfileReach + 1;
  const int x = region.x - pyramid.region.x, y = region.y - pyramid.region.y;
  auto up = [level](int v) { return (v + (1 << level) - 1) >> level; };
  return {level,
          width,
          height,
          std::max(x >> level, border),
          std::max(y >> level, border),
          std::min(up(x + region.width), width - border),
          std::min(up(y + region.height), height - border),
          pyramid.region.x >> level,
          pyramid.region.y >> level};
}

// A sample in level-0 px from a fit at (x, y) of a level.
EdgeSample edge_sample(const Pyramid& pyramid, int level, float x, float y, float nx, float ny, const EdgeFit& fit) {
  const float scale = static_cast<float>(1 << level);
  const float centre = 0.5f * (scale - 1);
  EdgeSample edge;
  edge.x = (x + fit.offset_px * nx) * scale + centre + static_cast<float>(pyramid.region.x);
  edge.y = (y + fit.offset_px * ny) * scale + centre + static_cast<float>(pyramid.region.y);
  edge.normal_x = nx;
  edge.normal_y = ny;
  edge.squared_disc_px2 = squared_disc_of_width(level, fit.sigma_px);
  edge.amplitude = fit.amplitude;
  edge.residual = fit.residual;
  edge.width_level_px = fit.sigma_px;
  edge.level = static_cast<std::uint8_t>(level);
  edge.saturated = fit.sigma_px > kSaturatedSigma;
  return edge;
}

float level_noise(double noise_codes, int level) {
  return static_cast<float>(noise_codes) * std::pow(kNoisePerLevel, static_cast<float>(level));
}

// Calls `use(pixels)` with the pixels of a level; false if the pyramid has no such level.
template <class Use>
bool with_pixels(const Pyramid& pyramid, int level, const Use& use) {
  const cv::Mat& codes = pyramid.picture->codes;
  const float* curve = pyramid.picture->linear_of_code.data();
  if (level > 0) {
    const cv::Mat& values = pyramid.levels[static_cast<std::size_t>(level)];
    if (values.empty()) return false;
    use(LinearPixels{values.ptr<float>(), values.step1()});
  } else if (codes.depth() == CV_16U) {
    use(CodedPixels<std::uint16_t>{codes.ptr<std::uint16_t>(pyramid.region.y) + pyramid.region.x, codes.step1(), curve});
  } else {
    use(CodedPixels<std::uint8_t>{codes.ptr<std::uint8_t>(pyramid.region.y) + pyramid.region.x, codes.step1(), curve});
  }
  return true;
}

template <class Pixels>
void refit_on(const Pixels& pixels, const Pyramid& pyramid, double noise_codes, int level,
              std::span<const EdgeSample> coarse, std::vector<EdgeSample>& edges) {
  const NoiseCurve noise(level_noise(noise_codes, level));
  const float scale = static_cast<float>(1 << level), centre = 0.5f * (scale - 1);
  const float last_x = static_cast<float>(pyramid.width(level) - kProfileReach - 1);
  const float last_y = static_cast<float>(pyramid.height(level) - kProfileReach - 1);
  EdgeProfile profile;
  for (const EdgeSample& edge : coarse) {
    const float x = (edge.x - static_cast<float>(pyramid.region.x) - centre) / scale;
    const float y = (edge.y - static_cast<float>(pyramid.region.y) - centre) / scale;
    if (x < kProfileReach || y < kProfileReach || x >= last_x || y >= last_y) continue;
    gather_profile(pixels, x, y, edge.normal_x, edge.normal_y, profile);
    if (profile.highest > kBrightestNear || profile.lowest < kDarkestNear) continue;
    // A Gaussian twice as wide on twice as fine a level, the pyramid's own filter aside.
    const auto fit = fit_profile(profile, edge.width_level_px * static_cast<float>(1 << (edge.level - level)));
    if (fit && passes_gates(*fit, noise, level)) {
      edges.push_back(edge_sample(pyramid, level, x, y, edge.normal_x, edge.normal_y, *fit));
    }
  }
}

}  // namespace

bool TileMask::any(PixelRect region) const {
  const int x1 = std::min((region.x + region.width - 1) / tile_px, columns - 1);
  const int y1 = std::min((region.y + region.height - 1) / tile_px, rows - 1);
  for (int y = region.y / tile_px; y <= y1; ++y) {
    for (int x = region.x / tile_px; x <= x1; ++x) {
      if (wanted[static_cast<std::size_t>(y * columns + x)]) return true;
    }
  }
  return false;
}

void find_edges(const Pyramid& pyramid, PixelRect region, double noise_codes, const EdgeSearchOptions& options,
                EdgeSearchBuffers& buffers, std::vector<EdgeSample>& edges) {
  for (int level = options.finest_level; level <= options.coarsest_level; ++level) {
    const LevelWindow window = level_window(pyramid, region, level);
    if (window.x0 >= window.x1 || window.y0 >= window.y1) continue;
    const bool there = with_pixels(pyramid, level, [&]<class Pixels>(const Pixels& pixels) {
      LevelSearch<Pixels>(pixels, window, level_noise(noise_codes, level), options, buffers)
          .run([&](const Crest& crest, const EdgeFit& fit) {
            edges.push_back(edge_sample(pyramid, level, crest.x, crest.y, crest.nx, crest.ny, fit));
          });
    });
    if (!there) break;
  }
}

void refit_edges(const Pyramid& pyramid, double noise_codes, int level, std::span<const EdgeSample> coarse,
                 std::vector<EdgeSample>& edges) {
  with_pixels(pyramid, level,
              [&](const auto& pixels) { refit_on(pixels, pyramid, noise_codes, level, coarse, edges); });
}

}  // namespace focusfall
