// Drawn pieces of the invented shoot: boats, water, shore, stage, gravel. Canvases are in metres.
#pragma once

#include <memory>
#include <string>

#include "tests/render/paint.h"
#include "tests/render/random.h"
#include "tests/render/surface.h"

namespace focusfall::render {

using TexturePtr = std::shared_ptr<const MipTexture>;

struct BoatLook {
  double texel_m = 0.00225;
  Light hull{0.75f, 0.76f, 0.74f};
  Light stripe{0.02f, 0.09f, 0.25f};
  Light jacket{0.75f, 0.06f, 0.03f};
  Light spinnaker{0, 0, 0};
  std::string number = "27";
  double heel_deg = 6;
  std::uint64_t random_key = 1;
};

inline constexpr double kBoatWidth = 5.4, kBoatHeight = 6.9;  // metres of the boat's board, waterline at its lower edge

cv::Mat boat_picture(const BoatLook& look);
cv::Mat reflection_of(const cv::Mat& boat, int divisor, std::uint64_t random_key);
cv::Mat buoy_picture(double texel_m);
cv::Mat water_picture(double glint_share, std::uint64_t random_key);         // tiled, 2048 x 2048
cv::Mat shore_picture(double texel_m, double width_m, double height_m, std::uint64_t random_key);

struct ActorLook {
  double texel_m = 0.00067;
  Light jacket{0.05f, 0.09f, 0.16f};
  Light trousers{0.02f, 0.02f, 0.025f};
  Light shirt{0.5f, 0.45f, 0.38f};
  Light skin{0.42f, 0.24f, 0.16f};
  Light hair{0.03f, 0.018f, 0.01f};
  bool long_coat = false;
  double arm_raise = 0;             // 0 = reading from a script held before the chest, 1 = arm stretched out
  std::uint64_t random_key = 1;
};

inline constexpr double kActorWidth = 1.5, kActorHeight = 1.86;

cv::Mat actor_picture(const ActorLook& look);
cv::Mat stand_picture(double texel_m);                                       // a microphone on its stand, 0.5 x 1.7 m
cv::Mat curtain_picture(double texel_m, double width_m, double height_m, std::uint64_t random_key);
cv::Mat lamps_picture(double texel_m, double width_m, double height_m, bool floods, std::uint64_t random_key);
cv::Mat boards_picture(std::uint64_t random_key);                            // tiled stage floor, 2048 x 1024
cv::Mat shadow_picture(double width_m, double depth_m, double texel_m, double darkness);

cv::Mat gravel_picture(int side, std::uint64_t random_key);                  // tiled
cv::Mat card_picture(double texel_m);                                        // printed card, 0.30 x 0.42 m
cv::Mat washers_picture(double texel_m, double width_m, double height_m, std::uint64_t random_key);

}  // namespace focusfall::render
