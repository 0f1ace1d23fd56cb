// Values that others have published, against the model. The source stands beside each.
#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "analysis/optics/acceptable_blur.h"
#include "analysis/optics/depth_of_field.h"
#include "analysis/optics/thin_lens.h"

namespace focusfall {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();
constexpr double kMmPerInch = 25.4;
constexpr double kMmPerFoot = 304.8;

// Wikipedia, "Hyperfocal distance": 50 mm at f/8 with c = .03 mm, 10 467 mm, and 10 417 mm without the added f.
TEST(PublishedOptics, HyperfocalDistanceOfWikipedia) {
  EXPECT_NEAR(hyperfocal_mm({50, 8}, .03), 10467, 1);
  EXPECT_NEAR(depth_limits({50, 8}, kInfinity, .03).near_mm, 10417, 1);
}

// US Navy, Photography (Basic), NAVEDTRA 14209, p. 40: 6.1 in at f/2.8 has its hyperfocal distance at 554 ft and is
// sharp from 9.8 to 10.2 ft at 10 ft. The circle of confusion, .002 in, is inferred: the text does not state it.
TEST(PublishedOptics, AerialLensOfTheNavyManual) {
  const Lens lens{.focal_length_mm = 6.1 * kMmPerInch, .f_number = 2.8};
  const double c = .002 * kMmPerInch;
  EXPECT_NEAR(hyperfocal_mm(lens, c) / kMmPerFoot, 554, 0.5);   // printed to whole feet
  const DepthLimits limits = depth_limits(lens, 10 * kMmPerFoot, c);
  EXPECT_NEAR(limits.near_mm / kMmPerFoot, 9.8, 0.05);
  EXPECT_NEAR(limits.far_mm / kMmPerFoot, 10.2, 0.05);
}

// The same manual, p. 41: object at F + F/R, image at F + F R; 50 mm at R = 1 puts both at 100 mm.
TEST(PublishedOptics, ConjugateDistancesOfTheNavyManual) {
  EXPECT_EQ(image_distance_mm(50, 100), 100);
  for (const double r : {0.1, 0.5, 1.0}) {
    EXPECT_NEAR(image_distance_mm(50, 50 + 50 / r), 50 + 50 * r, 1e-12);
    EXPECT_NEAR(magnification(50, 50 + 50 / r), r, 1e-14);
  }
}

// US Army publication SS0507: 2 in at f/8 with c = .002 in, 20.8 ft.
TEST(PublishedOptics, NormalLensOfTheArmyPublication) {
  const double near_mm = depth_limits({2 * kMmPerInch, 8}, kInfinity, .002 * kMmPerInch).near_mm;
  EXPECT_NEAR(near_mm / kMmPerFoot, 20.8, 0.05);
}

// Zeiss, Camera Lens News 01/07: diagonal / 1500, "about .030 mm" on 24 x 36 mm: printed to two digits.
TEST(PublishedOptics, CircleOfConfusionOfZeiss) { EXPECT_NEAR(circle_of_confusion(36, 24), .030, .0015); }

// Depth scale of a 50 mm lens at 5 m as read in the Leica M manual; read off an engraved scale, so within 20 %.
TEST(PublishedOptics, EngravedDepthScale) {
  const struct {
    double n, near_m, far_m;
  } kRows[] = {{1.4, 4.6, 5.5}, {4, 4, 8}, {11, 3, 20}, {16, 2.5, kInfinity}};
  for (const auto& row : kRows) {
    const DepthLimits limits = depth_limits({50, row.n}, 5000, 1. / 30);
    EXPECT_NEAR(limits.near_mm / 1000, row.near_m, 0.2 * row.near_m) << "f/" << row.n;
    if (std::isinf(row.far_m)) {
      EXPECT_TRUE(limits.far_infinite());
    } else {
      EXPECT_NEAR(limits.far_mm / 1000, row.far_m, 0.2 * row.far_m) << "f/" << row.n;
    }
  }
}

// Depth-of-field table of the Nikon PC Micro 85 mm f/2.8D manual. It is reproduced with c = 1/30 mm, the f-numbers as
// marked, distances from the film plane, the table's own magnification, and f = 85.31 mm with .175 m between film
// plane and pupil, both fitted to the row at infinity. The far limit of f/32 at 5 m is the worst: .49 %. Where the
// table prints infinity, at f/45, the model's q is .9934, as near to 1 as the roundings of the table allow.
struct HandbookRow {
  double distance_m, one_over_m;
  double near_m[9], far_m[9];
};

TEST(PublishedOptics, HandbookTableOfAMaker) {
  constexpr double kFNumbers[] = {2.8, 4, 5.6, 8, 11, 16, 22, 32, 45};
  constexpr double kFocalMm = 85.31, kPupilM = .175, kBlurMm = 1. / 30;
  constexpr double kAtInfinity[] = {78.15, 54.76, 39.16, 27.46, 20.02, 13.82, 10.10, 7.00, 5.03};
  for (int i = 0; i < 9; ++i) {
    const double near_m = depth_limits({kFocalMm, kFNumbers[i]}, kInfinity, kBlurMm).near_mm / 1000 + kPupilM;
    EXPECT_NEAR(near_m, kAtInfinity[i], .011) << "f/" << kFNumbers[i];   // 6 mm of the fit, 5 mm of the printing
  }
  const HandbookRow kRows[] = {
      {5, 56.5, {4.719, 4.609, 4.470, 4.276, 4.058, 3.742, 3.424, 3.003, 2.596},
       {5.317, 5.467, 5.680, 6.033, 6.544, 7.629, 9.541, 16.53, kInfinity}},
      {2, 21.3, {1.959, 1.941, 1.919, 1.887, 1.848, 1.786, 1.719, 1.618, 1.504},
       {2.043, 2.063, 2.089, 2.129, 2.183, 2.279, 2.406, 2.658, 3.084}}};
  for (const HandbookRow& row : kRows) {
    for (int i = 0; i < 9; ++i) {
      const double q = kFNumbers[i] * kBlurMm / (kFocalMm / row.one_over_m);
      const DepthLimits limits = limits_about(1000 * (row.distance_m - kPupilM), q);
      EXPECT_NEAR(limits.near_mm / 1000 + kPupilM, row.near_m[i], .005 * row.near_m[i]) << "f/" << kFNumbers[i];
      if (std::isinf(row.far_m[i])) {
        EXPECT_NEAR(q, 1, .01);
      } else {
        EXPECT_NEAR(limits.far_mm / 1000 + kPupilM, row.far_m[i], .005 * row.far_m[i]) << "f/" << kFNumbers[i];
      }
    }
  }
}

}  // namespace
}  // namespace focusfall
