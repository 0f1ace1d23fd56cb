// What the small part of the held-out sets may not fall behind. The targets are those of the full sets; here each
// bound is the target widened for the scatter of few cases, or, where the target is not reached, what is reached now.
// A better estimator may tighten a bound; loosening one needs a reason in the change that does it.
#pragma once

#include <array>
#include <string_view>

namespace focusfall::accuracy {

struct RegressionBound {
  std::string_view what;     // Figure::what
  double bound;
};

inline constexpr std::array kRegressionBounds{
    RegressionBound{"region blur: |bias|, all c together", 3},
    RegressionBound{"region blur: scatter, all c together", 6},
    RegressionBound{"region blur: 95 % interval covers, at least", 90},        // of 72
    RegressionBound{"region blur: median width / (25 % of c + .8 px)", 1},
    RegressionBound{"flat and smooth tiles that give a number", 3.4},          // 2 of 60
    RegressionBound{"predicted against measured: median difference", 3},
    RegressionBound{"lens: side right where the bias is half a limit or more", 100},
    RegressionBound{"lens: largest error of the bias, of the limit", 10},
    RegressionBound{"exposure, sRGB, 1/3 stop off: frames within .05 stop", 95},                    // of 80
    RegressionBound{"exposure, sRGB, 1/3 stop off: fault found and nothing else blamed", 100},      // of 2 sets
    RegressionBound{"exposure, sRGB, faultless: sets that blame a mark", 0},
    RegressionBound{"exposure, S-shaped, 1/3 stop off: fault found and nothing else blamed", 100},
    RegressionBound{"exposure, S-shaped, faultless: sets with slope within 2 %", 100},
    RegressionBound{"exposure, S-shaped, faultless: pull back within .15 stop", 90},                // of 43
    RegressionBound{"exposure, S-shaped, faultless: lower bounds of single frames above the truth", 0},
};

}  // namespace focusfall::accuracy
