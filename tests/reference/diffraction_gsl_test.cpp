// The GNU Scientific Library as an independent reference for diffraction and defocus.
#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_sf_bessel.h>
#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <memory>
#include <numbers>

#include "analysis/optics/diffraction.h"
#include "analysis/optics/system_response.h"

namespace focusfall {
namespace {

constexpr double kPi = std::numbers::pi;

// Adaptive quadrature; 1e-9 absolute.
double integral(const std::function<double(double)>& function, double from, double to) {
  constexpr std::size_t kIntervals = 2000;
  const std::unique_ptr<gsl_integration_workspace, void (*)(gsl_integration_workspace*)> workspace(
      gsl_integration_workspace_alloc(kIntervals), gsl_integration_workspace_free);
  gsl_function wrapped{
      [](double x, void* f) { return (*static_cast<const std::function<double(double)>*>(f))(x); },
      const_cast<std::function<double(double)>*>(&function)};
  double value = 0, error = 0;
  const int status = gsl_integration_qag(&wrapped, from, to, 1e-10, 1e-9, kIntervals, GSL_INTEG_GAUSS61,
                                         workspace.get(), &value, &error);
  EXPECT_EQ(status, GSL_SUCCESS) << gsl_strerror(status);
  return value;
}

class DiffractionAgainstGsl : public testing::Test {
 protected:
  void SetUp() override { previous_ = gsl_set_error_handler_off(); }
  void TearDown() override { gsl_set_error_handler(previous_); }

 private:
  gsl_error_handler_t* previous_ = nullptr;
};

TEST_F(DiffractionAgainstGsl, JincIsTheBesselFunction) {
  for (double x = 1e-6; x < 200; x = 1.2 * x + 0.01) {
    EXPECT_NEAR(jinc(x), 2 * gsl_sf_bessel_J1(x) / x, 1e-13) << "x = " << x;
  }
  EXPECT_EQ(jinc(0), 1);
}

TEST_F(DiffractionAgainstGsl, AiryDiameterIsTheFirstZeroOfTheBesselFunction) {
  EXPECT_NEAR(airy_diameter(1, 1), 2 * gsl_sf_bessel_zero_J1(1) / kPi, 1e-12);
}

// Encircled energy of the Airy pattern within the first and second dark ring, .837785 and .909931 (scipy):
// half the integral of jinc^2(x) x.
TEST_F(DiffractionAgainstGsl, EncircledEnergyOfTheAiryPattern) {
  const auto energy = [](double to) { return 0.5 * integral([](double x) { return jinc(x) * jinc(x) * x; }, 0, to); };
  EXPECT_NEAR(energy(gsl_sf_bessel_zero_J1(1)), .837785, 1e-6);
  EXPECT_NEAR(energy(gsl_sf_bessel_zero_J1(2)), .909931, 1e-6);
}

// Hopkins' integral as written, by adaptive quadrature, over the whole range of the product.
TEST_F(DiffractionAgainstGsl, DefocusedOtfIsHopkinsIntegral) {
  for (double s = 0.013; s < 1; s += 0.047) {
    for (const double waves : {0.0, 0.05, 0.3, 1.0, 2.7, 6.0, 10.0, 20.0}) {
      const double reference = 4 / kPi * integral([&](double x) {
                                 return std::sqrt(std::max(0., 1 - (x + s) * (x + s))) * std::cos(8 * kPi * waves * s * x);
                               }, 0, 1 - s);
      EXPECT_NEAR(defocused_aperture_otf(s, waves), reference, 2e-8) << "s " << s << ", " << waves << " waves";
    }
  }
}

// The definition itself, knowing nothing of Hopkins' reduction: the autocorrelation of the pupil function
// exp(2 pi i W r^2) over two unit circles shifted by 2 s, integrated over the plane.
TEST_F(DiffractionAgainstGsl, DefocusedOtfIsTheAutocorrelationOfThePupil) {
  for (const double s : {0.1, 0.35, 0.62, 0.9}) {
    for (const double waves : {0.0, 0.25, 1.0, 2.5}) {
      const auto along_y = [&](double y) {
        const double reach = std::sqrt(std::max(0., 1 - y * y)) - s;   // of the overlap, in x
        if (reach <= 0) return 0.;
        return integral([&](double x) {
          const double first = (x + s) * (x + s) + y * y, second = (x - s) * (x - s) + y * y;
          return std::cos(2 * kPi * waves * (first - second));
        }, -reach, reach);
      };
      const double top = std::sqrt(1 - s * s);
      const double reference = integral(along_y, -top, top) / kPi;
      EXPECT_NEAR(defocused_aperture_otf(s, waves), reference, 1e-7) << "s " << s << ", " << waves << " waves";
    }
  }
}

// Far from focus geometric disc times Airy pattern is left. The program changes over at ten waves, where MTF50 of the
// product is said to be low by 9 % / W.
TEST_F(DiffractionAgainstGsl, FarFromFocusMtf50IsThatOfTheProductOfDiscAndAiry) {
  const auto mtf50 = [](auto function) {
    double low = 0, high = 0.3;
    for (double s = 0; s < high; s += 1e-4) {
      if (function(s) < 0.5) high = s;
    }
    low = high - 1e-4;
    for (int i = 0; i < 40; ++i) (function((low + high) / 2) > 0.5 ? low : high) = (low + high) / 2;
    return high;
  };
  for (const double waves : {5.0, 10.0, 20.0}) {
    const double exact = mtf50([&](double s) { return defocused_aperture_otf(s, waves); });
    const double product = mtf50([&](double s) {
      const double x = 8 * kPi * waves * s;
      return (x == 0 ? 1 : 2 * gsl_sf_bessel_J1(x) / x) * circular_aperture_mtf(s);
    });
    EXPECT_NEAR(1 - product / exact, 0.09 / waves, 0.01 / waves) << waves << " waves";
  }
}

// The edge of a defocused, diffracted system against E(x) = 1/2 + int H(f) sin(2 pi f x) / (pi f) df by quadrature.
TEST_F(DiffractionAgainstGsl, EdgeSpreadIsTheIntegralOfTheTransferFunction) {
  for (const double disc_px : {0.0, 1.5, 6.0}) {
    const SystemResponse response{.disc_px = disc_px, .airy_lambda_n_over_p_px = 0.8, .pixel_aperture_px = 1};
    const auto edge = edge_spread(response, 0, 0.5, 4);
    for (int i = 0; i < 17; ++i) {
      const double x = 0.5 * (i - 8);
      const double reference = 0.5 + integral([&](double f) {
                                 return otf(response, f, 0) * (f == 0 ? 2 * x : std::sin(2 * kPi * f * x) / (kPi * f));
                               }, 0, 1 / 0.8);
      EXPECT_NEAR(edge[static_cast<std::size_t>(i)], reference, 2e-5) << "disc " << disc_px << " at " << x;
    }
  }
}

}  // namespace
}  // namespace focusfall
