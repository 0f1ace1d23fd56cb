#include "analysis/measure/measure_frame.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "analysis/measure/edges.h"
#include "analysis/measure/frame_search.h"
#include "analysis/measure/motion.h"
#include "analysis/measure/noise.h"
#include "analysis/measure/plane.h"
#include "analysis/measure/pyramid.h"
#include "analysis/measure/region_estimate.h"
#include "analysis/measure/spectrum.h"

namespace focusfall {
namespace {

constexpr int kAimEdgesPerBlock = 6;      // the aim is small: take what is there
constexpr double kAimEdges = 1500;         // of a large aim on level 0: three hundred give its blur to 1 %
constexpr int kBlock_px = 32;              // EdgeSearchOptions::edges_per_block counts in these
constexpr int kLeastAimEdges = 12;        // below, the aim has no evidence (measured)
constexpr double kWidestInRegion = 0.2;   // c / side of the region: wider, soft shading passes for a blurred edge
constexpr double kWidestInTile = 0.33;     // the same of a tile of the map, which has edges alone and is only looked at
constexpr int kLeastBestEdges = 8;        // a tile with fewer is not taken for the sharpest; it is measured again then
constexpr int kTextureSquares = 60;        // looked at for fine texture, spread over the frame
constexpr double kLeastTexture_px = 2.5;   // read by edges: fine texture of 4 px and more reads at least that
constexpr double kTextureGap = 1.0;        // standard deviations by which the spectrum reads more than the edges there
constexpr int kBestRegionPx = 192;        // side of the sharpest region: the least that an aim has
constexpr double kBackgroundClear = 0.25; // of the aim's size left out around it when the background is measured
constexpr int kWideFrame_px = 4000;       // from here on tiles are 128 px a side, else 64: about 25 to 60 columns
constexpr int kCoarsest = Pyramid::kLevels - 1;

PixelRect pixel_rect(const FractionBox& box, cv::Size size) {
  const int x0 = std::clamp(static_cast<int>(std::lround(box.x * size.width)), 0, size.width);
  const int y0 = std::clamp(static_cast<int>(std::lround(box.y * size.height)), 0, size.height);
  const int x1 = std::clamp(static_cast<int>(std::lround((box.x + box.width) * size.width)), x0, size.width);
  const int y1 = std::clamp(static_cast<int>(std::lround((box.y + box.height) * size.height)), y0, size.height);
  return {x0, y0, x1 - x0, y1 - y0};
}

FractionBox fraction_box(PixelRect rect, cv::Size size) {
  return {static_cast<double>(rect.x) / size.width, static_cast<double>(rect.y) / size.height,
          static_cast<double>(rect.width) / size.width, static_cast<double>(rect.height) / size.height};
}

bool inside(const EdgeSample& edge, PixelRect r) {
  return edge.x >= static_cast<float>(r.x) && edge.x < static_cast<float>(r.x + r.width) &&
         edge.y >= static_cast<float>(r.y) && edge.y < static_cast<float>(r.y + r.height);
}

PixelRect grown(PixelRect r, double share) {
  const int dx = static_cast<int>(r.width * share), dy = static_cast<int>(r.height * share);
  return {r.x - dx, r.y - dy, r.width + 2 * dx, r.height + 2 * dy};
}

PixelRect square_about(double x, double y, int side, cv::Size size) {
  const int w = std::min(side, size.width), h = std::min(side, size.height);
  return {std::clamp(static_cast<int>(x) - w / 2, 0, size.width - w),
          std::clamp(static_cast<int>(y) - h / 2, 0, size.height - h), w, h};
}

int aim_edges_per_block(PixelRect region) {
  const double blocks = static_cast<double>(region.width) * region.height / (kBlock_px * kBlock_px);
  return std::clamp(static_cast<int>(kAimEdges / std::max(blocks, 1.0)), 1, kAimEdgesPerBlock);
}

// The aim and everything between it and the near side of the picture, or twice its own extent on every side where that
// side is not known.
PixelRect strip_below(PixelRect aim, cv::Size size, const MeasureRequest& request) {
  int x0 = aim.x, y0 = aim.y, x1 = aim.x + aim.width, y1 = aim.y + aim.height;
  if (!request.near_side_known) return {x0, y0, aim.width, std::min(size.height - y0, 3 * aim.height)};
  switch (request.near_side) {
    case NearSide::bottom: y1 = size.height; break;
    case NearSide::top: y0 = 0; break;
    case NearSide::left: x0 = 0; break;
    case NearSide::right: x1 = size.width; break;
  }
  return {x0, y0, x1 - x0, y1 - y0};
}

int tile_side_px(cv::Size size) {
  return std::max(size.width, size.height) >= kWideFrame_px ? 128 : 64;
}

// Where the aim moved, most of the edges that a fit accepts lie along the movement and show none of it. The blur of the
// aim is then the mean over all directions, as the forward model predicts it.
void take_all_directions(Measurement& out) {
  if (!out.aim_blur.estimate || !out.motion || !motion_is_significant(*out.motion)) return;
  const double mean_px2 = out.motion->isotropic_squared_disc_px2 + out.motion->anisotropy_px2 / 2;
  if (mean_px2 <= out.aim_blur.estimate->squared_disc_px2) return;
  const double disc_px = blur_disc_px(mean_px2);
  const double sigma_px2 = out.motion->anisotropy_sigma_px2 / 2;   // of the mean, that of the isotropic part included
  out.aim_blur.estimate = blur_estimate(mean_px2, sigma_px2 / (2 * std::max(disc_px, 1.0)));
}

}  // namespace

struct FrameMeasurer::Buffers {
  Pyramid pyramid;
  EdgeSearchBuffers search;
  SpectralEstimator spectral;
  cv::Mat linear;
  FrameEdges frame;
  std::vector<EdgeSample> aim_edges, some;
  std::vector<BlurSample> texture_samples;
  double noise = 0;

  void measure_aim(PixelRect aim, Measurement& out);
  TileMap tile_map();
  std::optional<SharpestRegion> sharpest(const TileMap& tiles, cv::Size size);
  void measure_background(PixelRect aim, Measurement& out);
  std::optional<PlaneReading> measure_plane(const MeasureRequest& request, cv::Size size);
  void sample_textures(cv::Size size);
  BlurReading reading(PixelRect region, const std::vector<EdgeSample>& edges);
};

FrameMeasurer::FrameMeasurer() : buffers_(std::make_unique<Buffers>()) {}
FrameMeasurer::~FrameMeasurer() = default;
FrameMeasurer::FrameMeasurer(FrameMeasurer&&) noexcept = default;
FrameMeasurer& FrameMeasurer::operator=(FrameMeasurer&&) noexcept = default;

BlurReading FrameMeasurer::Buffers::reading(PixelRect region, const std::vector<EdgeSample>& edges) {
  BlurReading out;
  const auto from_edges = edge_blur(edges, {.least_edges = kLeastAimEdges});
  const auto from_spectrum = region_spectrum(pyramid, region, spectral, linear);
  out.edges = from_edges ? from_edges->edges : 0;
  const auto fused = fused_blur(from_edges, from_spectrum);
  const int side = std::min(region.width, region.height);
  if (fused && fused->bound == Bound::none && blur_disc_px(fused->squared_disc_px2) <= kWidestInRegion * side) {
    out.estimate = fused;
  }
  return out;
}

// The aim: its edges on all levels, split if it holds two blurs, fused with its spectrum; and its motion.
void FrameMeasurer::Buffers::measure_aim(PixelRect aim, Measurement& out) {
  aim_edges.clear();
  find_edges(pyramid, aim, noise, {.edges_per_block = aim_edges_per_block(aim)}, search, aim_edges);
  const auto [sharper, softer] = edge_groups(aim_edges, aim);
  out.aim.mixed = !sharper.empty();
  if (out.aim.mixed) {
    // The spectrum is of both together and says nothing here.
    const auto blur = edge_blur(sharper, {.least_edges = kLeastAimEdges});
    out.aim_blur.estimate = fused_blur(blur, std::nullopt);
    out.aim_blur.edges = blur ? blur->edges : 0;
    out.motion = motion(sharper);
    if (out.aim_blur.estimate) {
      out.aim_softer_part = fused_blur(edge_blur(softer, {.least_edges = kLeastAimEdges}), std::nullopt);
      take_all_directions(out);
      return;
    }
  }
  out.aim_blur = reading(aim, aim_edges);
  if (!out.aim.mixed) out.motion = motion(aim_edges);
  take_all_directions(out);
}

TileMap FrameMeasurer::Buffers::tile_map() {
  TileMap map;
  map.tile_px = frame.tile_px;
  map.columns = frame.columns;
  map.rows = frame.rows;
  const auto count = static_cast<std::size_t>(map.columns) * map.rows;
  map.squared_disc_px2.assign(count, std::nullopt);
  map.sigma_px.assign(count, 0);
  map.edges.assign(count, 0);
  map.clipped.assign(count, 0);
  for (std::size_t i = 0; i < count; ++i) {
    const auto blur = edge_blur(frame.by_tile[i]);
    if (blur && !blur->lower_bound && blur_disc_px(blur->squared_disc_px2) <= kWidestInTile * map.tile_px) {
      map.squared_disc_px2[i] = static_cast<float>(blur->squared_disc_px2);
      map.sigma_px[i] = static_cast<float>(blur->sigma_px);
      map.edges[i] = blur->edges;
    }
  }
  return map;
}

// The tile with the smallest upper bound, measured again as a region of an aim's size.
std::optional<SharpestRegion> FrameMeasurer::Buffers::sharpest(const TileMap& tiles, cv::Size size) {
  std::optional<std::size_t> best;
  double best_bound = 0;
  for (std::size_t i = 0; i < tiles.edges.size(); ++i) {
    if (!tiles.squared_disc_px2[i] || tiles.edges[i] < kLeastBestEdges) continue;
    const double s = *tiles.squared_disc_px2[i];
    // Signed root, so that of two tiles sharper than the baseline the sharper wins.
    const double bound = (s >= 0 ? std::sqrt(s) : -std::sqrt(-s)) + 2 * tiles.sigma_px[i];
    if (!best || bound < best_bound) {
      best = i;
      best_bound = bound;
    }
  }
  if (!best) return std::nullopt;
  const int row = static_cast<int>(*best) / tiles.columns, column = static_cast<int>(*best) % tiles.columns;
  const PixelRect region =
      square_about((column + 0.5) * tiles.tile_px, (row + 0.5) * tiles.tile_px, kBestRegionPx, size);
  some.clear();
  find_edges(pyramid, region, noise, {.edges_per_block = kAimEdgesPerBlock}, search, some);
  SharpestRegion out{fraction_box(region, size), reading(region, some)};
  if (!out.reading.estimate) return std::nullopt;
  return out;
}

void FrameMeasurer::Buffers::measure_background(PixelRect aim, Measurement& out) {
  const PixelRect clear = grown(aim, kBackgroundClear);
  some.clear();
  std::copy_if(frame.edges.begin(), frame.edges.end(), std::back_inserter(some),
               [&](const EdgeSample& edge) { return !inside(edge, clear); });
  out.background_motion = motion(some);
}

std::optional<PlaneReading> FrameMeasurer::Buffers::measure_plane(const MeasureRequest& request, cv::Size size) {
  PlaneOptions options;
  options.width_px = size.width;
  options.height_px = size.height;
  if (request.near_side_known) options.near_side = request.near_side;
  options.aim = request.aim.box;
  options.contact_x = request.contact_x;
  options.contact_y = request.contact_y;

  // Where the subject meets the surface is seen in the strip below the aim: its edges are searched as densely as the
  // aim's own.
  const PixelRect strip = strip_below(pixel_rect(request.aim.box, size), size, request);
  some.clear();
  std::copy_if(frame.edges.begin(), frame.edges.end(), std::back_inserter(some),
               [&](const EdgeSample& edge) { return !inside(edge, strip); });
  find_edges(pyramid, strip, noise, {.edges_per_block = aim_edges_per_block(strip)}, search, some);
  sample_textures(size);
  return plane(some, options, texture_samples);
}

// Fine texture crowds its own edges, which then read too little; its spectrum does not mind. Where the two disagree in
// that sense the spectrum takes the place of the edges in `some`.
void FrameMeasurer::Buffers::sample_textures(cv::Size size) {
  constexpr int kSide = SpectralEstimator::kTile;
  texture_samples.clear();
  const int columns = size.width / kSide, rows = size.height / kSide;
  if (columns == 0 || rows == 0) return;
  const double stride = std::max(std::sqrt(static_cast<double>(columns) * rows / kTextureSquares), 1.0);
  std::vector<PixelRect> taken;
  std::vector<EdgeSample> here;
  for (double y = 0; y < rows; y += stride) {
    for (double x = 0; x < columns; x += stride) {
      const PixelRect square{static_cast<int>(x) * kSide, static_cast<int>(y) * kSide, kSide, kSide};
      here.clear();
      std::copy_if(some.begin(), some.end(), std::back_inserter(here),
                   [&](const EdgeSample& edge) { return inside(edge, square); });
      if (here.empty()) continue;   // nothing to see, or far too blurred
      const auto blur = edge_blur(here);
      if (blur && blur_disc_px(blur->squared_disc_px2) < kLeastTexture_px) continue;   // the spectrum tells from 4 px on
      const auto spectrum = region_spectrum(pyramid, square, spectral, linear);
      if (!spectrum) continue;
      if (blur && spectrum->disc_px < blur_disc_px(blur->squared_disc_px2) + kTextureGap * std::hypot(blur->sigma_px, spectrum->sigma_px)) {
        continue;
      }
      taken.push_back(square);
      texture_samples.push_back({static_cast<float>(square.x + kSide / 2), static_cast<float>(square.y + kSide / 2), kSide,
                                 static_cast<float>(spectrum->disc_px * spectrum->disc_px),
                                 static_cast<float>(spectrum->sigma_px)});
    }
  }
  std::erase_if(some, [&](const EdgeSample& edge) {
    return std::any_of(taken.begin(), taken.end(), [&](const PixelRect& square) { return inside(edge, square); });
  });
}

Measurement FrameMeasurer::measure(const LumaPicture& picture, const MeasureRequest& request) {
  Buffers& b = *buffers_;
  Measurement out;
  out.aim = request.aim;
  const cv::Size size = picture.codes.size();
  const PixelRect whole{0, 0, size.width, size.height};
  const PixelRect aim = pixel_rect(request.aim.box, size);
  out.noise_codes = b.noise = noise_codes(picture, whole);
  // A margin around a lone aim, so that the coarsest level still has pixels on every side of its edges.
  constexpr int kMargin = 16 << kCoarsest;
  build_pyramid(picture,
                request.whole_frame ? whole
                                    : PixelRect{aim.x - kMargin, aim.y - kMargin, aim.width + 2 * kMargin,
                                                aim.height + 2 * kMargin},
                kCoarsest, b.pyramid);
  b.measure_aim(aim, out);
  if (!request.whole_frame) return out;

  search_frame(b.pyramid, b.noise, tile_side_px(size), b.search, b.frame);
  TileMap tiles = b.tile_map();
  out.best = b.sharpest(tiles, size);
  // One tile alone can flatter: where its surroundings turn out softer than the aim, the aim is the sharpest part.
  const auto upper_bound = [](const BlurReading& reading) { return reading.estimate->squared_disc_high_px2; };
  if (out.aim_blur.estimate && (!out.best || upper_bound(out.aim_blur) < upper_bound(out.best->reading))) {
    out.best = SharpestRegion{out.aim.box, out.aim_blur};
  }
  b.measure_background(aim, out);
  out.plane = b.measure_plane(request, size);
  if (request.keep_tiles) out.tiles = std::move(tiles);
  return out;
}

}  // namespace focusfall
