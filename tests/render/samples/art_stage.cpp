#include <algorithm>
#include <cmath>
#include <numbers>

#include "tests/render/samples/art_tools.h"
#include "tests/render/scene.h"

namespace focusfall::render {
namespace {

constexpr double kPi = std::numbers::pi;

// Folds of cloth: soft bands a little lighter and darker than the cloth, on the garment alone.
void fold(Canvas& canvas, cv::Point2d from, cv::Point2d to, double half_width, int count, const Light& cloth, Random& random) {
  const cv::Point2d axis = to - from;
  const cv::Point2d side = cv::Point2d(-axis.y, axis.x) / std::hypot(axis.x, axis.y);
  for (int i = 0; i < count; ++i) {
    const double start = random.uniform(0, 0.85), end = std::min(0.97, start + random.uniform(0.05, 0.3));
    const double across = random.uniform(-0.8, 0.8) * half_width, drift = random.uniform(-0.3, 0.3) * half_width;
    line(canvas, from + start * axis + across * side, from + end * axis + std::clamp(across + drift, -0.85 * half_width, 0.85 * half_width) * side,
         random.log_uniform(0.0015, 0.008), scaled(cloth, random.log_uniform(0.62, 1.45)));
  }
}

void draw_head(Canvas& canvas, cv::Point2d centre, const ActorLook& look, Random& random) {
  const Light dark = scaled(look.skin, 0.45);
  canvas.fill_limb(centre + cv::Point2d(0, 0.10), 0.046, centre + cv::Point2d(0, 0.17), 0.052, scaled(look.skin, 0.7));
  canvas.fill_disc(centre + cv::Point2d(-0.004, -0.02), 0.108, look.hair);
  canvas.fill_limb(centre + cv::Point2d(0.008, -0.02), 0.082, centre + cv::Point2d(0.012, 0.05), 0.066, look.skin, {2.2, -1.0});
  canvas.fill_limb(centre + cv::Point2d(-0.05, -0.085), 0.035, centre + cv::Point2d(0.06, -0.088), 0.03, look.hair);
  for (const double side : {-0.03, 0.038}) {
    line(canvas, centre + cv::Point2d(side - 0.017, -0.031), centre + cv::Point2d(side + 0.015, -0.034), 0.007, look.hair);
    line(canvas, centre + cv::Point2d(side - 0.011, -0.012), centre + cv::Point2d(side + 0.011, -0.012), 0.011, {0.5f, 0.48f, 0.45f});
    canvas.fill_disc(centre + cv::Point2d(side, -0.012), 0.0062, {0.01f, 0.008f, 0.006f});
    line(canvas, centre + cv::Point2d(side - 0.012, -0.018), centre + cv::Point2d(side + 0.012, -0.018), 0.003, {0.01f, 0.01f, 0.01f});
  }
  line(canvas, centre + cv::Point2d(0.008, -0.008), centre + cv::Point2d(0.014, 0.026), 0.006, scaled(look.skin, 0.75));
  line(canvas, centre + cv::Point2d(-0.002, 0.029), centre + cv::Point2d(0.018, 0.029), 0.005, dark);
  line(canvas, centre + cv::Point2d(-0.018, 0.057), centre + cv::Point2d(0.034, 0.056), 0.008, {0.22f, 0.07f, 0.06f});
  line(canvas, centre + cv::Point2d(-0.016, 0.056), centre + cv::Point2d(0.032, 0.056), 0.002, {0.04f, 0.01f, 0.01f});
  for (int i = 0; i < 120; ++i) {
    const double angle = random.uniform(kPi * 1.02, kPi * 1.98), radius = random.uniform(0.075, 0.112);
    const cv::Point2d at = centre + cv::Point2d(0, -0.02) + radius * cv::Point2d(std::cos(angle), std::sin(angle));
    line(canvas, at, at + 0.022 * cv::Point2d(-std::sin(angle), std::cos(angle)), 0.0018, scaled(look.hair, random.log_uniform(0.6, 7)));
  }
}

void draw_script(Canvas& canvas, cv::Point2d centre, Random& random) {
  const Points page{centre + cv::Point2d(-0.115, -0.135), centre + cv::Point2d(0.095, -0.155), centre + cv::Point2d(0.115, 0.125), centre + cv::Point2d(-0.095, 0.145)};
  canvas.fill_convex(page, {0.62f, 0.60f, 0.54f}, {0.8, -0.4});
  canvas.set_only_where_painted(true);
  for (int row = 0; row < 13; ++row) {
    cv::Point2d at = centre + cv::Point2d(-0.09 + 0.0012 * row, -0.115 + 0.0195 * row);
    while (at.x < centre.x + 0.075 + (row % 4 == 3 ? -0.08 : 0)) {
      const double word = random.uniform(0.008, 0.03);
      line(canvas, at, at + cv::Point2d(word, -0.09 * word), 0.0052, {0.03f, 0.03f, 0.035f});
      at += cv::Point2d(word + 0.009, -0.09 * (word + 0.009));
    }
  }
  canvas.set_only_where_painted(false);
}

}  // namespace

cv::Mat actor_picture(const ActorLook& look) {
  Random random(look.random_key);
  Canvas canvas = metre_canvas(kActorWidth, kActorHeight, look.texel_m);
  const double floor = kActorHeight, x = kActorWidth / 2;
  const auto up = [&](double dx, double y) { return cv::Point2d(x + dx, floor - y); };
  for (const double side : {-0.10, 0.09}) {
    canvas.fill_limb(up(side * 1.2, 0.88), 0.105, up(side * 1.45, 0.48), 0.075, look.trousers, {3, 0});
    canvas.fill_limb(up(side * 1.45, 0.48), 0.075, up(side * 1.6, 0.09), 0.055, look.trousers, {3, 0});
    fold(canvas, up(side * 1.25, 0.80), up(side * 1.6, 0.1), 0.05, 40, scaled(look.trousers, 1.3), random);
    canvas.fill_limb(up(side * 1.6 - 0.02, 0.035), 0.036, up(side * 1.6 + 0.10, 0.028), 0.028, {0.025f, 0.018f, 0.012f});
    line(canvas, up(side * 1.6 - 0.05, 0.008), up(side * 1.6 + 0.13, 0.008), 0.014, {0.1f, 0.09f, 0.08f});
  }
  // Shirt with checks, the jacket open over it.
  const Points shirt{up(-0.13, 1.47), up(0.13, 1.47), up(0.15, 0.92), up(-0.15, 0.92)};
  canvas.fill_convex(shirt, look.shirt, {1.0, 0});
  for (int i = 0; i < 17; ++i) line(canvas, up(-0.16 + 0.02 * i, 1.47), up(-0.16 + 0.02 * i, 0.94), 0.005, {0.16f, 0.05f, 0.04f});
  for (int i = 0; i < 26; ++i) line(canvas, up(-0.14, 0.95 + 0.02 * i), up(0.14, 0.95 + 0.02 * i), 0.005, {0.10f, 0.06f, 0.08f});
  const double hem = look.long_coat ? 0.52 : 0.84;
  const Points left{up(-0.215, 1.46), up(-0.06, 1.52), up(-0.045, 1.1), up(-0.09, hem), up(-0.25, hem), up(-0.235, 1.2)};
  const Points right{up(0.06, 1.52), up(0.215, 1.46), up(0.235, 1.2), up(0.25, hem), up(0.08, hem), up(0.05, 1.1)};
  canvas.fill_convex(left, look.jacket, {3.5, 0});
  canvas.fill_convex(right, look.jacket, {2.0, 0});
  fold(canvas, up(-0.14, 1.42), up(-0.16, hem), 0.06, 45, look.jacket, random);
  fold(canvas, up(0.14, 1.42), up(0.16, hem), 0.06, 45, look.jacket, random);
  line(canvas, up(-0.075, 1.50), up(-0.045, 1.12), 0.014, scaled(look.jacket, 2.4));
  line(canvas, up(0.075, 1.50), up(0.05, 1.12), 0.014, scaled(look.jacket, 2.4));
  for (int i = 0; i < 4; ++i) canvas.fill_disc(up(0.068, 1.08 - 0.085 * i), 0.009, {0.30f, 0.26f, 0.15f});
  draw_head(canvas, up(0.0, 1.665), look, random);
  // Arms: both to the script, or the right one stretched out.
  const bool raised = look.arm_raise > 0.5;
  const cv::Point2d elbow_left = up(-0.255, 1.13), hand_left = up(-0.10, 1.16);
  const cv::Point2d elbow_right = raised ? up(0.40, 1.40) : up(0.265, 1.13), hand_right = raised ? up(0.64, 1.52) : up(0.10, 1.14);
  if (!raised) draw_script(canvas, up(0.0, 1.20), random);
  const auto arm = [&](cv::Point2d shoulder, cv::Point2d elbow, cv::Point2d hand) {
    canvas.fill_limb(shoulder, 0.067, elbow, 0.056, look.jacket, {2, 0});
    canvas.fill_limb(elbow, 0.056, hand, 0.044, scaled(look.jacket, 1.2), {2, 0});
    fold(canvas, shoulder, elbow, 0.05, 18, look.jacket, random);
    fold(canvas, elbow, hand, 0.04, 18, scaled(look.jacket, 1.15), random);
    const cv::Point2d reach = (hand - elbow) / std::hypot((hand - elbow).x, (hand - elbow).y);
    canvas.fill_limb(hand, 0.034, hand + 0.05 * reach, 0.030, look.skin);
    for (int finger = -1; finger <= 2; ++finger)
      line(canvas, hand + 0.05 * reach, hand + 0.10 * reach + 0.018 * (finger - 0.5) * cv::Point2d(-reach.y, reach.x), 0.014, scaled(look.skin, 0.95));
  };
  arm(up(-0.175, 1.42), elbow_left, hand_left);
  arm(up(0.175, 1.42), elbow_right, hand_right);
  if (raised) draw_script(canvas, up(-0.08, 1.12), random);
  Random cloth = random.branch(3);
  weave(canvas.picture(), 0.6, 0.10, cloth);
  return canvas.picture();
}

cv::Mat stand_picture(double texel_m) {
  Canvas canvas = metre_canvas(0.5, 1.7, texel_m);
  const Light steel{0.12f, 0.12f, 0.13f}, bright{0.45f, 0.45f, 0.47f};
  line(canvas, {0.25, 1.62}, {0.25, 0.45}, 0.022, steel);
  line(canvas, {0.246, 1.62}, {0.246, 0.45}, 0.005, bright);
  line(canvas, {0.25, 1.45}, {0.02, 1.68}, 0.018, steel);
  line(canvas, {0.25, 1.45}, {0.48, 1.68}, 0.018, steel);
  line(canvas, {0.25, 0.47}, {0.29, 0.22}, 0.016, steel);
  canvas.fill_disc({0.25, 0.47}, 0.022, bright);
  canvas.fill_limb({0.285, 0.25}, 0.016, {0.30, 0.14}, 0.022, {0.04f, 0.04f, 0.045f});
  canvas.fill_disc({0.302, 0.105}, 0.033, {0.18f, 0.18f, 0.19f});
  canvas.set_only_where_painted(true);
  for (int i = -6; i <= 6; ++i) {
    line(canvas, {0.302 + 0.006 * i, 0.06}, {0.302 + 0.006 * i, 0.15}, 0.0015, {0.02f, 0.02f, 0.02f});
    line(canvas, {0.26, 0.105 + 0.006 * i}, {0.35, 0.105 + 0.006 * i}, 0.0015, {0.5f, 0.5f, 0.52f});
  }
  canvas.set_only_where_painted(false);
  return canvas.picture();
}

cv::Mat curtain_picture(double texel_m, double width_m, double height_m, std::uint64_t random_key) {
  Random random(random_key);
  Canvas canvas = metre_canvas(width_m, height_m, texel_m);
  cv::Mat& picture = canvas.picture();
  double phase = 0, pace = 6;
  std::vector<float> folds(static_cast<std::size_t>(picture.cols));
  for (float& value : folds) {
    pace += 0.03 * random.normal();
    pace = std::clamp(pace, 3.5, 9.0);
    phase += 2 * kPi * texel_m * pace / 2;
    value = static_cast<float>(0.35 + 0.65 * std::pow(0.5 + 0.5 * std::sin(phase) * std::cos(0.37 * phase), 1.5));
  }
  for (int y = 0; y < picture.rows; ++y) {
    // Lit from below, darker above.
    const double t = static_cast<double>(y) / picture.rows, lit = 0.25 + 0.75 * t * t;
    for (int x = 0; x < picture.cols; ++x) {
      const auto f = static_cast<float>(lit) * folds[static_cast<std::size_t>(x)];
      picture.at<cv::Vec4f>(y, x) = {0.16f * f, 0.016f * f, 0.022f * f, 1};
    }
  }
  return picture;
}

cv::Mat lamps_picture(double texel_m, double width_m, double height_m, bool floods, std::uint64_t random_key) {
  Random random(random_key);
  Canvas canvas = metre_canvas(width_m, height_m, texel_m);
  line(canvas, {0, 0.30}, {width_m, 0.30}, 0.05, {0.03f, 0.03f, 0.03f});
  line(canvas, {0, 0.55}, {width_m, 0.55}, 0.05, {0.03f, 0.03f, 0.03f});
  for (double x = 0.1; x < width_m; x += 0.35) line(canvas, {x, 0.30}, {x + 0.17, 0.55}, 0.02, {0.03f, 0.03f, 0.03f});
  if (floods) {
    for (double x = 0.5; x < width_m; x += 0.95) {
      const cv::Point2d at(x + 0.1 * random.normal(), 0.85);
      canvas.fill_limb(at + cv::Point2d(0, -0.2), 0.11, at, 0.17, {0.015f, 0.015f, 0.015f});
      canvas.fill_disc(at, 0.14, {7.0f, 5.2f, 3.0f});
    }
    return canvas.picture();
  }
  // A string of small bulbs that sags between the hooks.
  for (double x = 0; x < width_m; x += 0.11) {
    const double sag = 1.35 + 0.22 * std::pow(std::sin(kPi * x / 1.4), 2);
    canvas.fill_disc({x, sag}, 0.012, {11.0f, 8.0f, 4.0f});
  }
  return canvas.picture();
}

cv::Mat boards_picture(std::uint64_t random_key) {
  Random random(random_key);
  constexpr int kWidth = 2048, kLength = 1024, kBoards = 16;
  Canvas canvas(cv::Size(kWidth, kLength), 4, 1);
  const double board = static_cast<double>(kWidth) / kBoards;
  for (int i = 0; i < kBoards; ++i) {
    const double x = i * board;
    const Light wood = varied({0.13f, 0.075f, 0.036f}, 0.3, random);
    const Points plank{{x, -9}, {x + board, -9}, {x + board, kLength + 9}, {x, kLength + 9}};
    canvas.fill_convex(plank, wood);
    // Grain along the board, and scratches across it.
    for (int k = 0; k < 34; ++k) {
      const double at = x + random.uniform(2, board - 2);
      line(canvas, {at, -5}, {at, kLength + 5}, random.log_uniform(0.5, 2.5), scaled(wood, random.log_uniform(0.6, 1.5)));
    }
    for (int k = 0; k < 60; ++k) {
      const cv::Point2d at(x + random.uniform(2, board - 2), random.uniform(0, kLength));
      line(canvas, at, at + cv::Point2d(random.uniform(-16, 16), random.uniform(-9, 9)), random.uniform(0.6, 2), scaled(wood, random.log_uniform(0.5, 2.4)));
    }
    line(canvas, {x, -9}, {x, kLength + 9}, 5, {0.008f, 0.006f, 0.004f});
    const double joint = random.uniform(0, kLength);
    line(canvas, {x, joint}, {x + board, joint}, 3, {0.008f, 0.006f, 0.004f});
    for (const double side : {0.2, 0.8})
      for (const double by : {-14.0, 14.0}) canvas.fill_disc({x + side * board, joint + by}, 3.2, {0.01f, 0.01f, 0.01f});
  }
  return canvas.picture();
}

cv::Mat shadow_picture(double width_m, double depth_m, double texel_m, double darkness) {
  Canvas canvas = metre_canvas(width_m, depth_m, texel_m);
  cv::Mat& picture = canvas.picture();
  for (int y = 0; y < picture.rows; ++y) {
    for (int x = 0; x < picture.cols; ++x) {
      const double u = 2.0 * x / picture.cols - 1, v = 2.0 * y / picture.rows - 1;
      const double alpha = darkness * std::exp(-3.0 * (u * u + v * v)) * std::max(0.0, 1 - u * u) * std::max(0.0, 1 - v * v);
      picture.at<cv::Vec4f>(y, x) = {0, 0, 0, static_cast<float>(alpha)};
    }
  }
  return picture;
}

cv::Mat gravel_picture(int side, std::uint64_t random_key) {
  Random random(random_key);
  Canvas canvas(cv::Size(side, side), 4, 1);
  canvas.clear({0.05f, 0.045f, 0.04f});
  const double smallest = 9, largest = 80;
  double area = 4.5 * side * side;
  while (area > 0) {
    const double u = random.uniform(), a = 1 / (smallest * smallest), b = 1 / (largest * largest);
    const double radius = 1 / std::sqrt(a - u * (a - b)), squash = random.uniform(0.6, 1), turn = random.uniform(0, 2 * kPi);
    const cv::Point2d centre(random.uniform(0, side), random.uniform(0, side));
    const int corners = 9 + random.below(5);
    Points stone;
    for (int i = 0; i < corners; ++i) {
      const double angle = 2 * kPi * (i + random.uniform(-0.3, 0.3)) / corners;
      const double x = radius * std::cos(angle), y = radius * squash * std::sin(angle);
      stone.emplace_back(x * std::cos(turn) - y * std::sin(turn), x * std::sin(turn) + y * std::cos(turn));
    }
    const double tone = random.uniform();
    const Light light = varied(tone < 0.6 ? Light{0.20f, 0.185f, 0.165f} : tone < 0.85 ? Light{0.30f, 0.24f, 0.17f} : Light{0.12f, 0.125f, 0.135f}, 0.28, random);
    // Painted again over the border, so that the texture repeats without a seam.
    for (int wrap_x = -1; wrap_x <= 1; ++wrap_x) {
      for (int wrap_y = -1; wrap_y <= 1; ++wrap_y) {
        const cv::Point2d at = centre + cv::Point2d(wrap_x * side, wrap_y * side);
        if (at.x < -2 * radius || at.y < -2 * radius || at.x > side + 2 * radius || at.y > side + 2 * radius) continue;
        Points placed, shadow;
        for (const auto& p : stone) {
          placed.push_back(at + p);
          shadow.push_back(at + p + cv::Point2d(0.2 * radius, 0.24 * radius));
        }
        canvas.fill_convex(shadow, {0.014f, 0.013f, 0.012f});
        canvas.fill_convex(placed, light, {-0.4 / radius, -0.5 / radius});
      }
    }
    area -= 2.3 * squash * radius * radius;
  }
  Random grain = random.branch(4);
  weave(canvas.picture(), 0.5, 0.10, grain);
  return canvas.picture();
}

cv::Mat card_picture(double texel_m) {
  Random random(17);
  Canvas canvas = metre_canvas(0.30, 0.42, texel_m);
  canvas.clear({0.58f, 0.57f, 0.53f});
  const Light ink{0.025f, 0.025f, 0.03f}, red{0.45f, 0.04f, 0.03f};
  for (const auto& [a, b] : {std::pair{cv::Point2d(0.012, 0.012), cv::Point2d(0.288, 0.012)}, std::pair{cv::Point2d(0.288, 0.012), cv::Point2d(0.288, 0.408)},
                             std::pair{cv::Point2d(0.288, 0.408), cv::Point2d(0.012, 0.408)}, std::pair{cv::Point2d(0.012, 0.408), cv::Point2d(0.012, 0.012)}})
    line(canvas, a, b, 0.004, ink);
  strokes(canvas, "12", {0.05, 0.04}, 0.085, 0.014, ink);
  canvas.fill_disc({0.240, 0.065}, 0.026, red);
  canvas.fill_disc({0.240, 0.065}, 0.016, {0.58f, 0.57f, 0.53f});
  for (int row = 0; row < 11; ++row) {
    cv::Point2d at(0.04, 0.165 + 0.0215 * row);
    while (at.x < (row % 5 == 4 ? 0.16 : 0.25)) {
      const double word = random.uniform(0.010, 0.034);
      line(canvas, at, at + cv::Point2d(word, 0), 0.0062, ink);
      at.x += word + 0.012;
    }
  }
  return canvas.picture();
}

cv::Mat washers_picture(double texel_m, double width_m, double height_m, std::uint64_t random_key) {
  Random random(random_key);
  Canvas canvas = metre_canvas(width_m, height_m, texel_m);
  canvas.clear({0.05f, 0.05f, 0.055f});
  for (int i = 0; i < 4000; ++i) {
    const cv::Point2d at(random.uniform(0, width_m), random.uniform(0, height_m));
    canvas.fill_disc(at, random.log_uniform(0.00008, 0.0005), varied({0.06f, 0.058f, 0.055f}, 0.5, random));
  }
  for (int i = 0; i < 34; ++i) {
    const cv::Point2d at(random.uniform(0, width_m), random.uniform(0, height_m));
    const double radius = random.uniform(0.0014, 0.0034), hole = radius * random.uniform(0.4, 0.6);
    const Light metal = varied({0.36f, 0.35f, 0.32f}, 0.3, random);
    canvas.fill_disc(at + cv::Point2d(0.00025, 0.0003), radius, {0.008f, 0.008f, 0.008f});
    canvas.fill_disc(at, radius, scaled(metal, 1.35));
    canvas.fill_disc(at, radius * 0.95, metal);
    for (int k = 0; k < 26; ++k) {
      const double angle = random.uniform(0, 2 * kPi), r = random.uniform(hole + 0.0004, radius - 0.0005);
      const cv::Point2d p = at + r * cv::Point2d(std::cos(angle), std::sin(angle));
      line(canvas, p, p + 0.0002 * cv::Point2d(random.normal(), random.normal()), 0.00004, scaled(metal, random.log_uniform(0.6, 1.6)));
    }
    canvas.fill_disc(at, hole, {0.012f, 0.012f, 0.012f});
  }
  return canvas.picture();
}

}  // namespace focusfall::render
