// How much blur is too much.
#pragma once

#include <optional>

namespace focusfall {

// The trade's circle of confusion, diagonal / 1500: .029 mm on 24 x 36 mm. Unit as given.
double circle_of_confusion(double width, double height);

// Judgement: a disc of two pixels of the picture as it is delivered is where softness begins to show at full size.
inline constexpr double kDeliveredBlurPx = 2;
// Judgement: pictures are rarely delivered wider than this; the default where the user names no width.
inline constexpr int kLargestDeliveredWidthPx = 4000;

// Acceptable disc in px of a frame of this size when it is delivered `delivered_width_px` wide (0: the frame's width,
// at most 4000 px): 2 px of the delivered picture, never above diagonal / 1500, never below 2 px of the frame. 3 px
// at 6000 x 4000.
double acceptable_blur_px(int width_px, int height_px, int delivered_width_px = 0);

}  // namespace focusfall
