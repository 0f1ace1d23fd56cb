#include "src/output/contours.h"

#include <gmock/gmock.h>

#include <cmath>
#include <functional>

namespace focusfall {
namespace {

constexpr int kTilePx = 64;

// A map whose disc at fractions (x, y) is what the function says; std::nullopt where nothing is measured.
TileMap map_of(int rows, int columns, const std::function<std::optional<double>(double, double)>& disc_px) {
  TileMap tiles{.rows = rows, .columns = columns, .tile_px = kTilePx, .squared_disc_px2 = {}, .sigma_px = {},
                .edges = {}, .clipped = {}};
  for (int row = 0; row < rows; ++row) {
    for (int column = 0; column < columns; ++column) {
      const auto disc = disc_px((column + 0.5) / columns, (row + 0.5) / rows);
      tiles.squared_disc_px2.push_back(disc ? std::optional(static_cast<float>(*disc * *disc)) : std::nullopt);
    }
  }
  return tiles;
}

std::vector<Contour> contours(const TileMap& tiles, const std::vector<double>& levels, double baseline_px2 = 0) {
  return blur_contours(tiles, {.frame = {tiles.columns * kTilePx, tiles.rows * kTilePx},
                               .baseline_px2 = baseline_px2,
                               .levels_px = levels});
}

TEST(Contours, RunWhereAnExponentialRampMeetsTheLevel) {
  // log(disc) is linear in x: 1 px at the left border, 16 px at the right, so that 4 px is met in the middle.
  const TileMap tiles = map_of(12, 16, [](double x, double) { return std::pow(16, x); });
  const auto lines = contours(tiles, {4});
  ASSERT_EQ(lines.size(), 1u);
  // A median over three columns leaves a linear ramp as it is; interpolation is linear in the logarithm.
  for (const FramePoint& point : lines[0].points) EXPECT_NEAR(point.x, 0.5, 1e-6);
  // From border to border.
  const auto [low, high] = std::minmax(lines[0].points.front().y, lines[0].points.back().y);
  EXPECT_EQ(low, 0);
  EXPECT_EQ(high, 1);
}

TEST(Contours, CloseAroundASharpSpot) {
  const TileMap tiles =
      map_of(15, 15, [](double x, double y) { return 1 + 20 * std::hypot(x - 0.5, y - 0.5); });
  const auto lines = contours(tiles, {4});
  ASSERT_EQ(lines.size(), 1u);
  EXPECT_EQ(lines[0].points.front().x, lines[0].points.back().x);
  EXPECT_EQ(lines[0].points.front().y, lines[0].points.back().y);
  // The disc is 4 px at .15 from the middle. Half a tile (1/30) is what a median and corner cutting may move it.
  for (const FramePoint& point : lines[0].points) EXPECT_NEAR(std::hypot(point.x - 0.5, point.y - 0.5), 0.15, 1.0 / 30);
}

TEST(Contours, KeepOutOfWhatWasNotMeasured) {
  // The lower half holds nothing.
  const TileMap tiles = map_of(16, 16, [](double x, double y) -> std::optional<double> {
    if (y > 0.5) return std::nullopt;
    return std::pow(16, x);
  });
  const auto lines = contours(tiles, {4});
  ASSERT_EQ(lines.size(), 1u);
  for (const FramePoint& point : lines[0].points) EXPECT_LE(point.y, 0.5);
}

TEST(Contours, IgnoreOneTileThatDisagreesWithAllItsNeighbours) {
  const TileMap tiles = map_of(9, 9, [](double x, double y) {
    return std::abs(x - 0.5) < 0.01 && std::abs(y - 0.5) < 0.01 ? 30.0 : 2.0;
  });
  EXPECT_TRUE(contours(tiles, {4, 8, 16}).empty());
}

TEST(Contours, TakeTheBaselineOffBeforeTheRoot) {
  // Everywhere S = 5^2; with 16 px^2 of baseline the disc is 3 px, below the level.
  const TileMap left_sharp = map_of(8, 8, [](double x, double) { return x < 0.5 ? 2.0 : 5.0; });
  EXPECT_EQ(contours(left_sharp, {4}).size(), 1u);
  EXPECT_TRUE(contours(left_sharp, {4}, 16).empty());
}

TEST(Contours, OfAnEmptyMapAreNone) { EXPECT_TRUE(contours(TileMap{}, {2}).empty()); }

}  // namespace
}  // namespace focusfall
