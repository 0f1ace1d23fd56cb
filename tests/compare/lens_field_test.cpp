#include "analysis/compare/lens_field.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <random>
#include <vector>

namespace focusfall {
namespace {

struct TrueField {
  double x_tilt_px = 0, y_tilt_px = 0, curvature_px = 0;
};

// A 9 x 6 grid of tiles with errors of 6 % of c and .2 px.
std::vector<FieldTile> wall(const TrueField& field, double centre_px, std::mt19937_64& random) {
  std::normal_distribution<double> normal;
  std::vector<FieldTile> tiles;
  for (int row = 0; row < 6; ++row) {
    for (int column = 0; column < 9; ++column) {
      const double x = (column - 4) / 4.0 * 0.74, y = (row - 2.5) / 2.5 * 0.46;
      const double l = centre_px + field.x_tilt_px * x + field.y_tilt_px * y + field.curvature_px * (x * x + y * y);
      const double c = std::abs(l), sigma = std::hypot(2 * c * std::hypot(0.06 * c, 0.2), 0.4);
      tiles.push_back({x, y, l * l + 0.5 + sigma * normal(random), sigma});
    }
  }
  return tiles;
}

std::vector<std::vector<FieldTile>> travel(const TrueField& field, double step_px, std::mt19937_64& random) {
  std::vector<std::vector<FieldTile>> frames;
  for (int i = 0; i < 5; ++i) frames.push_back(wall(field, (i - 2) * step_px, random));
  return frames;
}

TEST(FieldOfFocus, OneFrameTellsSizeAndAxisButNoSign) {
  std::mt19937_64 random(51);
  const std::vector<std::vector<FieldTile>> frames{wall({4, 3, 0}, 1, random)};
  const auto fit = field_of_focus(frames, FocusTravel::near_to_far);
  ASSERT_TRUE(fit);
  EXPECT_FALSE(fit->signed_field);
  EXPECT_NEAR(fit->tilt_px.value, 5, 0.5);                 // 54 tiles of about .3 px
  EXPECT_NEAR(fit->axis_deg, std::atan2(3, 4) * 57.29578, 6);
}

// 50 series of five: 95 +- 6.2 % (two standard errors) is what they can tell.
TEST(FieldOfFocus, SeriesTellsTheSign) {
  std::mt19937_64 random(52);
  int covered = 0, right = 0;
  for (int i = 0; i < 50; ++i) {
    const auto frames = travel({-3, 2, -2.5}, 2, random);
    const auto fit = field_of_focus(frames, FocusTravel::near_to_far);
    ASSERT_TRUE(fit);
    ASSERT_TRUE(fit->signed_field);
    right += fit->x_tilt_px < 0 && fit->y_tilt_px > 0 && fit->curvature_px.value < 0;
    covered += fit->curvature_px.low <= -2.5 && -2.5 <= fit->curvature_px.high;
  }
  EXPECT_EQ(right, 50);
  EXPECT_GE(covered, 44);
}

TEST(FieldOfFocus, TurnsItsSignWithTheTravel) {
  std::mt19937_64 random(53);
  const auto frames = travel({-3, 2, -2.5}, 2, random);
  const auto far = field_of_focus(frames, FocusTravel::near_to_far), near = field_of_focus(frames, FocusTravel::far_to_near);
  ASSERT_TRUE(far && near);
  EXPECT_DOUBLE_EQ(far->x_tilt_px, -near->x_tilt_px);
  EXPECT_FALSE(field_of_focus(frames, FocusTravel::unknown)->signed_field);
}

TEST(FieldOfFocus, UpsideDownPartsTheWallFromTheCamera) {
  std::mt19937_64 random(54);
  // Camera 2 px along x; wall 3 px along y, turned in the second series.
  const auto first = field_of_focus(travel({2, 3, 0}, 2, random), FocusTravel::near_to_far);
  const auto second = field_of_focus(travel({2, -3, 0}, 2, random), FocusTravel::near_to_far);
  ASSERT_TRUE(first && second);
  const FieldParts parts = field_parts(*first, *second);
  EXPECT_NEAR(parts.camera_x_px, 2, 0.3);
  EXPECT_NEAR(parts.camera_y_px, 0, 0.3);
  EXPECT_NEAR(parts.wall_y_px, 3, 0.3);
}

TEST(FieldOfFocus, NeedsTwelveTiles) {
  const std::vector<std::vector<FieldTile>> frames{std::vector<FieldTile>(11)};
  EXPECT_FALSE(field_of_focus(frames, FocusTravel::unknown));
}

}  // namespace
}  // namespace focusfall
