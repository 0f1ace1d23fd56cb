#include "src/output/contours.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <optional>
#include <utility>

namespace focusfall {
namespace {

// Logarithms need a floor: no disc below half a pixel is told from none (measurement limit of sharp edges).
constexpr double kLeastDiscPx = 0.5;
constexpr std::size_t kNeighboursToFill = 5;   // of eight (judgement: the hole is enclosed)
constexpr int kSmoothings = 2;                 // rounds of corner cutting: a tile's corner is rounded, not more

// Natural logarithm of the disc on nodes; the outer ring lies on the frame's border.
struct Field {
  int rows = 0, columns = 0;
  std::vector<std::optional<double>> values;
  std::vector<double> x, y;   // of columns and rows, fractions

  const std::optional<double>& at(int row, int column) const {
    return values[static_cast<std::size_t>(row * columns + column)];
  }
};

std::optional<double> log_disc(const TileMap& tiles, int row, int column, double baseline_px2) {
  const auto& squared = tiles.squared_disc_px2[static_cast<std::size_t>(row * tiles.columns + column)];
  if (!squared) return std::nullopt;
  return std::log(std::max(blur_disc_px(static_cast<double>(*squared) - baseline_px2), kLeastDiscPx));
}

std::optional<double> median_around(const TileMap& tiles, int row, int column, double baseline_px2) {
  std::vector<double> known;
  for (int r = std::max(row - 1, 0); r <= std::min(row + 1, tiles.rows - 1); ++r) {
    for (int c = std::max(column - 1, 0); c <= std::min(column + 1, tiles.columns - 1); ++c) {
      if (const auto value = log_disc(tiles, r, c, baseline_px2)) known.push_back(*value);
    }
  }
  const auto own = log_disc(tiles, row, column, baseline_px2);
  if (!own && known.size() < kNeighboursToFill) return std::nullopt;
  if (own && known.size() < 3) return own;
  std::ranges::sort(known);
  const std::size_t half = known.size() / 2;
  return known.size() % 2 == 1 ? known[half] : (known[half - 1] + known[half]) / 2;
}

// Tile centres, and a ring around them that repeats the outer tiles on the frame's border.
Field field_of(const TileMap& tiles, const ContourRequest& request) {
  Field field;
  field.rows = tiles.rows + 2;
  field.columns = tiles.columns + 2;
  const auto positions = [&tiles](int count, int length_px) {
    std::vector<double> at{0};
    for (int i = 0; i < count; ++i) {
      const double low = static_cast<double>(i) * tiles.tile_px;
      const double high = std::min(low + tiles.tile_px, static_cast<double>(length_px));
      at.push_back((low + high) / 2 / length_px);
    }
    at.push_back(1);
    return at;
  };
  field.x = positions(tiles.columns, request.frame.width_px);
  field.y = positions(tiles.rows, request.frame.height_px);
  for (int row = 0; row < field.rows; ++row) {
    for (int column = 0; column < field.columns; ++column) {
      field.values.push_back(median_around(tiles, std::clamp(row - 1, 0, tiles.rows - 1),
                                           std::clamp(column - 1, 0, tiles.columns - 1), request.baseline_px2));
    }
  }
  return field;
}

// An edge of the grid: from a node to the right (or down).
struct GridEdge {
  int row = 0, column = 0;
  bool down = false;
  auto operator<=>(const GridEdge&) const = default;
};

using Links = std::map<GridEdge, std::vector<GridEdge>>;

// Marching squares (W. Lorensen, H. Cline, "Marching Cubes", 1987, in two dimensions): which edges of each cell the
// line crosses, joined in pairs; a saddle is resolved by the mean of its corners.
Links crossings(const Field& field, double level) {
  Links links;
  const auto join = [&links](const GridEdge& a, const GridEdge& b) {
    links[a].push_back(b);
    links[b].push_back(a);
  };
  for (int row = 0; row + 1 < field.rows; ++row) {
    for (int column = 0; column + 1 < field.columns; ++column) {
      const std::optional<double> corner[] = {field.at(row, column), field.at(row, column + 1),
                                              field.at(row + 1, column + 1), field.at(row + 1, column)};
      if (!corner[0] || !corner[1] || !corner[2] || !corner[3]) continue;
      const GridEdge edge[] = {{row, column, false}, {row, column + 1, true}, {row + 1, column, false},
                               {row, column, true}};
      std::vector<int> crossed;
      for (int i = 0; i < 4; ++i) {
        if ((*corner[i] > level) != (*corner[(i + 1) % 4] > level)) crossed.push_back(i);
      }
      if (crossed.size() == 2) {
        join(edge[crossed[0]], edge[crossed[1]]);
      } else if (crossed.size() == 4) {
        const bool middle = (*corner[0] + *corner[1] + *corner[2] + *corner[3]) / 4 > level;
        const bool first = *corner[0] > level;
        // The first corner is cut off where it differs from the middle.
        join(edge[0], edge[first == middle ? 1 : 3]);
        join(edge[2], edge[first == middle ? 3 : 1]);
      }
    }
  }
  return links;
}

FramePoint crossing_point(const Field& field, const GridEdge& edge, double level) {
  const int row = edge.down ? edge.row + 1 : edge.row, column = edge.down ? edge.column : edge.column + 1;
  const double from = *field.at(edge.row, edge.column), to = *field.at(row, column);
  const double t = (level - from) / (to - from);
  const auto mixed = [t](double a, double b) { return a + t * (b - a); };
  const auto index = [](int i) { return static_cast<std::size_t>(i); };
  return {mixed(field.x[index(edge.column)], field.x[index(column)]),
          mixed(field.y[index(edge.row)], field.y[index(row)])};
}

// Follows the links from `start`, taking them away on the way.
std::vector<GridEdge> followed(Links& links, GridEdge start) {
  std::vector<GridEdge> line{start};
  while (true) {
    auto& next_of = links[line.back()];
    if (next_of.empty()) return line;
    const GridEdge next = next_of.back();
    next_of.pop_back();
    auto& back = links[next];
    back.erase(std::ranges::find(back, line.back()));
    line.push_back(next);
  }
}

// Corner cutting (G. Chaikin, "An algorithm for high-speed curve generation", 1974); ends of open lines stay.
std::vector<FramePoint> smoothed(const std::vector<FramePoint>& line) {
  if (line.size() < 3) return line;
  const bool closed = line.front().x == line.back().x && line.front().y == line.back().y;
  std::vector<FramePoint> result;
  if (!closed) result.push_back(line.front());
  for (std::size_t i = 0; i + 1 < line.size(); ++i) {
    const FramePoint &a = line[i], &b = line[i + 1];
    result.push_back({0.75 * a.x + 0.25 * b.x, 0.75 * a.y + 0.25 * b.y});
    result.push_back({0.25 * a.x + 0.75 * b.x, 0.25 * a.y + 0.75 * b.y});
  }
  result.push_back(closed ? result.front() : line.back());
  return result;
}

}  // namespace

std::vector<Contour> blur_contours(const TileMap& tiles, const ContourRequest& request) {
  std::vector<Contour> contours;
  if (tiles.rows < 1 || tiles.columns < 1) return contours;
  const Field field = field_of(tiles, request);
  for (const double level_px : request.levels_px) {
    const double level = std::log(level_px);
    Links links = crossings(field, level);
    // Open lines first, from their ends; what is left is closed.
    std::vector<GridEdge> starts;
    for (const auto& [edge, linked] : links) {
      if (linked.size() == 1) starts.push_back(edge);
    }
    for (const auto& [edge, linked] : links) starts.push_back(edge);
    for (const GridEdge& start : starts) {
      if (links[start].empty()) continue;
      Contour contour{.blur_disc_px = level_px, .points = {}};
      for (const GridEdge& edge : followed(links, start)) contour.points.push_back(crossing_point(field, edge, level));
      for (int i = 0; i < kSmoothings; ++i) contour.points = smoothed(contour.points);
      contours.push_back(std::move(contour));
    }
  }
  return contours;
}

}  // namespace focusfall
