// The parts of the exposure audit, each against something slower, simpler or known.
#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <cmath>
#include <random>

#include "analysis/compare/exposure_curve.h"
#include "analysis/compare/exposure_light.h"
#include "analysis/compare/exposure_register.h"
#include "analysis/compare/pull_back.h"
#include "analysis/measure/highlights.h"
#include "analysis/measure/level_grid.h"
#include "tests/render/random.h"

namespace focusfall {
namespace {

// ---- level grid and highlights ------------------------------------------------------------------------------------------

TEST(LevelGrid, MeansAreThoseOfTheSampledPixels) {
  render::Random random(1);
  LumaPicture picture;
  picture.codes = cv::Mat(200, 300, CV_8UC1);
  for (int y = 0; y < 200; ++y) {
    for (int x = 0; x < 300; ++x) picture.codes.at<std::uint8_t>(y, x) = static_cast<std::uint8_t>(random.below(256));
  }
  picture.linear_of_code = srgb_linear_of_code(256);
  const LevelGrid grid = level_grid(picture);
  ASSERT_EQ(grid.tile_px, 64);
  ASSERT_EQ(grid.rows, 3);
  ASSERT_EQ(grid.columns, 4);
  for (int row = 0; row < 3; ++row) {
    for (int column = 0; column < 4; ++column) {
      double sum = 0, squares = 0;
      for (int y = 64 * row; y < 64 * row + 64; y += 4) {
        for (int x = 64 * column; x < 64 * column + 64; x += 4) {
          const double linear = static_cast<double>(picture.linear_of_code[picture.codes.at<std::uint8_t>(y, x)]);
          sum += linear, squares += linear * linear;
        }
      }
      const auto i = static_cast<std::size_t>(4 * row + column);
      const double mean = sum / 256;
      EXPECT_NEAR(static_cast<double>(grid.mean_linear[i]), mean, 1e-6);
      EXPECT_NEAR(static_cast<double>(grid.contrast[i]), std::sqrt(squares / 256 - mean * mean) / mean, 1e-4);
    }
  }
}

TEST(LevelGrid, TilesAreMultiplesOf64PxAndAtMost48ToARow) {
  for (const int width : {64, 640, 3072, 3073, 6000, 12000}) {
    EXPECT_EQ(level_tile_px(width) % 64, 0);
    EXPECT_LE(width / level_tile_px(width), 48);
  }
}

TEST(LevelGrid, PictureSmallerThanATileHasNone) {
  LumaPicture picture{cv::Mat(40, 40, CV_16UC1, cv::Scalar(7)), srgb_linear_of_code(65536)};
  EXPECT_TRUE(level_grid(picture).mean_linear.empty());
}

// Small enough that every pixel is counted: an exact comparison, strip by strip, grey, colour, and 16 bits.
TEST(Highlights, SharesAreExactForASmallPicture) {
  render::Random random(2);
  cv::Mat rgb(90, 120, CV_16UC3);
  for (auto pixel = rgb.begin<cv::Vec3w>(); pixel != rgb.end<cv::Vec3w>(); ++pixel) {
    for (int c = 0; c < 3; ++c) (*pixel)[c] = static_cast<std::uint16_t>(std::min(65535, random.below(90000)));
  }
  HighlightAccumulator accumulator;
  accumulator.start(120, 90, {10, 20, 50, 40}, 65536);
  for (int y = 0; y < 90; y += 16) accumulator.take(RgbStrip{y, rgb.rowRange(y, std::min(90, y + 16))});
  const auto curve = srgb_linear_of_code(65536);
  const auto found = accumulator.highlights(curve);
  ASSERT_TRUE(found);
  for (int k = 0; k < kHighlightSteps; ++k) {
    int frame = 0, aim = 0;
    for (int y = 0; y < 90; ++y) {
      for (int x = 0; x < 120; ++x) {
        const auto& p = rgb.at<cv::Vec3w>(y, x);
        const double linear = static_cast<double>(curve[std::max({p[0], p[1], p[2]})]);
        if (linear < std::exp2(-k / 8.) - 1e-7) continue;
        ++frame;
        aim += x >= 10 && x < 60 && y >= 20 && y < 60;
      }
    }
    EXPECT_FLOAT_EQ(found->frame_share_above[static_cast<std::size_t>(k)], static_cast<float>(frame / 10800.));
    EXPECT_FLOAT_EQ(found->aim_share_above[static_cast<std::size_t>(k)], static_cast<float>(aim / 2000.));
  }
}

// ---- pull-back -----------------------------------------------------------------------------------------------------------

// A share that falls by a tenth for every stop: 10 ^ level at `level` stops, .004 of it clipped at gain g.
std::vector<float> exponential_tail(double clipped) {
  std::vector<float> shares;
  for (int k = 0; k < kHighlightSteps; ++k) {
    shares.push_back(static_cast<float>(std::min(1.0, clipped * std::pow(10, k / kHighlightStepsPerStop))));
  }
  return shares;
}

TEST(PullBack, RoomIsWhereTheShareFallsToTheLimit) {
  // .0001 clips; .001 is reached a stop lower.
  const HighlightRoom room = highlight_room(exponential_tail(0.0001), 0.001);
  EXPECT_EQ(room.pull_back->ev, 0);
  EXPECT_EQ(room.pull_back->bound, Bound::none);
  EXPECT_NEAR(*room.room_ev, 1, 0.01);
}

TEST(PullBack, BoundIsBelowTheTruthForATailThatGoesOn) {
  for (const double clipped : {0.002, 0.01, 0.05}) {
    const HighlightRoom room = highlight_room(exponential_tail(clipped), 0.001);
    const double truth_ev = std::log10(clipped / 0.001);
    EXPECT_EQ(room.pull_back->bound, Bound::lower);
    EXPECT_GT(room.pull_back->ev, 0);
    EXPECT_LE(room.pull_back->ev, truth_ev) << clipped;
    EXPECT_FALSE(room.room_ev);
  }
}

// A white wall just above clipping: nothing under it tells how far, so nothing is promised.
TEST(PullBack, NothingIsPromisedForAPatchThatStandsApart) {
  std::vector<float> shares(kHighlightSteps, 0.2f);
  const HighlightRoom room = highlight_room(shares, 0.001);
  EXPECT_EQ(room.pull_back->bound, Bound::lower);
  EXPECT_EQ(room.pull_back->ev, 0);
}

TEST(PullBack, MoreExposureNeverLowersThePullBackOrRaisesTheRoom) {
  double room_before = 1e9;
  for (double clipped = 1e-6; clipped < 1e-3; clipped *= 1.7) {
    const HighlightRoom room = highlight_room(exponential_tail(clipped), 0.001);
    EXPECT_LE(*room.room_ev, room_before);
    room_before = *room.room_ev;
  }
}

// ---- light ---------------------------------------------------------------------------------------------------------------

// Generalised least squares with the covariance written out, for the ratio that the filter chose.
TEST(Light, FilterEqualsGeneralisedLeastSquares) {
  std::mt19937 engine(5);
  std::normal_distribution<double> normal;
  constexpr Eigen::Index n = 40;
  LightSteps steps;
  Eigen::MatrixXd design(n, 3);
  Eigen::VectorXd levels(n);
  double walk = 0;
  for (Eigen::Index i = 0; i < n; ++i) {
    steps.variance.push_back(1 + 0.5 * static_cast<double>(i % 3));
    steps.gap.push_back(1 + static_cast<double>(i % 2));
    if (i > 0) walk += 0.15 * normal(engine);
    design.row(i) << 1, normal(engine), static_cast<double>(i % 4 == 1);
    levels[i] = 0.3 * design(i, 1) - 0.2 * design(i, 2) + walk + 0.02 * normal(engine);
  }
  const LightFit fit = fit_light(design, levels, steps);
  ASSERT_GT(fit.walk_ratio, 0);

  Eigen::VectorXd time(n);
  time[0] = 0;
  for (Eigen::Index i = 1; i < n; ++i) time[i] = time[i - 1] + steps.gap[static_cast<std::size_t>(i)];
  Eigen::MatrixXd covariance(n, n);
  for (Eigen::Index i = 0; i < n; ++i) {
    for (Eigen::Index j = 0; j < n; ++j) covariance(i, j) = fit.walk_ratio * std::min(time[i], time[j]);
    covariance(i, i) += steps.variance[static_cast<std::size_t>(i)];
  }
  const Eigen::MatrixXd inverse = covariance.inverse();
  const Eigen::MatrixXd normal_inverse = (design.transpose() * inverse * design).inverse();
  const Eigen::VectorXd expected = normal_inverse * design.transpose() * inverse * levels;
  for (Eigen::Index k = 0; k < 3; ++k) EXPECT_NEAR(fit.coefficients[k], expected[k], 1e-9);

  // The smoothed walk is its conditional mean given all observations.
  const Eigen::VectorXd left = levels - design * fit.coefficients;
  Eigen::MatrixXd walk_covariance = covariance;
  for (Eigen::Index i = 0; i < n; ++i) walk_covariance(i, i) -= steps.variance[static_cast<std::size_t>(i)];
  const Eigen::VectorXd conditional = walk_covariance * inverse * left;
  const SmoothedLight light = smoothed_light(left, fit, steps);
  for (Eigen::Index i = 0; i < n; ++i) EXPECT_NEAR(light.level_ev[static_cast<std::size_t>(i)], conditional[i], 1e-9);
}

// ---- registration and curve ----------------------------------------------------------------------------------------------

LevelGrid random_grid(std::uint64_t key, int dx, int dy, double gain) {
  render::Random random(key);
  constexpr int kRows = 14, kColumns = 20, kMargin = 3;
  std::vector<float> scene;
  for (int i = 0; i < (kRows + 2 * kMargin) * (kColumns + 2 * kMargin); ++i) {
    scene.push_back(static_cast<float>(std::exp2(random.uniform(-5, -2))));
  }
  LevelGrid grid;
  grid.rows = kRows, grid.columns = kColumns, grid.tile_px = 64;
  for (int y = 0; y < kRows; ++y) {
    for (int x = 0; x < kColumns; ++x) {
      const auto at = static_cast<std::size_t>((y + kMargin - dy) * (kColumns + 2 * kMargin) + x + kMargin - dx);
      grid.mean_linear.push_back(scene[at] * static_cast<float>(gain));
      grid.contrast.push_back(0.1f);
      grid.clipped.push_back(0);
    }
  }
  return grid;
}

TEST(Registration, DisplacementByTilesIsFoundWhateverTheExposure) {
  const LevelGrid reference = random_grid(3, 0, 0, 1);
  for (const auto& [dx, dy] : {std::pair{0, 0}, std::pair{1, -2}, std::pair{-2, 1}}) {
    const auto match = match_grids(reference, random_grid(3, dx, dy, 2.5));
    ASSERT_TRUE(match);
    EXPECT_NEAR(match->shift_x, dx, 1e-9);
    EXPECT_NEAR(match->shift_y, dy, 1e-9);
    EXPECT_NEAR(match->correlation, 1, 1e-6);
  }
}

TEST(Registration, AnotherSceneDoesNotMatch) {
  const auto match = match_grids(random_grid(3, 0, 0, 1), random_grid(4, 0, 0, 1));
  ASSERT_TRUE(match);
  EXPECT_LT(match->correlation, kSameSceneCorrelation);
}

TEST(Registration, ClippedAndBlackTilesAreLeftOut) {
  LevelGrid grid = random_grid(3, 0, 0, 1);
  grid.clipped[5] = 0.01f;
  grid.mean_linear[6] = 0.0001f;
  const auto levels = registered_levels(grid, {.correlation = 1, .tiles = 1});
  EXPECT_FALSE(levels[5]);
  EXPECT_FALSE(levels[6]);
  EXPECT_TRUE(levels[7]);
  LevelGrid black = grid;
  std::ranges::fill(black.mean_linear, 0.0f);
  EXPECT_FALSE(match_grids(grid, black));
}

TEST(RelativeLevels, ExposuresOfFramesAreFoundThroughAChainOfOverlaps) {
  // Each frame shows only tiles of a middle range; the first and the last have none in common.
  std::vector<std::vector<std::optional<TileLevel>>> tiles(5);
  for (std::size_t i = 0; i < tiles.size(); ++i) {
    for (int p = 0; p < 80; ++p) {
      const double level_ev = -12 + 0.15 * p + 2.0 * static_cast<double>(i) - 2;
      const bool seen = level_ev > -6 && level_ev < -0.5;
      tiles[i].push_back(seen ? std::optional(TileLevel{level_ev, 0.02}) : std::nullopt);
    }
  }
  const RelativeLevels found = relative_levels(tiles);
  EXPECT_TRUE(found.shape.is_identity());
  for (std::size_t i = 1; i < tiles.size(); ++i) {
    ASSERT_TRUE(found.frames[i] && found.frames[i - 1]);
    EXPECT_NEAR(found.frames[i]->level_ev - found.frames[i - 1]->level_ev, 2, 1e-6);
  }
}

TEST(ToneShape, LengthsAddUpToTheLevel) {
  for (const double level_ev : {-0.1, -0.6, -2.3, -7.9, -9.5}) {
    double sum = 0;
    for (const double length : ToneShape::lengths(level_ev)) sum += length;
    EXPECT_NEAR(sum, -level_ev, 1e-12);
    EXPECT_EQ(ToneShape().exposure_ev(level_ev), level_ev);
    EXPECT_NEAR(ToneShape(std::vector<double>(ToneShape::bin_count(), 1.5)).exposure_ev(level_ev), 1.5 * level_ev, 1e-12);
  }
}

}  // namespace
}  // namespace focusfall
