#include "analysis/measure/frame_search.h"

#include <algorithm>
#include <cstdint>

namespace focusfall {
namespace {

constexpr int kFirstLevel = 2;
constexpr int kEdgesPerTile = 10;          // on one level: nearly twice what the blur of a tile needs,
constexpr int kEdgesPerLargeTile = 8;      //   and of the many tiles of a large frame, whose edges lie farther apart
constexpr int kLargeTile_px = 128;
constexpr int kBlock = 32;                 // px of a level: the ration of EdgeSearchOptions counts in these
constexpr std::size_t kEnoughEdges = 7;    // on a level that suits the blur: no other is searched
constexpr float kSharpSigma = 1.25f;       // level px, median of a tile: sharper, the next finer level tells more
constexpr float kTooWideSigma = 2.3f;      // level px, median of a tile: wider, a coarser level is asked

class FrameSearch {
 public:
  FrameSearch(const Pyramid& pyramid, double noise_codes, EdgeSearchBuffers& buffers, FrameEdges& out)
      : pyramid_(pyramid), noise_codes_(noise_codes), buffers_(buffers), out_(out) {}

  void run() {
    search(kFirstLevel, nullptr);
    TileMask coarser = no_tiles(), finer = no_tiles();
    for (std::size_t i = 0; i < tiles(); ++i) {
      const auto& tile = out_.by_tile[i];
      const bool wide = !tile.empty() && median_width(tile) >= kTooWideSigma;
      const bool enough = tile.size() >= kEnoughEdges;
      coarser.wanted[i] = wide || !enough;
      finer.wanted[i] = !wide && !enough;
    }
    refit(kFirstLevel);
    crowded_.clear();
    search(1, &finer, &crowded_);
    refit(1);
    search_crowded();
    for (int level = kFirstLevel + 1; level < Pyramid::kLevels; ++level) {
      search(level, &coarser);
      for (std::size_t i = 0; i < tiles(); ++i) coarser.wanted[i] = coarser.wanted[i] && !has_answer(i, level);
    }
  }

 private:
  std::size_t tiles() const { return static_cast<std::size_t>(out_.columns) * out_.rows; }

  TileMask no_tiles() const {
    TileMask mask{.tile_px = out_.tile_px, .columns = out_.columns, .rows = out_.rows, .wanted = {}};
    mask.wanted.assign(tiles(), 0);
    return mask;
  }

  std::size_t tile_at(float x, float y) const {
    const int column = std::clamp(static_cast<int>(x) / out_.tile_px, 0, out_.columns - 1);
    const int row = std::clamp(static_cast<int>(y) / out_.tile_px, 0, out_.rows - 1);
    return static_cast<std::size_t>(row * out_.columns + column);
  }

  // Whether the tile holds enough edges of `level`, and that level is not too fine for them.
  bool has_answer(std::size_t tile, int level) {
    some_.clear();
    std::copy_if(out_.by_tile[tile].begin(), out_.by_tile[tile].end(), std::back_inserter(some_),
                 [level](const EdgeSample& edge) { return edge.level == level; });
    return some_.size() >= kEnoughEdges && median_width(some_) < kTooWideSigma;
  }

  // Searches one level in the wanted tiles and shares out what it finds.
  void search(int level, const TileMask* mask, std::vector<PixelRect>* crowded = nullptr) {
    const double block_px = kBlock << level;
    const double share = block_px * block_px / (static_cast<double>(out_.tile_px) * out_.tile_px);
    const int per_tile = out_.tile_px >= kLargeTile_px ? kEdgesPerLargeTile : kEdgesPerTile;
    const std::size_t first = out_.edges.size();
    find_edges(pyramid_, pyramid_.region, noise_codes_,
               {.finest_level = level,
                .coarsest_level = level,
                .edges_per_block = std::max(static_cast<int>(per_tile * share), 1),
                .tiles = mask,
                .crowded = crowded},
               buffers_, out_.edges);
    share_out(first);
  }

  void share_out(std::size_t first) {
    for (std::size_t i = first; i < out_.edges.size(); ++i) {
      out_.by_tile[tile_at(out_.edges[i].x, out_.edges[i].y)].push_back(out_.edges[i]);
    }
  }

  // Fits the edges of `level` again one level finer wherever their tile is sharp, and so on down to level 0.
  void refit(int level) {
    for (; level > 0; --level) {
      sharp_.clear();
      for (std::size_t i = 0; i < tiles(); ++i) {
        const std::size_t first = sharp_.size();
        std::copy_if(out_.by_tile[i].begin(), out_.by_tile[i].end(), std::back_inserter(sharp_),
                     [level](const EdgeSample& edge) { return edge.level == level; });
        const std::span<const EdgeSample> here = std::span(sharp_).subspan(first);
        if (here.empty() || median_width(here) >= kSharpSigma) sharp_.resize(first);
      }
      const std::size_t first = out_.edges.size();
      refit_edges(pyramid_, noise_codes_, level - 1, sharp_, out_.edges);
      share_out(first);
    }
  }

  // Level 0 of crowded blocks in tiles without an answer: what level 1 could fit between its neighbours is the better
  // measured, but some crowded tiles have nothing else.
  void search_crowded() {
    if (crowded_.empty()) return;
    TileMask blocks{.tile_px = 2 * kBlock,
                    .columns = (pyramid_.region.width + 2 * kBlock - 1) / (2 * kBlock),
                    .rows = (pyramid_.region.height + 2 * kBlock - 1) / (2 * kBlock),
                    .wanted = {}};
    blocks.wanted.assign(static_cast<std::size_t>(blocks.columns) * blocks.rows, 0);
    for (const PixelRect& block : crowded_) {
      const int x = block.x + block.width / 2, y = block.y + block.height / 2;
      if (out_.by_tile[tile_at(static_cast<float>(x), static_cast<float>(y))].size() >= kEnoughEdges) continue;
      const int column = std::min(x / blocks.tile_px, blocks.columns - 1);
      const int row = std::min(y / blocks.tile_px, blocks.rows - 1);
      blocks.wanted[static_cast<std::size_t>(row * blocks.columns + column)] = 1;
    }
    search(0, &blocks);
  }

  float median_width(std::span<const EdgeSample> edges) {
    widths_.clear();
    for (const EdgeSample& edge : edges) widths_.push_back(edge.width_level_px);
    const auto middle = widths_.begin() + static_cast<std::ptrdiff_t>(widths_.size() / 2);
    std::nth_element(widths_.begin(), middle, widths_.end());
    return *middle;
  }

  const Pyramid& pyramid_;
  const double noise_codes_;
  EdgeSearchBuffers& buffers_;
  FrameEdges& out_;
  std::vector<PixelRect> crowded_;
  std::vector<EdgeSample> sharp_, some_;
  std::vector<float> widths_;
};

}  // namespace

void search_frame(const Pyramid& pyramid, double noise_codes, int tile_px, EdgeSearchBuffers& buffers, FrameEdges& out) {
  out.tile_px = tile_px;
  out.columns = (pyramid.region.width + tile_px - 1) / tile_px;
  out.rows = (pyramid.region.height + tile_px - 1) / tile_px;
  out.edges.clear();
  const auto count = static_cast<std::size_t>(out.columns) * out.rows;
  if (out.by_tile.size() < count) out.by_tile.resize(count);
  for (auto& tile : out.by_tile) tile.clear();
  FrameSearch(pyramid, noise_codes, buffers, out).run();
}

}  // namespace focusfall
