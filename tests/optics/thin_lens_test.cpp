#include "analysis/optics/thin_lens.h"

#include <gtest/gtest.h>

#include <limits>

namespace focusfall {
namespace {

// Values recomputed independently with scipy from c = f^2/(N (s - f)) |d - s|/d; printed to seven digits.
TEST(ThinLens, BlurDiscFollowsTheFormula) {
  EXPECT_NEAR(blur_disc_mm(50, 1.4, 2000, 2100), 0.0436072, 5e-8);
  EXPECT_NEAR(blur_disc_mm(35, 2, 1000, 5000), 0.5077720, 5e-8);
  EXPECT_NEAR(blur_disc_mm(85, 1.8, 2000, std::numeric_limits<double>::infinity()), 2.0960255, 5e-8);
}

TEST(ThinLens, BlurIsZeroAtFocusDistance) { EXPECT_EQ(blur_disc_mm(400, 2.8, 30000, 30000), 0); }

}  // namespace
}  // namespace focusfall
