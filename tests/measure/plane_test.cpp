#include "analysis/measure/plane.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <vector>

#include "tests/measure/simulated_ground.h"

namespace focusfall {
namespace {

// What a contact says, over many frames. A side counts as called where the signed blur stands out by the rule of the
// verdict (2.5 standard errors, .1 px at least).
struct Tally {
  int frames = 0, found = 0, called = 0, wrong = 0, covered = 0, with_contact = 0;
  std::vector<double> error_px;

  void add(const std::optional<PlaneReading>& reading, double truth_px) {
    ++frames;
    found += reading.has_value();
    if (!reading || !reading->at_contact_px) return;
    ++with_contact;
    const Interval& l = *reading->at_contact_px;
    error_px.push_back(std::abs(l.value - truth_px));
    covered += l.low <= truth_px && truth_px <= l.high;
    if (std::abs(l.value) <= 2.5 * std::hypot(reading->at_contact_sigma_px, 0.1)) return;
    ++called;
    wrong += l.value * truth_px < 0;
  }
  double quantile(double q) {
    if (error_px.empty()) return 0;
    std::sort(error_px.begin(), error_px.end());
    return error_px[size_t(q * double(error_px.size() - 1))];
  }
  void print(const char* what) {
    std::printf("%-34s %4d frames, plane %5.1f %%, contact %5.1f %%, side called %5.1f %%, wrong %d, |error| median %.3f "
                "p90 %.3f px, covered %.1f %%\n",
                what, frames, 100.0 * found / frames, 100.0 * with_contact / frames, 100.0 * called / frames, wrong,
                quantile(0.5), quantile(0.9), with_contact ? 100.0 * covered / with_contact : 0.0);
  }
};

PlaneOptions options_of(const Ground& ground, const FractionBox& aim) {
  PlaneOptions options;
  options.width_px = ground.width_px;
  options.height_px = ground.height_px;
  options.near_side = NearSide::bottom;
  options.aim = aim;
  return options;
}

double log_uniform(EdgeSimulator& draw, double low, double high) {
  return std::exp(draw.uniform(std::log(low), std::log(high)));
}

// An aim of a tenth of the frame on the ground; focus displaced so that the signed blur at its centre is +-l.
void aim_on_ground(double slope_low, double slope_high, double clutter, int frames, Tally& tally) {
  for (int i = 0; i < frames; ++i) {
    GroundSimulator simulator(100u + unsigned(i));
    EdgeSimulator& draw = simulator.draw();
    Ground ground;
    ground.slope = log_uniform(draw, slope_low, slope_high);
    ground.lean_deg = draw.uniform(-8, 8);
    ground.horizon_px = draw.uniform(0, 900);
    ground.background_px = draw.uniform(10, 80);
    ground.baseline_px2 = draw.uniform(-4, 4);
    ground.clutter_share = clutter;
    const FractionBox aim{draw.uniform(0.2, 0.7), draw.uniform(0.55, 0.8), 0.1, 0.1};
    const double x = (aim.x + 0.05) * ground.width_px, y = (aim.y + 0.05) * ground.height_px;
    ground.clear = {aim.x, aim.y, 0.1, 1 - aim.y};
    // A quarter to two half-depths of field for a limit of 3 px, on either side.
    const double l = (i % 2 ? 1 : -1) * draw.uniform(0.75, 6);
    ground.line_px += (ground.signed_blur_px(x, y) - l) / ground.slope / std::cos(ground.lean_deg * std::numbers::pi / 180);
    tally.add(plane(simulator.edges(ground), options_of(ground, aim)), l);
  }
}

TEST(Plane, AimOnTheSurfaceHasItsSide) {
  Tally tally;
  aim_on_ground(0.007, 0.07, 0.1, 120, tally);
  tally.print("aim on ground, k .007-.07");
  EXPECT_EQ(tally.wrong, 0);
  EXPECT_GE(tally.called, tally.frames * 95 / 100);
}

TEST(Plane, SteepFieldsOfLongLensesNearTheGround) {
  Tally tally;
  aim_on_ground(0.07, 0.2, 0.1, 60, tally);
  tally.print("aim on ground, k .07-.2");
  EXPECT_EQ(tally.wrong, 0);
}

// A subject of one blur, standing: its box reaches above the horizon, its feet stand on a row of the ground.
void standing_subject(double slope_low, double slope_high, int frames, Tally& tally) {
  for (int i = 0; i < frames; ++i) {
    GroundSimulator simulator(5000u + unsigned(i));
    EdgeSimulator& draw = simulator.draw();
    Ground ground;
    ground.slope = log_uniform(draw, slope_low, slope_high);
    ground.horizon_px = draw.uniform(300, 900);
    ground.background_px = draw.uniform(10, 80);
    ground.baseline_px2 = draw.uniform(-4, 4);
    ground.clutter_share = 0.05;
    const double foot_y = draw.uniform(0.6, 0.85), height = draw.uniform(0.2, 0.4), x = draw.uniform(0.2, 0.7);
    const double l = (i % 2 ? 1 : -1) * draw.uniform(0.75, 6);
    ground.line_px = foot_y * ground.height_px - l / ground.slope;
    const Figure subject{{x, foot_y - height, 0.12, height}, std::abs(l)};
    ground.clear = {x, foot_y - height, 0.12, 1 - foot_y + height};
    // The aim is the head, the body, or low on the legs.
    const FractionBox aim{x + 0.01, foot_y - height * draw.uniform(0.3, 0.95), 0.1, 0.1};
    tally.add(plane(simulator.edges(ground, {subject}), options_of(ground, aim)), l);
  }
}

TEST(Plane, TheHeightOfAStandingSubjectDoesNotFoolTheSide) {
  Tally tally;
  standing_subject(0.007, 0.07, 120, tally);
  tally.print("standing subject, k .007-.07");
  EXPECT_EQ(tally.wrong, 0);
  // One in eight is left open because its feet might stand as well on the other side of the line of best focus; on
  // rendered frames a rule that decided more called wrong sides.
  EXPECT_GE(tally.called, tally.frames * 85 / 100);
}

TEST(Plane, ASubjectInTheAirHasNoContact) {
  int contacts = 0;
  const int frames = 100;
  for (int i = 0; i < frames; ++i) {
    GroundSimulator simulator(9000u + unsigned(i));
    EdgeSimulator& draw = simulator.draw();
    Ground ground;
    ground.slope = log_uniform(draw, 0.007, 0.07);
    ground.horizon_px = draw.uniform(700, 1000);
    ground.line_px = draw.uniform(1100, 1800);
    const double x = draw.uniform(0.2, 0.7), y = draw.uniform(0.05, 0.15);
    const Figure bird{{x, y, 0.12, 0.15}, draw.uniform(0, 12)};
    const auto reading = plane(simulator.edges(ground, {bird}), options_of(ground, {x + 0.01, y + 0.02, 0.1, 0.1}));
    contacts += reading && reading->contact != Contact::none;
  }
  // A stray edge of the background may happen to bridge the gap to the ground; two in a hundred would be too many.
  EXPECT_LE(contacts, 1) << "of " << frames;
}

TEST(Plane, NoSurfaceGivesNoSide) {
  int found = 0;
  const int frames = 100;
  for (int i = 0; i < frames; ++i) {
    GroundSimulator simulator(12000u + unsigned(i));
    Ground ground;
    ground.slope = 0;
    ground.horizon_px = ground.height_px;         // background only, of one blur
    ground.background_px = simulator.draw().uniform(0, 15);
    std::vector<Figure> figures;
    for (int f = 0; f < 12; ++f)
      figures.push_back({{simulator.draw().uniform(0, 0.8), simulator.draw().uniform(0, 0.8), 0.2, 0.2},
                         simulator.draw().uniform(0, 12)});
    const auto reading = plane(simulator.edges(ground, figures), options_of(ground, {0.4, 0.4, 0.1, 0.1}));
    found += reading && reading->at_contact_px &&
             std::abs(reading->at_contact_px->value) > 2.5 * std::hypot(reading->at_contact_sigma_px, 0.1);
  }
  std::printf("no surface: %d of %d frames got a side\n", found, frames);
  EXPECT_LE(found, frames / 50);
}

}  // namespace
}  // namespace focusfall
