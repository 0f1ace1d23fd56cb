#include "analysis/measure/luma_picture.h"

#include <cmath>

namespace focusfall {

std::vector<float> srgb_linear_of_code(int code_count) {
  std::vector<float> linear(static_cast<std::size_t>(code_count));
  for (int code = 0; code < code_count; ++code) {
    const double v = static_cast<double>(code) / (code_count - 1);
    linear[static_cast<std::size_t>(code)] =
        static_cast<float>(v <= 0.04045 ? v / 12.92 : std::pow((v + 0.055) / 1.055, 2.4));
  }
  return linear;
}

}  // namespace focusfall
