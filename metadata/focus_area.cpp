#include "metadata/focus_area.h"

namespace focusfall {

bool lies_in_frame(const FractionRect& box) {
  const double centre_x = box.x + box.width / 2, centre_y = box.y + box.height / 2;
  // Written so that what is not a number is no area either.
  return box.width >= 0 && box.width <= 1 && box.height >= 0 && box.height <= 1 && centre_x >= 0 && centre_x <= 1 &&
         centre_y >= 0 && centre_y <= 1;
}

}  // namespace focusfall
