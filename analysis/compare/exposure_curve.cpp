#include "analysis/compare/exposure_curve.h"

#include <Eigen/Dense>
#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

#include "analysis/compare/pull_back.h"

namespace focusfall {
namespace {

// Bins of the curve, stops below clipping: half a stop at the shoulder, whole stops in the middle. Levels below eight
// stops are not used (exposure_register.cpp).
constexpr std::array kEdges = {0.0, -0.25, -0.5, -1.0, -1.5, -2.0, -2.5, -3.0, -3.5, -4.0, -5.0, -6.0, -8.0};
constexpr std::size_t kBins = kEdges.size() - 1;

constexpr int kLeastTilesInCommon = 6;       // judgement: for a level with an error from their scatter
// Tiles and frames that the curve is found from: what is beyond adds nothing but time.
constexpr std::size_t kCurveTiles = 80, kCurveFrames = 60;
constexpr double kSmoothness = 0.05;         // weight of even slopes against a bin's share of the data: judgement
constexpr double kHuber = 2;                 // standard deviations, then less weight
// A bent curve is taken where it lowers the scatter of the tiles by this much and departs from the straight one by this
// many stops somewhere. Judgement.
constexpr double kBentScatter = 0.8, kBentEv = 0.05;

using Tiles = TileLevels;

// Shares of the pixels whose levels the curve is found from, an octave apart about.
constexpr std::array kShares = {0.004, 0.008, 0.015, 0.03, 0.05, 0.08, 0.12, 0.17, 0.23, 0.3, 0.38, 0.46, 0.54};
// Of such a level: the table's interpolation, and what vignetting and moving things leave (judgement), stops.
constexpr double kQuantileSigmaEv = 0.03;

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

double huber_weight(double residual, double sigma) {
  const double z = std::abs(residual) / sigma;
  return z <= kHuber ? 1 : kHuber / z;
}

// Levels of tiles and frames with robust weights; the curve is given.
struct TwoWay {
  std::vector<double> tile, frame;
  double residual_ev = 0;
};

// Values of the tiles as exposures, with the weights of one round of least squares; 0 where a tile is not seen.
struct TwoWayRound {
  Eigen::MatrixXd values, weights;   // frames x tiles
};

// Least squares for given weights: the tiles are eliminated, the frames solved for, their weighted mean held at 0.
void solve_round(const TwoWayRound& round, TwoWay& fit) {
  const Eigen::Index n = round.values.rows(), p = round.values.cols();
  Eigen::MatrixXd normal = Eigen::MatrixXd::Zero(n, n);
  Eigen::VectorXd right = Eigen::VectorXd::Zero(n);
  for (Eigen::Index t = 0; t < p; ++t) {
    const Eigen::VectorXd w = round.weights.col(t);
    const double sum = w.sum();
    if (sum <= 0) continue;
    const Eigen::VectorXd weighted = w.cwiseProduct(round.values.col(t));
    normal.diagonal() += w;
    normal.noalias() -= w * (w.transpose() / sum);
    right += weighted - w * (weighted.sum() / sum);
  }
  // One constant is free, and every group of frames without a tile in common has one of its own.
  normal.diagonal().array() += 1e-9 * std::max(1.0, normal.diagonal().maxCoeff());
  const Eigen::VectorXd frames = normal.ldlt().solve(right);
  for (Eigen::Index i = 0; i < n; ++i) fit.frame[static_cast<std::size_t>(i)] = frames[i];
  for (Eigen::Index t = 0; t < p; ++t) {
    const double sum = round.weights.col(t).sum();
    if (sum <= 0) continue;
    fit.tile[static_cast<std::size_t>(t)] = round.weights.col(t).dot(round.values.col(t) - frames) / sum;
  }
}

TwoWay fit_two_way(const Tiles& tiles, const ToneShape& shape) {
  const auto n = static_cast<Eigen::Index>(tiles.size()), p = static_cast<Eigen::Index>(tiles.front().size());
  TwoWay fit{std::vector<double>(tiles.front().size(), 0), std::vector<double>(tiles.size(), 0), 0};
  TwoWayRound round{Eigen::MatrixXd::Zero(n, p), Eigen::MatrixXd::Zero(n, p)};
  Eigen::MatrixXd sigmas = Eigen::MatrixXd::Ones(n, p);
  const auto at = [&](Eigen::Index i, Eigen::Index t) -> const auto& {
    return tiles[static_cast<std::size_t>(i)][static_cast<std::size_t>(t)];
  };
  for (Eigen::Index i = 0; i < n; ++i) {
    for (Eigen::Index t = 0; t < p; ++t) {
      if (!at(i, t)) continue;
      round.values(i, t) = shape.exposure_ev(at(i, t)->level_ev);
      sigmas(i, t) = at(i, t)->sigma_ev * shape.slope(at(i, t)->level_ev);
      round.weights(i, t) = 1 / (sigmas(i, t) * sigmas(i, t));
    }
  }
  constexpr int kRounds = 10;
  for (int count = 0; count < kRounds; ++count) {
    solve_round(round, fit);
    std::vector<double> residuals;
    Eigen::MatrixXd left = Eigen::MatrixXd::Zero(n, p);
    for (Eigen::Index i = 0; i < n; ++i) {
      for (Eigen::Index t = 0; t < p; ++t) {
        if (!at(i, t)) continue;
        left(i, t) = round.values(i, t) - fit.tile[static_cast<std::size_t>(t)] - fit.frame[static_cast<std::size_t>(i)];
        residuals.push_back(std::abs(left(i, t)));
      }
    }
    if (residuals.empty()) return fit;
    fit.residual_ev = 1.4826 * median(std::move(residuals));
    const double scale = std::clamp(fit.residual_ev, 0.003, 0.5);
    for (Eigen::Index i = 0; i < n; ++i) {
      for (Eigen::Index t = 0; t < p; ++t) {
        if (!at(i, t)) continue;
        round.weights(i, t) = huber_weight(left(i, t), std::hypot(sigmas(i, t), scale)) / (sigmas(i, t) * sigmas(i, t));
      }
    }
  }
  return fit;
}

// Evenly spread choice of at most `most` of the indices 0 ... count - 1, in the order of `key`.
std::vector<std::size_t> spread_choice(const std::vector<double>& key, const std::vector<bool>& allowed, std::size_t most) {
  std::vector<std::size_t> order;
  for (std::size_t i = 0; i < key.size(); ++i) {
    if (allowed[i]) order.push_back(i);
  }
  std::ranges::sort(order, [&](std::size_t a, std::size_t b) { return key[a] != key[b] ? key[a] < key[b] : a < b; });
  if (order.size() <= most) return order;
  std::vector<std::size_t> chosen;
  for (std::size_t k = 0; k < most; ++k) chosen.push_back(order[k * (order.size() - 1) / (most - 1)]);
  return chosen;
}

// Slopes of the bins from tiles and frames alone: least squares over slopes, tiles and frames together, mean slope 1.
std::optional<ToneShape> fitted_shape(const Tiles& tiles, const Tiles& quantiles, const TwoWay& start) {
  const std::size_t all_frames = tiles.size(), all_tiles = tiles.front().size();
  std::vector<bool> tile_seen(all_tiles), frame_seen(all_frames, true);
  for (std::size_t p = 0; p < all_tiles; ++p) {
    const auto seen = std::ranges::count_if(tiles, [p](const auto& frame) { return frame[p].has_value(); });
    tile_seen[p] = seen >= 2;
  }
  const auto some_tiles = spread_choice(start.tile, tile_seen, kCurveTiles);
  const auto some_frames = spread_choice(start.frame, frame_seen, kCurveFrames);
  if (some_tiles.size() < static_cast<std::size_t>(kLeastTilesInCommon) || some_frames.size() < 2) return std::nullopt;

  const std::size_t surfaces = some_tiles.size() + (quantiles.empty() ? 0 : quantiles.front().size());
  const auto level_at = [&](std::size_t f, std::size_t t) -> const std::optional<TileLevel>& {
    return t < some_tiles.size() ? tiles[some_frames[f]][some_tiles[t]] : quantiles[some_frames[f]][t - some_tiles.size()];
  };
  const auto size = static_cast<Eigen::Index>(kBins + surfaces + some_frames.size());
  Eigen::VectorXd solution = Eigen::VectorXd::Zero(size);
  solution.head(kBins).setOnes();
  std::array<double, kBins> used{};   // how much of the data lies in each bin
  constexpr int kRounds = 4;
  for (int round = 0; round < kRounds; ++round) {
    Eigen::MatrixXd normal = Eigen::MatrixXd::Zero(size, size);
    used.fill(0);
    for (std::size_t f = 0; f < some_frames.size(); ++f) {
      for (std::size_t t = 0; t < surfaces; ++t) {
        const auto& value = level_at(f, t);
        if (!value) continue;
        const std::vector<double> lengths = ToneShape::lengths(value->level_ev);
        const auto tile_at = static_cast<Eigen::Index>(kBins + t);
        const auto frame_at = static_cast<Eigen::Index>(kBins + surfaces + f);
        double residual = -solution[tile_at] - solution[frame_at];
        for (std::size_t k = 0; k < kBins; ++k) residual -= solution[static_cast<Eigen::Index>(k)] * lengths[k];
        const double sigma = std::hypot(value->sigma_ev, 0.01);
        double weight = 1 / (sigma * sigma);
        if (round > 0) weight *= huber_weight(residual, 2 * sigma);
        // Row of the design: -lengths for the slopes, -1 for the tile, -1 for the frame; the target is 0.
        std::size_t reach = 0;
        for (std::size_t k = 0; k < kBins && lengths[k] > 0; ++k) reach = k + 1;
        for (std::size_t a = 0; a < reach; ++a) {
          for (std::size_t b = 0; b < reach; ++b) {
            normal(static_cast<Eigen::Index>(a), static_cast<Eigen::Index>(b)) += weight * lengths[a] * lengths[b];
          }
          normal(static_cast<Eigen::Index>(a), tile_at) += weight * lengths[a];
          normal(static_cast<Eigen::Index>(a), frame_at) += weight * lengths[a];
        }
        normal(tile_at, tile_at) += weight;
        normal(frame_at, frame_at) += weight;
        normal(tile_at, frame_at) += weight;
        used[reach - 1] += 1;
      }
    }
    for (Eigen::Index a = 0; a < size; ++a) {
      for (Eigen::Index b = 0; b < a; ++b) normal(a, b) = normal(b, a);
    }
    // Slopes that change evenly; mean slope 1 over the data; one constant shared by tiles and frames taken out.
    const double strong = 1e6 * std::max(1.0, normal.diagonal().mean());
    const double rows = std::accumulate(used.begin(), used.end(), 0.0);
    const double smooth = rows / static_cast<double>(kBins) * kSmoothness;
    for (Eigen::Index k = 0; k + 2 < static_cast<Eigen::Index>(kBins); ++k) {
      Eigen::Vector3d bend(1, -2, 1);
      normal.block<3, 3>(k, k) += smooth * bend * bend.transpose();
    }
    Eigen::VectorXd right = Eigen::VectorXd::Zero(size), gauge = Eigen::VectorXd::Zero(size);
    for (std::size_t k = 0; k < kBins; ++k) gauge[static_cast<Eigen::Index>(k)] = used[k] / rows;
    normal += strong * gauge * gauge.transpose();
    right += strong * gauge;
    for (std::size_t f = 0; f < some_frames.size(); ++f) {
      const auto at = static_cast<Eigen::Index>(kBins + surfaces + f);
      normal(at, at) += 1e-3;
    }
    normal.diagonal().array() += 1e-9 * strong * 1e-6;
    solution = normal.ldlt().solve(right);
    if (!solution.allFinite()) return std::nullopt;
  }
  std::vector<double> slopes;
  for (std::size_t k = 0; k < kBins; ++k) slopes.push_back(solution[static_cast<Eigen::Index>(k)]);
  // A curve that would fall, or be all but flat, is no tone curve.
  if (std::ranges::any_of(slopes, [](double s) { return s < 0.05; })) return std::nullopt;
  return ToneShape(slopes);
}

// Largest departure of the shape from a straight line over the levels in use, its constant taken off.
double bend_ev(const Tiles& tiles, const ToneShape& shape) {
  double least = 1e9, most = -1e9;
  for (const auto& frame : tiles) {
    for (const auto& value : frame) {
      if (!value) continue;
      const double difference = shape.exposure_ev(value->level_ev) - value->level_ev;
      least = std::min(least, difference), most = std::max(most, difference);
    }
  }
  return 0.5 * (most - least);
}

}  // namespace

ToneShape::ToneShape() : slopes_(kBins, 1) {}
ToneShape::ToneShape(std::vector<double> slopes) : slopes_(std::move(slopes)), identity_(false) {}

std::size_t ToneShape::bin_count() { return kBins; }

std::vector<double> ToneShape::lengths(double level_ev) {
  std::vector<double> lengths(kBins, 0);
  for (std::size_t k = 0; k < kBins && level_ev < kEdges[k]; ++k) {
    const double bottom = k + 1 == kBins ? level_ev : std::max(level_ev, kEdges[k + 1]);
    lengths[k] = kEdges[k] - bottom;
  }
  return lengths;
}

double ToneShape::exposure_ev(double level_ev) const {
  if (identity_) return level_ev;
  const auto by_bin = lengths(level_ev);
  return -std::inner_product(by_bin.begin(), by_bin.end(), slopes_.begin(), 0.0);
}

double ToneShape::slope(double level_ev) const {
  std::size_t bin = 0;
  while (bin + 1 < kBins && level_ev < kEdges[bin + 1]) ++bin;
  return slopes_[bin];
}

std::vector<std::optional<TileLevel>> quantile_levels(const Highlights& highlights) {
  std::vector<std::optional<TileLevel>> levels;
  for (const double share : kShares) {
    const auto level_ev = highlight_level_ev(highlights.frame_share_above, share);
    constexpr double kClearOfClippingEv = -0.04;   // a share that ends within the last codes may be cut by them
    const bool usable = level_ev && *level_ev < kClearOfClippingEv;
    levels.push_back(usable ? std::optional(TileLevel{*level_ev, kQuantileSigmaEv}) : std::nullopt);
  }
  return levels;
}

RelativeLevels relative_levels(const Tiles& tiles, const Tiles& quantiles) {
  RelativeLevels result;
  result.frames.resize(tiles.size());
  if (tiles.size() < 2) return result;
  TwoWay fit = fit_two_way(tiles, result.shape);
  if (const auto bent = fitted_shape(tiles, quantiles, fit)) {
    const TwoWay with_bend = fit_two_way(tiles, *bent);
    if (with_bend.residual_ev < kBentScatter * fit.residual_ev && bend_ev(tiles, *bent) > kBentEv) {
      fit = with_bend;
      result.shape = *bent;
    }
  }
  result.residual_ev = fit.residual_ev;

  double sum = 0;
  int count = 0;
  for (std::size_t i = 0; i < tiles.size(); ++i) {
    std::vector<double> residuals;
    for (std::size_t p = 0; p < tiles[i].size(); ++p) {
      if (!tiles[i][p]) continue;
      residuals.push_back(std::abs(result.shape.exposure_ev(tiles[i][p]->level_ev) - fit.tile[p] - fit.frame[i]));
    }
    if (static_cast<int>(residuals.size()) < kLeastTilesInCommon) continue;
    const int used = static_cast<int>(residuals.size());
    const double scatter = 1.4826 * median(std::move(residuals));
    // Tiles of one frame share errors (the curve, the displacement): no more than a dozen count as independent.
    result.frames[i] = {fit.frame[i], std::max(0.002, scatter / std::sqrt(std::min(used, 12))), used};
    sum += fit.frame[i];
    ++count;
  }
  for (auto& frame : result.frames) {
    if (frame) frame->level_ev -= sum / count;
  }
  return result;
}

}  // namespace focusfall
