#include "analysis/optics/diffraction.h"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

namespace focusfall {
namespace {

// Recomputed independently with scipy.
TEST(Diffraction, TransferFunctionOfTheCircularApertureFollowsTheFormula) {
  constexpr double kMtf[] = {.872889, .747060, .623838, .504632, .391002, .284757, .188120, .104088, .037386};
  for (int i = 0; i < 9; ++i) EXPECT_NEAR(circular_aperture_mtf(0.1 * (i + 1)), kMtf[i], 1e-6);
  EXPECT_NEAR(circular_aperture_mtf(.403973), 0.5, 1e-6);
  EXPECT_DOUBLE_EQ(circular_aperture_mtf(0), 1);
  EXPECT_EQ(circular_aperture_mtf(1), 0);
  EXPECT_EQ(circular_aperture_mtf(1.5), 0);
}

// Recomputed independently with scipy from Hopkins' integral.
TEST(Diffraction, DefocusedTransferFunctionFollowsHopkins) {
  constexpr double kS[] = {.1, .2, .3, .5, .7};
  struct Row {
    double waves, otf[5];
  };
  constexpr Row kRows[] = {{.25, {.838860, .658579, .501570, .287468, .152489}},
                           {.5, {.742089, .434819, .229264, .084609, .072808}},
                           {1, {.426646, -.014414, -.069515, -.020072, -.017303}},
                           {2, {-.083958, .045000, -.008138, -.007669, -.001668}}};
  for (const Row& row : kRows) {
    for (int i = 0; i < 5; ++i) {
      EXPECT_NEAR(defocused_aperture_otf(kS[i], row.waves), row.otf[i], 1e-6) << "W " << row.waves << " s " << kS[i];
    }
  }
}

TEST(Diffraction, DefocusNeverRaisesContrastAndIsEven) {
  for (double s = 0.02; s < 1; s += 0.06) {
    for (const double waves : {0.1, 0.7, 3.0, 9.0}) {
      EXPECT_LE(std::abs(defocused_aperture_otf(s, waves)), circular_aperture_mtf(s) + 1e-12);
      EXPECT_EQ(defocused_aperture_otf(s, waves), defocused_aperture_otf(s, -waves));
    }
    EXPECT_NEAR(defocused_aperture_otf(s, 1e-9), circular_aperture_mtf(s), 1e-9);
  }
}

// First two zeros of J1 (scipy) are the radii of the first dark rings in units of lambda N.
TEST(Diffraction, DarkRingsLieAtTheZerosOfTheBesselFunction) {
  EXPECT_NEAR(jinc(3.83170597), 0, 1e-8);
  EXPECT_NEAR(jinc(7.01558667), 0, 1e-8);
  EXPECT_NEAR(airy_diameter(1, 1), 2 * 1.21966989, 2e-8);
  EXPECT_NEAR(airy_diameter(0.55, 8), 2 * 1.21966989 * 4.4, 1e-6);
}

// Full width at half maximum 1.028994 lambda N (scipy): the intensity is jinc^2(pi r / (lambda N)).
TEST(Diffraction, AiryPatternIsHalfAsBrightAtItsHalfWidth) {
  const double at_half = jinc(std::numbers::pi * 1.028994 / 2);
  EXPECT_NEAR(at_half * at_half, 0.5, 2e-6);
}

TEST(Diffraction, CutOffIsOneOverWavelengthTimesFNumber) { EXPECT_NEAR(cutoff_cycles_per_mm(.55, 8), 227.27, 5e-3); }

// dz = 8 N^2 W20 at the image and c = dz / N.
TEST(Diffraction, WavesOfADiscFollowFromTheFocusErrorAtTheImage) {
  const double n = 4, wavelength_mm = 0.00055, focus_error_mm = 0.1;
  EXPECT_NEAR(disc_waves(focus_error_mm / n, wavelength_mm, n), focus_error_mm / (8 * n * n * wavelength_mm), 1e-12);
}

TEST(Diffraction, SincIsTheTransferFunctionOfABox) {
  EXPECT_EQ(sinc(0), 1);
  EXPECT_NEAR(sinc(1), 0, 1e-15);
  EXPECT_NEAR(sinc(.5), 2 / std::numbers::pi, 1e-15);
  EXPECT_NEAR(sinc(.6033546), .5, 1e-7);   // scipy: MTF50 of a box is .6033546 / p
  EXPECT_NEAR(sinc(2.9e-5), sinc(3.3e-5), 1e-8);   // both sides of where the series takes over
}

}  // namespace
}  // namespace focusfall
