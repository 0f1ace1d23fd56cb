#include "analysis/measure/frame_search.h"

#include <algorithm>
#include <cstdint>

#include "analysis/measure/region_blur.h"

namespace focusfall {
namespace {

constexpr int kEdgesPerTile = 12;          // on level 1: twice what the blur of a tile needs
constexpr int kCoarseEdgesPerBlock = 4;    // on levels 2 to 4, whose blocks are larger than a tile
constexpr int kCrowdedEdgesPerBlock = 2;   // on level 0, of which four blocks make one of level 1
constexpr int kBlock = 32;                 // px of a level
constexpr int kEnoughEdges = 8;            // on a level that is fine enough for the blur: coarser ones are not asked
constexpr int kLeastEdges = 6;             // from which on a median is taken
constexpr float kSharpSigma = 1.25f;       // level-1 px, median of a tile: sharper (c below 4 px), level 0 tells more
constexpr float kTooWideSigma = 2.3f;      // level-1 px, median of a tile: wider, a coarser level is asked

// Appends what lies in `edges` from `first` on to the lists of its tiles.
void share_out(std::size_t first, FrameEdges& out) {
  const float side = static_cast<float>(out.tile_px);
  for (std::size_t i = first; i < out.edges.size(); ++i) {
    const EdgeSample& edge = out.edges[i];
    const int column = std::clamp(static_cast<int>(edge.x / side), 0, out.columns - 1);
    const int row = std::clamp(static_cast<int>(edge.y / side), 0, out.rows - 1);
    out.by_tile[static_cast<std::size_t>(row * out.columns + column)].push_back(edge);
  }
}

float median_width(const std::vector<EdgeSample>& edges, std::vector<float>& widths) {
  widths.clear();
  for (const EdgeSample& edge : edges) widths.push_back(edge.width_level_px);
  const auto middle = widths.begin() + static_cast<std::ptrdiff_t>(widths.size() / 2);
  std::nth_element(widths.begin(), middle, widths.end());
  return *middle;
}

// Level-0 blocks of the crowded level-1 blocks that lie in tiles without an answer.
void search_crowded(const Pyramid& pyramid, double noise_codes, const std::vector<PixelRect>& crowded,
                    EdgeSearchBuffers& buffers, FrameEdges& out) {
  // A mask of level-1 blocks.
  TileMask mask{.tile_px = 2 * kBlock,
                .columns = (pyramid.region.width + 2 * kBlock - 1) / (2 * kBlock),
                .rows = (pyramid.region.height + 2 * kBlock - 1) / (2 * kBlock),
                .wanted = {}};
  mask.wanted.assign(static_cast<std::size_t>(mask.columns) * mask.rows, 0);
  for (const PixelRect& block : crowded) {
    const int column = std::min((block.x + kBlock) / mask.tile_px, mask.columns - 1);
    const int row = std::min((block.y + kBlock) / mask.tile_px, mask.rows - 1);
    mask.wanted[static_cast<std::size_t>(row * mask.columns + column)] = 1;
  }
  find_edges(pyramid, pyramid.region, noise_codes,
             {.coarsest_level = 0, .edges_per_block = kCrowdedEdgesPerBlock, .tiles = &mask}, buffers, out.edges);
}

}  // namespace

void search_frame(const Pyramid& pyramid, double noise_codes, int tile_px, EdgeSearchBuffers& buffers, FrameEdges& out) {
  const PixelRect whole = pyramid.region;
  out.tile_px = tile_px;
  out.columns = (whole.width + tile_px - 1) / tile_px;
  out.rows = (whole.height + tile_px - 1) / tile_px;
  const auto count = static_cast<std::size_t>(out.columns) * out.rows;
  out.edges.clear();
  if (out.by_tile.size() < count) out.by_tile.resize(count);
  for (auto& tile : out.by_tile) tile.clear();

  std::vector<PixelRect> crowded;
  const int blocks_per_tile = std::max(tile_px / (2 * kBlock), 1);
  find_edges(pyramid, whole, noise_codes,
             {.finest_level = 1,
              .coarsest_level = 1,
              .edges_per_block = kEdgesPerTile / (blocks_per_tile * blocks_per_tile),
              .crowded = &crowded},
             buffers, out.edges);
  share_out(0, out);

  // What each tile asks for next.
  TileMask coarser{.tile_px = tile_px, .columns = out.columns, .rows = out.rows, .wanted = {}};
  coarser.wanted.assign(count, 0);
  std::vector<EdgeSample> sharp;
  std::vector<float> widths;
  for (std::size_t i = 0; i < count; ++i) {
    const auto& tile = out.by_tile[i];
    const int edges = static_cast<int>(tile.size());
    const float median = edges >= kLeastEdges ? median_width(tile, widths) : kTooWideSigma;
    if (edges < kEnoughEdges || median >= kTooWideSigma) coarser.wanted[i] = 1;
    if (edges > 0 && median_width(tile, widths) < kSharpSigma) sharp.insert(sharp.end(), tile.begin(), tile.end());
  }
  const std::size_t before = out.edges.size();
  refit_edges(pyramid, noise_codes, sharp, out.edges);
  if (!crowded.empty()) search_crowded(pyramid, noise_codes, crowded, buffers, out);
  find_edges(pyramid, whole, noise_codes,
             {.finest_level = 2, .edges_per_block = kCoarseEdgesPerBlock, .tiles = &coarser}, buffers, out.edges);
  share_out(before, out);
}

}  // namespace focusfall
