#include <algorithm>
#include <cmath>
#include <map>
#include <numbers>

#include "tests/render/samples/art_tools.h"
#include "tests/render/scene.h"

namespace focusfall::render {
namespace {

constexpr double kPi = std::numbers::pi;

// A sail between three corners whose free edge bulges; drawn as a fan of convex slices with seams and creases.
struct Sail {
  cv::Point2d head, tack, clew;
  double bulge;  // of the edge head - clew, metres
};

Points outline(const Sail& sail) {
  Points points{sail.tack, sail.head};
  const cv::Point2d chord = sail.clew - sail.head;
  const double length = std::hypot(chord.x, chord.y);
  const cv::Point2d out = cv::Point2d(chord.y, -chord.x) / length;
  const double side = (out.dot(sail.tack - sail.head) < 0) ? 1 : -1;
  for (int i = 1; i < 16; ++i) {
    const double t = i / 16.0;
    points.push_back(sail.head + t * chord + side * sail.bulge * std::sin(kPi * t) * out);
  }
  points.push_back(sail.clew);
  return points;
}

void draw_sail(Canvas& canvas, const Sail& sail, const Light& cloth, Random& random) {
  canvas.fill_convex(outline(sail), cloth, {-0.10, 0.015});
  canvas.set_only_where_painted(true);
  // Seams of the panels, in double stitching, and battens.
  for (int i = 1; i < 9; ++i) {
    const double t = i / 9.0;
    const cv::Point2d luff = sail.head + t * (sail.tack - sail.head);
    const cv::Point2d leech = sail.head + t * (sail.clew - sail.head) + cv::Point2d(0, 0.10 * t);
    const cv::Point2d beyond = leech + 0.25 * (leech - luff);
    line(canvas, luff, beyond, 0.012, scaled(cloth, 0.80));
    line(canvas, luff + cv::Point2d(0, 0.022), beyond + cv::Point2d(0, 0.022), 0.006, scaled(cloth, 0.72));
    if (i % 2 == 0) line(canvas, leech + 0.5 * (luff - leech), beyond, 0.05, scaled(cloth, 1.10));
  }
  // Creases from the corners.
  for (int i = 0; i < 26; ++i) {
    const cv::Point2d from = i % 3 == 0 ? sail.tack : i % 3 == 1 ? sail.clew : sail.head;
    const cv::Point2d middle = (sail.tack + sail.clew + sail.head) / 3.0;
    const cv::Point2d to = from + random.uniform(0.15, 0.7) * (middle + cv::Point2d(0.5 * random.normal(), 0.5 * random.normal()) - from);
    line(canvas, from, to, random.uniform(0.006, 0.03), scaled(cloth, random.uniform(0.86, 1.06)));
  }
  canvas.set_only_where_painted(false);
}

void draw_sailor(Canvas& canvas, cv::Point2d seat, double lean, const Light& jacket, Random& random) {
  const Light skin{0.42f, 0.25f, 0.17f}, cap{0.72f, 0.70f, 0.64f};
  const cv::Point2d shoulder = seat + cv::Point2d(lean, -0.52), head = shoulder + cv::Point2d(0.5 * lean, -0.20);
  line(canvas, seat, seat + cv::Point2d(0.38, 0.05), 0.17, {0.03f, 0.035f, 0.05f});
  canvas.fill_limb(seat, 0.15, shoulder, 0.17, jacket, {-0.9, -0.3});
  canvas.set_only_where_painted(true);
  for (int i = 0; i < 12; ++i) {
    const cv::Point2d at = seat + random.uniform() * (shoulder - seat);
    line(canvas, at + cv::Point2d(-0.15, random.uniform(-0.05, 0.05)), at + cv::Point2d(0.15, random.uniform(-0.05, 0.05)),
         random.uniform(0.004, 0.014), scaled(jacket, random.uniform(0.55, 1.4)));
  }
  canvas.set_only_where_painted(false);
  const Light vest{0.85f, 0.55f, 0.02f};
  canvas.fill_limb(seat + 0.35 * (shoulder - seat), 0.155, shoulder - cv::Point2d(0, -0.06), 0.15, vest, {-0.9, -0.3});
  line(canvas, seat + 0.6 * (shoulder - seat) - cv::Point2d(0.15, 0), seat + 0.6 * (shoulder - seat) + cv::Point2d(0.15, 0), 0.025, {0.03f, 0.03f, 0.03f});
  const cv::Point2d hand = seat + cv::Point2d(0.48, -0.22);
  canvas.fill_limb(shoulder + cv::Point2d(0.05, 0.06), 0.065, hand, 0.045, scaled(jacket, 1.15), {-0.8, 0});
  canvas.fill_disc(hand, 0.05, skin);
  canvas.fill_limb(head, 0.10, head + cv::Point2d(0.01, 0.06), 0.09, skin, {-1.5, 0});
  canvas.fill_limb(head + cv::Point2d(-0.02, -0.06), 0.10, head + cv::Point2d(0.03, -0.06), 0.095, cap);
  line(canvas, head + cv::Point2d(0.04, -0.03), head + cv::Point2d(0.17, -0.015), 0.025, scaled(cap, 0.6));
}

}  // namespace

void strokes(Canvas& canvas, const std::string& text, cv::Point2d top_left, double height, double width, const Light& light) {
  // Seven strokes: top, upper left, upper right, middle, lower left, lower right, bottom.
  static const std::map<char, int> kShapes{{'0', 0x77}, {'1', 0x24}, {'2', 0x5D}, {'3', 0x6D}, {'4', 0x2E}, {'5', 0x6B},
                                           {'6', 0x7B}, {'7', 0x25}, {'8', 0x7F}, {'9', 0x6F}};
  const double w = 0.5 * height;
  cv::Point2d at = top_left;
  for (const char c : text) {
    const auto found = kShapes.find(c);
    const int shape = found == kShapes.end() ? 0 : found->second;
    const cv::Point2d a = at, b = at + cv::Point2d(w, 0), m = at + cv::Point2d(0, height / 2), n = m + cv::Point2d(w, 0),
                      e = at + cv::Point2d(0, height), f = e + cv::Point2d(w, 0);
    const std::array<std::pair<cv::Point2d, cv::Point2d>, 7> lines{{{a, b}, {a, m}, {b, n}, {m, n}, {m, e}, {n, f}, {e, f}}};
    for (std::size_t i = 0; i < 7; ++i)
      if (shape >> i & 1) line(canvas, lines[i].first, lines[i].second, width, light);
    at.x += w + 0.35 * height;
  }
}

void weave(cv::Mat& picture, double exponent, double strength, Random& random) {
  const int side = 512;
  cv::Mat field = power_law_field(side, exponent, random);
  for (int y = 0; y < picture.rows; ++y) {
    auto* texel = picture.ptr<cv::Vec4f>(y);
    const auto* f = field.ptr<float>(y % side);
    for (int x = 0; x < picture.cols; ++x) {
      const float factor = static_cast<float>(std::exp(strength * static_cast<double>(f[x % side])));
      for (int i = 0; i < 3; ++i) texel[x][i] *= factor;
    }
  }
}

cv::Mat boat_picture(const BoatLook& look) {
  Random random(look.random_key);
  // Drawn upright on a larger board, then heeled about the waterline and cut there.
  const double width = kBoatWidth, height = kBoatHeight, draught = 0.5;
  Canvas canvas = metre_canvas(width, height + draught, look.texel_m);
  const double water = height;
  const auto up = [&](double x, double y) { return cv::Point2d(x, water - y); };
  const Light cloth{0.66f, 0.66f, 0.63f}, metal{0.32f, 0.33f, 0.35f}, rope{0.05f, 0.05f, 0.05f};
  const double mast_x = 3.05;
  // Jib behind, main sail before it, then mast and boom.
  draw_sail(canvas, {up(mast_x + 0.06, 4.9), up(4.85, 0.62), up(mast_x + 0.15, 0.75), 0.05}, scaled(cloth, 0.92), random);
  if (look.spinnaker[0] + look.spinnaker[1] + look.spinnaker[2] > 0)
    draw_sail(canvas, {up(mast_x + 0.1, 5.2), up(5.2, 1.1), up(mast_x + 0.4, 0.9), 0.3}, look.spinnaker, random);
  draw_sail(canvas, {up(mast_x - 0.05, 6.45), up(mast_x - 0.05, 1.05), up(mast_x - 2.35, 1.0), 0.28}, cloth, random);
  strokes(canvas, look.number, up(mast_x - 1.05, 3.95), 0.38, 0.075, {0.02f, 0.03f, 0.10f});
  canvas.fill_disc(up(mast_x - 0.62, 4.45), 0.17, look.stripe);
  canvas.fill_disc(up(mast_x - 0.62, 4.45), 0.10, cloth);
  canvas.fill_limb(up(mast_x, 0.4), 0.045, up(mast_x, 6.55), 0.03, metal, {-6, 0});
  canvas.fill_limb(up(mast_x, 1.0), 0.035, up(mast_x - 2.45, 0.96), 0.03, metal);
  for (const auto& [a, b] : {std::pair{up(mast_x, 4.95), up(4.98, 0.55)}, std::pair{up(mast_x, 4.7), up(mast_x - 0.35, 0.5)},
                             std::pair{up(mast_x - 2.2, 0.96), up(1.3, 0.55)}})
    line(canvas, a, b, 0.012, rope);
  // Crew, then the hull before them.
  draw_sailor(canvas, up(1.55, 0.58), -0.16, look.jacket, random);
  draw_sailor(canvas, up(2.35, 0.56), -0.10, varied(look.jacket, 0.5, random), random);
  const Points hull{up(0.55, 0.52), up(5.0, 0.60), up(4.62, 0.02), up(4.2, -0.25), up(0.9, -0.25), up(0.62, 0.05)};
  canvas.fill_convex(hull, look.hull, {0.02, -0.7});
  canvas.set_only_where_painted(true);
  line(canvas, up(0.5, 0.36), up(5.1, 0.44), 0.07, look.stripe);
  line(canvas, up(0.5, 0.52), up(5.1, 0.60), 0.045, scaled(look.stripe, 2));
  strokes(canvas, look.number, up(4.0, 0.33), 0.16, 0.03, look.stripe);
  for (int i = 0; i < 40; ++i) {
    const double x = random.uniform(0.7, 4.7), y = random.uniform(0.0, 0.3);
    line(canvas, up(x, y), up(x + random.uniform(0.02, 0.3), y + 0.01 * random.normal()), 0.006, scaled(look.hull, random.uniform(0.6, 0.95)));
  }
  line(canvas, up(0.4, 0.06), up(5.0, 0.06), 0.05, {0.05f, 0.04f, 0.03f});
  canvas.set_only_where_painted(false);
  Random cloth_random = random.branch(5);
  weave(canvas.picture(), 1.0, 0.03, cloth_random);
  cv::Mat heeled;
  const cv::Point2f pivot(static_cast<float>(2.7 / look.texel_m), static_cast<float>(water / look.texel_m));
  cv::warpAffine(canvas.picture(), heeled, cv::getRotationMatrix2D(pivot, -look.heel_deg, 1), canvas.picture().size(), cv::INTER_LINEAR);
  return heeled.rowRange(0, static_cast<int>(water / look.texel_m)).clone();
}

cv::Mat reflection_of(const cv::Mat& boat, int divisor, std::uint64_t random_key) {
  Random random(random_key);
  cv::Mat small, mirrored;
  cv::resize(boat, small, {boat.cols / divisor, boat.rows / divisor / 2}, 0, 0, cv::INTER_AREA);
  cv::flip(small, mirrored, 0);
  cv::Mat out(mirrored.size(), CV_32FC4, cv::Scalar::all(0));
  double phase = 0, shift = 0;
  for (int y = 0; y < out.rows; ++y) {
    phase += random.uniform(0.02, 0.5);
    shift = 0.8 * shift + 0.05 * y * random.normal() / std::sqrt(1.0 + y * 0.02);
    const int dx = static_cast<int>(shift + (2 + 0.02 * y) * std::sin(phase));
    // The mirror image breaks up away from the boat.
    const double strength = 0.42 * std::exp(-2.5 * y / out.rows) * (random.uniform() < 0.85 ? 1 : 0.4);
    for (int x = 0; x < out.cols; ++x) {
      const int from = x + dx;
      if (from >= 0 && from < out.cols) out.at<cv::Vec4f>(y, x) = mirrored.at<cv::Vec4f>(y, from) * static_cast<float>(strength);
    }
  }
  return out;
}

cv::Mat buoy_picture(double texel_m) {
  Canvas canvas = metre_canvas(1.3, 2.2, texel_m);
  const Light orange{0.85f, 0.20f, 0.015f}, white{0.7f, 0.7f, 0.66f};
  canvas.fill_limb({0.65, 2.3}, 0.52, {0.65, 1.25}, 0.42, orange, {-1.0, -0.2});
  canvas.fill_limb({0.65, 1.25}, 0.42, {0.65, 1.05}, 0.30, orange, {-1.0, -0.2});
  canvas.set_only_where_painted(true);
  for (int i = 0; i < 9; ++i)
    line(canvas, {0.65 + 0.11 * (i - 4), 0.8}, {0.65 + 0.135 * (i - 4), 2.3}, 0.012, scaled(orange, 0.6));
  line(canvas, {0, 1.52}, {1.3, 1.52}, 0.16, white);
  line(canvas, {0, 1.98}, {1.3, 1.98}, 0.10, white);
  strokes(canvas, "3", {0.55, 1.62}, 0.26, 0.05, {0.02f, 0.02f, 0.02f});
  canvas.set_only_where_painted(false);
  line(canvas, {0.65, 0.8}, {0.65, 0.1}, 0.03, {0.1f, 0.1f, 0.1f});
  const Points flag{{0.66, 0.12}, {1.2, 0.22}, {1.15, 0.45}, {0.66, 0.48}};
  canvas.fill_convex(flag, {0.75f, 0.6f, 0.02f}, {0.5, 0});
  canvas.set_only_where_painted(true);
  for (int i = 0; i < 3; ++i) line(canvas, {0.8 + 0.15 * i, 0.1}, {0.8 + 0.15 * i, 0.5}, 0.05, {0.02f, 0.02f, 0.02f});
  canvas.set_only_where_painted(false);
  return canvas.picture();
}

cv::Mat water_picture(double glint_share, std::uint64_t random_key) {
  Random random(random_key);
  constexpr int kSide = 2048;
  const Light deep{0.030f, 0.065f, 0.085f}, sky{0.20f, 0.29f, 0.36f};
  Canvas canvas(cv::Size(kSide, kSide), 4, 1);
  canvas.clear({0.075f, 0.13f, 0.16f});
  const auto lens = [&](double x, double y, double half, double thick, const Light& light) {
    for (const double wrap_x : {-1.0, 0.0, 1.0}) {
      for (const double wrap_y : {-1.0, 0.0, 1.0}) {
        const cv::Point2d c(x + wrap_x * kSide, y + wrap_y * kSide);
        if (c.x < -half || c.x > kSide + half || c.y < -half || c.y > kSide + half) continue;
        const Points shape{c + cv::Point2d(-half, 0), c + cv::Point2d(-half / 2, -0.8 * thick), c + cv::Point2d(half / 3, -thick),
                           c + cv::Point2d(half, 0.1 * thick), c + cv::Point2d(half / 3, 0.7 * thick), c + cv::Point2d(-half / 2, 0.6 * thick)};
        canvas.fill_convex(shape, light);
      }
    }
  };
  // Facets of the waves, from long swells to short ripples.
  for (int octave = 0; octave < 5; ++octave) {
    const double size = 300 / std::pow(1.8, octave);
    const int count = static_cast<int>(1.5 * kSide * kSide / (size * size * 0.6));
    for (int i = 0; i < count; ++i) {
      const double mix = (0.25 + 0.09 * octave) * (random.uniform() + random.uniform());
      Light light{};
      for (std::size_t k = 0; k < 3; ++k)
        light[k] = static_cast<float>((1 - mix) * static_cast<double>(deep[k]) + mix * static_cast<double>(sky[k]));
      const double half = size * random.uniform(0.5, 1.3) / 2;
      lens(random.uniform(0, kSide), random.uniform(0, kSide), half, half * random.uniform(0.10, 0.26), light);
    }
  }
  const int glints = static_cast<int>(glint_share * 2500);
  for (int i = 0; i < glints; ++i) {
    const double half = random.log_uniform(3, 12), level = random.log_uniform(0.8, 12);
    const auto l = static_cast<float>(level);
    lens(random.uniform(0, kSide), random.uniform(0, kSide), half, half * random.uniform(0.2, 0.5), {l, 0.97f * l, 0.86f * l});
  }
  return canvas.picture();
}

cv::Mat shore_picture(double texel_m, double width_m, double height_m, std::uint64_t random_key) {
  Random random(random_key);
  Canvas canvas = metre_canvas(width_m, height_m, texel_m);
  // Sky, brighter towards the hills.
  for (int y = 0; y < canvas.picture().rows; ++y) {
    const double t = std::min(1.0, y * texel_m / height_m);
    for (int x = 0; x < canvas.picture().cols; ++x)
      canvas.picture().at<cv::Vec4f>(y, x) = {static_cast<float>(0.30 + 0.30 * t), static_cast<float>(0.45 + 0.22 * t), static_cast<float>(0.68 + 0.08 * t), 1};
  }
  const auto ridge = [&](double base, double relief, const Light& light, double wave) {
    const double phase = random.uniform(0, 6);
    const double step = width_m / 160;
    for (double x = -step; x < width_m + step; x += step) {
      const auto top = [&](double at) { return height_m - base - relief * (0.5 + 0.3 * std::sin(at / wave + phase) + 0.2 * std::sin(2.7 * at / wave + 2 * phase)); };
      const Points slice{{x, top(x)}, {x + 1.4 * step, top(x + 1.4 * step)}, {x + 1.4 * step, height_m}, {x, height_m}};
      canvas.fill_convex(slice, light);
    }
  };
  ridge(height_m * 0.30, height_m * 0.20, {0.22f, 0.32f, 0.42f}, width_m / 9);
  ridge(height_m * 0.20, height_m * 0.14, {0.10f, 0.17f, 0.16f}, width_m / 14);
  const auto crowns = [&](double bottom, double top, int count, double size, const Light& green) {
    for (int i = 0; i < count; ++i) {
      const double t = static_cast<double>(i) / count;
      const cv::Point2d at(random.uniform(0, width_m), height_m - (top + (bottom - top) * t) + 0.3 * size * random.normal());
      const Light light = varied(scaled(green, 0.8 + 0.5 * random.uniform()), 0.18, random);
      canvas.fill_disc(at, size * random.log_uniform(0.35, 1), light);
      for (int k = 0; k < 6; ++k)
        canvas.fill_disc(at + size * cv::Point2d(0.5 * random.normal(), 0.4 * random.normal() - 0.2), size * random.uniform(0.08, 0.25), varied(light, 0.35, random));
    }
  };
  crowns(height_m * 0.10, height_m * 0.24, static_cast<int>(width_m * 1.4), height_m * 0.05, {0.045f, 0.085f, 0.025f});
  for (int i = 0; i < static_cast<int>(width_m / 14); ++i) {
    const double x = random.uniform(0, width_m), w = height_m * random.uniform(0.08, 0.13), y = height_m * random.uniform(0.86, 0.92), h = height_m * 0.085;
    const Points wall{{x, y - h}, {x + w, y - h}, {x + w, y}, {x, y}}, roof{{x - 0.1 * w, y - h}, {x + 0.5 * w, y - 1.7 * h}, {x + 1.1 * w, y - h}};
    canvas.fill_convex(wall, varied({0.62f, 0.58f, 0.5f}, 0.12, random));
    canvas.fill_convex(roof, varied({0.26f, 0.10f, 0.06f}, 0.2, random));
    for (int k = 0; k < 3; ++k) {
      const Points pane{{x + w * (0.15 + 0.27 * k), y - 0.75 * h}, {x + w * (0.28 + 0.27 * k), y - 0.75 * h}, {x + w * (0.28 + 0.27 * k), y - 0.35 * h}, {x + w * (0.15 + 0.27 * k), y - 0.35 * h}};
      canvas.fill_convex(pane, {0.03f, 0.035f, 0.04f});
    }
  }
  crowns(0, height_m * 0.11, static_cast<int>(width_m * 2.2), height_m * 0.035, {0.06f, 0.11f, 0.03f});
  for (int i = 0; i < static_cast<int>(width_m * 6); ++i) {
    const double x = random.uniform(0, width_m), h = height_m * random.uniform(0.02, 0.06);
    line(canvas, {x, height_m}, {x + 0.2 * h * random.normal(), height_m - h}, height_m * 0.004, varied({0.20f, 0.19f, 0.07f}, 0.3, random));
  }
  return canvas.picture();
}

}  // namespace focusfall::render
