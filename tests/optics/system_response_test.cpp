#include "analysis/optics/system_response.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "analysis/optics/diffraction.h"

namespace focusfall {
namespace {

// A square pixel so small that only the shape in front of it counts.
SystemResponse bare() { return {.pixel_aperture_px = 0}; }

// Recomputed independently with scipy. The rise of the edge series carries its cut of the spectrum: 3e-4 of the step
// over a slope of about one step per rise, 1e-3 of the rise.
TEST(SystemResponse, DiscHasItsKnownRiseAndMtf50) {
  for (const double c : {3.0, 8.0, 40.0}) {
    SystemResponse response = bare();
    response.disc_px = c;
    EXPECT_NEAR(*edge_rise_px(response, 0), .6870488 * c, 1e-3 * c);
    EXPECT_NEAR(*mtf50_cycles_per_px(response, 30), .7050848 / c, 1e-6 / c);
  }
}

TEST(SystemResponse, GaussianHasItsKnownRiseAndMtf50) {
  for (const double sigma : {0.7, 2.0, 9.0}) {
    SystemResponse response = bare();
    response.gaussian_sigma_px = sigma;
    EXPECT_NEAR(*edge_rise_px(response, 0), 2.5631031 * sigma, 1e-4 * sigma);
    EXPECT_NEAR(*mtf50_cycles_per_px(response, 45), .1873906 / sigma, 1e-6 / sigma);
  }
}

TEST(SystemResponse, LinearMotionHasItsKnownRiseAndMtf50AlongItsPathOnly) {
  SystemResponse response = bare();
  response.motion_length_px = 6;
  response.motion_angle_deg = 25;
  EXPECT_NEAR(*edge_rise_px(response, 25), 0.8 * 6, 2e-2);   // corners of the box: cut of the spectrum at 32 cycles/px
  EXPECT_NEAR(*mtf50_cycles_per_px(response, 25), .6033546 / 6, 1e-6);
  EXPECT_FALSE(mtf50_cycles_per_px(response, 115));
}

// MTF50 behind a box of one pixel, cycles/px, and the rise of a Gaussian behind it; recomputed with scipy.
TEST(SystemResponse, PixelApertureLowersMtf50AsKnown) {
  const auto gaussian = [](double sigma) { return SystemResponse{.gaussian_sigma_px = sigma}; };
  EXPECT_NEAR(*mtf50_cycles_per_px(gaussian(.5), 0), .323088, 1e-6);
  EXPECT_NEAR(*mtf50_cycles_per_px(gaussian(1), 0), .179964, 1e-6);
  EXPECT_NEAR(*mtf50_cycles_per_px(gaussian(2), 0), .092732, 1e-6);
  EXPECT_NEAR(*mtf50_cycles_per_px({.disc_px = 2}, 0), .312221, 1e-6);
  EXPECT_NEAR(*mtf50_cycles_per_px({.disc_px = 4}, 0), .170767, 1e-6);
  EXPECT_NEAR(*mtf50_cycles_per_px({.disc_px = 8}, 0), .087433, 1e-6);
  EXPECT_NEAR(*mtf50_cycles_per_px({.motion_length_px = 4}, 0), .147453, 1e-6);
  EXPECT_NEAR(*edge_rise_px(gaussian(.5), 0), 1.486188, 1e-4);
  EXPECT_NEAR(*edge_rise_px(gaussian(1), 0), 2.668846, 1e-4);
}

TEST(SystemResponse, ClosedFormOfDiscAndPixelAgreesWithTheSeries) {
  for (const double c : {0.0, 0.6, 2.0, 4.0, 8.0}) {
    EXPECT_NEAR(disc_edge_rise_px(c), *edge_rise_px({.disc_px = c}, 0), c == 0 ? 2e-2 : 2e-3) << c;
    EXPECT_NEAR(disc_mtf50_cycles_per_px(c), *mtf50_cycles_per_px({.disc_px = c}, 0), 1e-6) << c;
  }
  EXPECT_NEAR(disc_edge_rise_px(0), 0.8, 1e-9);
  EXPECT_NEAR(disc_mtf50_cycles_per_px(0), .6033546, 1e-7);
}

TEST(SystemResponse, ReadingsAreMonotoneInTheDisc) {
  double rise = 0, mtf50 = std::numeric_limits<double>::infinity();
  for (double c = 0; c < 60; c += 0.5) {
    EXPECT_GT(disc_edge_rise_px(c), rise);
    EXPECT_LT(disc_mtf50_cycles_per_px(c), mtf50);
    rise = disc_edge_rise_px(c);
    mtf50 = disc_mtf50_cycles_per_px(c);
  }
}

// A Gaussian edge against the error function, point by point.
TEST(SystemResponse, EdgeSpreadOfAGaussianIsItsErrorFunction) {
  SystemResponse response = bare();
  response.gaussian_sigma_px = 1.5;
  const auto edge = edge_spread(response, 70, 0.25, 8);
  ASSERT_EQ(edge.size(), 65u);
  for (int i = 0; i < 65; ++i) {
    const double x = 0.25 * (i - 32);
    EXPECT_NEAR(edge[static_cast<std::size_t>(i)], 0.5 * std::erfc(-x / (1.5 * std::sqrt(2.))), 1e-7);
  }
}

// Near focus the product of disc and Airy pattern is a poor model; its error is known: MTF50 low by 17.8 % at a
// quarter of a wave, 8.7 % at one, 4.6 % at two (recomputed with scipy). The exact integral must differ by just that.
TEST(SystemResponse, ExactDefocusDiffersFromTheProductOfDiscAndAiryAsKnown) {
  const struct {
    double waves, error;
  } kRows[] = {{.25, .178}, {1, .087}, {2, .046}};
  for (const auto& row : kRows) {
    SystemResponse response = bare();
    response.airy_lambda_n_over_p_px = 4;
    response.disc_px = 8 * row.waves * 4;
    const double exact = *mtf50_cycles_per_px(response, 0);
    double product = 0;
    for (double f = 1e-6; product == 0; f += 1e-6) {
      if (jinc(M_PI * response.disc_px * f) * circular_aperture_mtf(4 * f) <= .5) product = f;
    }
    EXPECT_NEAR(1 - product / exact, row.error, 1e-3) << row.waves << " waves";
  }
}

}  // namespace
}  // namespace focusfall
