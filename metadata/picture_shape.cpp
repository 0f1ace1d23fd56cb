#include "metadata/picture_shape.h"

#include <algorithm>
#include <cmath>

namespace focusfall {
namespace {

constexpr double kSameShape = 0.02;

double shape(DecodedSize size) {
  return static_cast<double>(std::max(size.width_px, size.height_px)) / std::min(size.width_px, size.height_px);
}

}  // namespace

bool is_known(DecodedSize size) {
  return size.width_px > 0 && size.height_px > 0;
}

bool same_shape(DecodedSize a, DecodedSize b) {
  return std::abs(shape(a) / shape(b) - 1) < kSameShape;
}

bool is_turned(DecodedSize a, DecodedSize b) {
  return (a.width_px > a.height_px && b.width_px < b.height_px) ||
         (a.width_px < a.height_px && b.width_px > b.height_px);
}

}  // namespace focusfall
