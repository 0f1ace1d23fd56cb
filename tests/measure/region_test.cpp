// Blur of a region on rendered tiles of known truth: a small guard against regression. The full tables with held-out
// seeds are those of `bash tests/run.sh --accuracy`.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "analysis/measure/forward_model.h"
#include "analysis/measure/measure_frame.h"
#include "analysis/measure/region_estimate.h"
#include "tests/render/tile.h"

namespace focusfall {
namespace {

constexpr int kMargin = 32;   // px drawn around the region, as a picture has them

std::optional<BlurEstimate> measured(render::TileSpec spec) {
  const int size = spec.size_px;
  spec.size_px += 2 * kMargin;
  const render::Picture tile = render::render_tile(spec);
  const LumaPicture picture{tile.luma, srgb_linear_of_code(256), tile.coding_step_codes};
  MeasureRequest request;
  request.whole_frame = false;
  const double margin = static_cast<double>(kMargin) / spec.size_px;
  request.aim.box = {margin, margin, static_cast<double>(size) / spec.size_px,
                     static_cast<double>(size) / spec.size_px};
  FrameMeasurer measurer;
  return measurer.measure(picture, request).aim_blur.estimate;
}

render::TileSpec tile(render::Texture texture, double disc_px, std::uint64_t key) {
  render::TileSpec spec;
  spec.texture = texture;
  spec.blur.disc_px = disc_px;
  spec.size_px = disc_px > 21 ? 192 : 128;
  spec.camera.iso_speed = 800;
  spec.camera.jpeg_quality = 90;
  spec.random_key = key;
  return spec;
}

struct Case {
  render::Texture texture;
  double disc_px;
};

class RegionBlur : public testing::TestWithParam<Case> {};

TEST_P(RegionBlur, ReadsTheDiscWithinTheTarget) {
  const auto [texture, c] = GetParam();
  constexpr int kTiles = 8;
  std::vector<double> readings;
  int covered = 0;
  for (int i = 0; i < kTiles; ++i) {
    const auto estimate = measured(tile(texture, c, 4000 + static_cast<std::uint64_t>(i)));
    ASSERT_TRUE(estimate) << "tile " << i;
    readings.push_back(blur_disc_px(estimate->squared_disc_px2));
    covered += blur_disc_px(estimate->squared_disc_low_px2) <= c && c <= blur_disc_px(estimate->squared_disc_high_px2);
  }
  std::sort(readings.begin(), readings.end());
  const double median = 0.5 * (readings[kTiles / 2 - 1] + readings[kTiles / 2]);
  const double mean = std::accumulate(readings.begin(), readings.end(), 0.0) / kTiles;
  double variance = 0;
  for (const double r : readings) variance += (r - mean) * (r - mean) / (kTiles - 1);
  // The targets of the method: bias 5 %, scatter 8 %. A bias of 5 % read off eight tiles of 8 % carries 3 % of its own.
  EXPECT_NEAR(median, c, 0.06 * c);
  EXPECT_LT(std::sqrt(variance), 0.08 * c);
  EXPECT_GE(covered, kTiles - 1);
}

INSTANTIATE_TEST_SUITE_P(Textures, RegionBlur,
                         testing::Values(Case{render::Texture::polygons, 3}, Case{render::Texture::polygons, 12},
                                         Case{render::Texture::dead_leaves, 5}, Case{render::Texture::dead_leaves, 20},
                                         Case{render::Texture::mixed, 8}, Case{render::Texture::mixed, 30}));

TEST(RegionBlurEvidence, FlatAndSmoothTilesGiveNoNumber) {
  int numbers = 0;
  for (std::uint64_t key = 0; key < 20; ++key) {
    numbers += measured(tile(render::Texture::smooth, 2, key)).has_value();
    numbers += measured(tile(render::Texture::flat, 2, key)).has_value();
  }
  EXPECT_EQ(numbers, 0);   // the target is 1.5 %: not one in forty
}

TEST(RegionBlurEvidence, ClippedEdgesAreLeftOut) {
  // A step from black to beyond clipping: every edge has lost a side.
  render::TileSpec spec = tile(render::Texture::step_edges, 3, 1);
  spec.edge_low = 0;
  spec.edge_high = 2.5;
  EXPECT_FALSE(measured(spec));
}

TEST(RegionBlur, MeasuredDiffractionMatchesTheForwardModel) {
  for (const auto& [disc, airy] : {std::pair{0.0, 3.0}, {8.0, 3.0}, {0.0, 1.6}}) {
    SystemResponse system;
    system.disc_px = disc;
    system.airy_lambda_n_over_p_px = airy;
    const auto predicted = forward_reading(system);
    ASSERT_TRUE(predicted);
    const double expected = blur_disc_px(predicted->squared_disc_px2);
    std::vector<double> readings;
    for (std::uint64_t key = 0; key < 9; ++key) {
      render::TileSpec spec = tile(render::Texture::polygons, disc, 700 + key);
      spec.blur.lambda_n_over_p_px = airy;
      spec.camera.iso_speed = 100;
      const auto estimate = measured(spec);
      ASSERT_TRUE(estimate);
      readings.push_back(blur_disc_px(estimate->squared_disc_px2));
    }
    std::nth_element(readings.begin(), readings.begin() + 4, readings.end());
    // The target is 3 % on edges; the spectrum, fused in above 5 px, knows discs alone and adds up to 2 % for Airy.
    EXPECT_NEAR(readings[4], expected, (expected > 5 ? 0.05 : 0.03) * expected + 0.03) << disc << ' ' << airy;
  }
}

TEST(RegionBlur, SharpeningIsAnOffsetInSquares) {
  // In-camera sharpening takes a constant off S: the same for a sharp and a blurred tile (measured: within 1.4 px^2).
  std::vector<double> offsets;
  for (const double c : {3.0, 5.0}) {
    render::TileSpec plain = tile(render::Texture::polygons, c, 31), sharpened = plain;
    sharpened.camera.sharpening = 0.6;
    const auto a = measured(plain), b = measured(sharpened);
    ASSERT_TRUE(a && b);
    offsets.push_back(b->squared_disc_px2 - a->squared_disc_px2);
    EXPECT_LT(offsets.back(), 0);
  }
  EXPECT_NEAR(offsets[0], offsets[1], 2 * 1.4);
}

TEST(FusedBlur, SaysNothingWithoutEdgesOrSpectrum) { EXPECT_FALSE(fused_blur(std::nullopt, std::nullopt)); }

TEST(FusedBlur, LiesBetweenTheTwoWhereTheyAgree) {
  const EdgeBlur edges{.squared_disc_px2 = 100, .sigma_px = 0.7, .level = 1, .edges = 40};
  const auto fused = fused_blur(edges, SpectralBlur{10.8, 0.5, 9.8, 11.8, 9});
  ASSERT_TRUE(fused);
  EXPECT_GT(blur_disc_px(fused->squared_disc_px2), 10);
  EXPECT_LT(blur_disc_px(fused->squared_disc_px2), 10.8);
}

TEST(FusedBlur, KeepsToTheEdgesWhereBlurIsSmall) {
  const EdgeBlur edges{.squared_disc_px2 = 9, .sigma_px = 0.25, .level = 0, .edges = 40};
  const auto fused = fused_blur(edges, SpectralBlur{4.3, 0.3, 3.8, 4.9, 9});
  ASSERT_TRUE(fused);
  EXPECT_DOUBLE_EQ(fused->squared_disc_px2, 9);
}

TEST(BlurEstimate, BoundsHoldTheValueAndStayOpenBelowTheBaseline) {
  for (const double s : {-6.0, -0.2, 0.0, 1.0, 90.0}) {
    const BlurEstimate estimate = blur_estimate(s, 0.4);
    EXPECT_LT(estimate.squared_disc_low_px2, s - 1.5);
    EXPECT_GT(estimate.squared_disc_high_px2, s + 1.5);
  }
}

}  // namespace
}  // namespace focusfall
