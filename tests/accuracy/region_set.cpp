// Blur of a region against the truth: bias, scatter, coverage and width of the interval by texture and blur.
#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>

#include "tests/accuracy/scoring.h"
#include "tests/render/tile.h"

namespace focusfall::accuracy {
namespace {

using render::Texture;

constexpr double kDiscs[] = {3, 4, 5.5, 8, 12, 17, 23, 30};
constexpr double kIso[] = {100, 1600, 6400};
constexpr int kSurrounding = 48;   // px of picture around the tile, as a region of a frame has

struct Case {
  Texture texture = Texture::flat;
  double disc = 0;
  render::TileSpec spec;
};

struct Reading {
  bool number = false;
  bool bound = false;
  double disc = 0, low = 0, high = 0;
};

// Tile of at least 128 px and 6 c, everything else at random by the key.
render::TileSpec spec_of(Texture texture, double disc, double iso, std::uint64_t key) {
  render::Random random(key);
  render::TileSpec spec;
  spec.size_px = std::max(128, static_cast<int>(std::ceil(6 * disc))) + 2 * kSurrounding;
  spec.texture = texture;
  spec.blur.disc_px = disc;
  spec.size_factor = random.log_uniform(0.8, 1.6);
  spec.exposure = random.uniform(0.6, 1.3);
  spec.contrast = random.uniform(0.6, 1);
  spec.edge_angle_deg = random.uniform(0, 360);
  spec.edge_low = random.uniform(0.04, 0.2);
  spec.edge_high = spec.edge_low * random.uniform(2, 4);
  spec.camera.iso_speed = iso;
  spec.camera.jpeg_quality = 85 + random.below(11);
  spec.random_key = key;
  return spec;
}

std::optional<BlurEstimate> estimate(const render::TileSpec& spec, FrameMeasurer& measurer) {
  const render::Picture picture = render::render_tile(spec);
  const int inner = spec.size_px - 2 * kSurrounding;
  MeasureRequest request = request_for({kSurrounding, kSurrounding, inner, inner}, picture.luma.size());
  request.whole_frame = false;
  request.keep_tiles = false;
  return measurer.measure({picture.luma, srgb_linear_of_code(256), picture.coding_step_codes}, request).aim_blur.estimate;
}

Reading measure(const render::TileSpec& spec, FrameMeasurer& measurer) {
  Reading reading;
  const std::optional<BlurEstimate> e = estimate(spec, measurer);
  if (!e) return reading;
  reading.bound = e->bound != Bound::none;
  reading.number = !reading.bound;
  reading.disc = blur_disc_px(e->squared_disc_px2);
  reading.low = blur_disc_px(e->squared_disc_low_px2);
  reading.high = blur_disc_px(e->squared_disc_high_px2);
  return reading;
}

// All that is said about a group of readings of known blur.
struct Group {
  int cases = 0, numbers = 0, bounds = 0, bounds_wrong = 0;
  std::vector<double> error_percent, width_of_allowed, covered;
  void add(double truth, const Reading& r) {
    ++cases;
    bounds += r.bound;
    if (r.bound && r.low > truth) ++bounds_wrong;
    if (!r.number) return;
    ++numbers;
    error_percent.push_back(100 * (r.disc - truth) / truth);
    covered.push_back(r.low <= truth && truth <= r.high ? 100 : 0);
    width_of_allowed.push_back((r.high - r.low) / (0.25 * truth + 0.8));
  }
};

void print_group(const std::string& name, const Group& g) {
  fmt::print("  {:<30} {:5} {:7.1f} {:7.1f} {:8.1f} {:8.1f} {:8.1f} {:9.2f}\n", name, g.cases,
             100.0 * g.numbers / std::max(1, g.cases), 100.0 * g.bounds / std::max(1, g.cases), median(g.error_percent),
             robust_deviation(g.error_percent), mean(g.covered), median(g.width_of_allowed));
}

void print_head(const std::string& title) {
  fmt::print("\n{}\n  {:<30} {:>5} {:>7} {:>7} {:>8} {:>8} {:>8} {:>9}\n", title, "", "n", "read %", "bound %", "bias %",
             "scatter %", "cover %", "width/lim");
}

bool is_main(Texture t) { return t == Texture::polygons || t == Texture::mixed || t == Texture::step_edges; }

// Share of tiles without any detail that give a number.
Figure run_flat(const SetOptions& options) {
  const int count = count_of(options, 600, 60);
  std::vector<int> gave(static_cast<std::size_t>(count));
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    render::Random random(first_key(options, 1) + static_cast<std::uint64_t>(i));
    const Texture texture = i % 2 == 0 ? Texture::flat : Texture::smooth;
    render::TileSpec spec = spec_of(texture, random.uniform(0, 8), kIso[i / 2 % 3], first_key(options, 1) + static_cast<std::uint64_t>(i));
    spec.edge_high = random.uniform(0.02, 0.95);
    const Reading reading = measure(spec, measurer);
    gave[static_cast<std::size_t>(i)] = reading.number || reading.bound;
    if (options.list && options.tuning && (reading.number || reading.bound))
      fmt::print(stderr, "{} level {:.2f} blur {:.1f} ISO {} JPEG {} key {}: {:.2f} [{:.2f} {:.2f}]\n", render::texture_name(texture), spec.edge_high, spec.blur.disc_px,
                 spec.camera.iso_speed, spec.camera.jpeg_quality, spec.random_key, reading.disc, reading.low, reading.high);
  });
  double share = 0;
  for (const int g : gave) share += 100.0 * g / count;
  return {"flat and smooth tiles that give a number", share, 1.5, true, "%", count};
}

// High ISO, noise reduction, sharpening, mosaic and halved chroma together: reported beside the targets.
void run_processed(const SetOptions& options) {
  const int repeats = count_of(options, 8, 1);
  const Texture textures[] = {Texture::polygons, Texture::mixed, Texture::dead_leaves};
  const int discs = std::size(kDiscs), count = 3 * discs * repeats;
  std::vector<Reading> readings(static_cast<std::size_t>(count));
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    render::TileSpec spec = spec_of(textures[i % 3], kDiscs[i / 3 % discs], 12800, first_key(options, 2) + static_cast<std::uint64_t>(i));
    spec.colour = 0.5;
    spec.camera.mosaic = true;
    spec.camera.noise_reduction = 1;
    spec.camera.sharpening = 0.5;
    spec.camera.chroma = render::ChromaSampling::half;
    readings[static_cast<std::size_t>(i)] = measure(spec, measurer);
  });
  print_head("ISO 12,800, Bayer mosaic, noise reduction, sharpening, 4:2:0 (no target; no baseline taken off)");
  std::map<double, Group> groups;
  for (int i = 0; i < count; ++i) groups[kDiscs[i / 3 % discs]].add(kDiscs[i / 3 % discs], readings[static_cast<std::size_t>(i)]);
  for (const auto& [disc, group] : groups) print_group(fmt::format("c {:g} px", disc), group);
}

// Below 3 px relative figures mean little: what S reads, in px^2, for a lens that is all but perfect. No target of its
// own; an acceptable blur of 2 px is S = 4.
void run_sharp(const SetOptions& options) {
  const Texture textures[] = {Texture::polygons, Texture::mixed, Texture::step_edges, Texture::dead_leaves};
  constexpr double kSmall[] = {0, 0.8, 1.6, 2.4};
  const int repeats = count_of(options, 12, 2), count = 16 * repeats;
  std::vector<double> squared(static_cast<std::size_t>(count), 1e9);
  std::vector<char> covered(squared.size());
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    const double disc = kSmall[i / 4 % 4];
    const auto k = static_cast<std::size_t>(i);
    const render::TileSpec spec = spec_of(textures[i % 4], disc, kIso[i / 16 % 3], first_key(options, 8) + k);
    const std::optional<BlurEstimate> e = estimate(spec, measurer);
    if (!e) return;
    squared[k] = e->squared_disc_px2;
    covered[k] = e->squared_disc_low_px2 <= disc * disc && disc * disc <= e->squared_disc_high_px2;
  });
  fmt::print("\nSharp content, tiles of 128 px: S in px^2\n  {:<26} {:>4} {:>8} {:>9} {:>9} {:>8}\n", "", "n", "true S", "median S", "scatter", "cover %");
  for (int t = 0; t < 4; ++t) {
    for (int d = 0; d < 4; ++d) {
      std::vector<double> values, inside;
      for (int i = 0; i < count; ++i) {
        const auto k = static_cast<std::size_t>(i);
        if (i % 4 != t || i / 4 % 4 != d || squared[k] > 1e8) continue;
        values.push_back(squared[k]);
        inside.push_back(covered[k] ? 100 : 0);
      }
      fmt::print("  {:<26} {:4} {:8.2f} {:9.2f} {:9.2f} {:8.0f}\n", fmt::format("{} c {:g}", render::texture_name(textures[t]), kSmall[d]), values.size(),
                 kSmall[d] * kSmall[d], median(values), robust_deviation(values), mean(inside));
    }
  }
}

}  // namespace

std::vector<Figure> run_regions(const SetOptions& options) {
  const Texture textures[] = {Texture::polygons, Texture::mixed, Texture::step_edges, Texture::dead_leaves, Texture::gravel, Texture::grass};
  const int repeats = count_of(options, 5, 1), discs = std::size(kDiscs), isos = std::size(kIso), kinds = std::size(textures);
  const int count = kinds * discs * isos * repeats;
  std::vector<Case> cases(static_cast<std::size_t>(count));
  std::vector<Reading> readings(cases.size());
  for_each_case(count, [&](int i, FrameMeasurer& measurer) {
    Case& c = cases[static_cast<std::size_t>(i)];
    c.texture = textures[i % kinds];
    c.disc = kDiscs[i / kinds % discs];
    c.spec = spec_of(c.texture, c.disc, kIso[i / kinds / discs % isos], first_key(options, 0) + static_cast<std::uint64_t>(i));
    readings[static_cast<std::size_t>(i)] = measure(c.spec, measurer);
  });
  std::map<std::pair<int, double>, Group> by_texture_and_disc;
  std::map<int, Group> by_texture;
  std::map<double, Group> main_by_iso, main_by_disc;
  Group all_main;
  for (std::size_t i = 0; i < cases.size(); ++i) {
    const Case& c = cases[i];
    if (options.list && options.tuning)
      fmt::print(stderr, "{} c {} ISO {} key {}: {} {:.2f} [{:.2f} {:.2f}]\n", render::texture_name(c.texture), c.disc, c.spec.camera.iso_speed,
                 c.spec.random_key, readings[i].number ? "number" : readings[i].bound ? "bound" : "none", readings[i].disc, readings[i].low, readings[i].high);
    by_texture_and_disc[{static_cast<int>(c.texture), c.disc}].add(c.disc, readings[i]);
    by_texture[static_cast<int>(c.texture)].add(c.disc, readings[i]);
    if (!is_main(c.texture)) continue;
    main_by_iso[c.spec.camera.iso_speed].add(c.disc, readings[i]);
    main_by_disc[c.disc].add(c.disc, readings[i]);
    all_main.add(c.disc, readings[i]);
  }
  print_head("Region blur, tile of max(128 px, 6 c), ISO 100, 1600 and 6400, JPEG 85-95");
  for (const auto& [key, group] : by_texture_and_disc)
    print_group(fmt::format("{} c {:g}", render::texture_name(static_cast<Texture>(key.first)), key.second), group);
  print_head("... all c");
  for (const auto& [key, group] : by_texture) print_group(render::texture_name(static_cast<Texture>(key)), group);
  print_head("... step and mixed content (polygons, mixed, step edges)");
  for (const auto& [iso, group] : main_by_iso) print_group(fmt::format("ISO {:g}", iso), group);
  for (const auto& [disc, group] : main_by_disc) print_group(fmt::format("c {:g} px", disc), group);
  print_group("together", all_main);
  run_sharp(options);
  run_processed(options);
  // The worst c speaks for bias and scatter, all of them together for the interval.
  double worst_bias = 0, worst_scatter = 0;
  for (const auto& [disc, group] : main_by_disc) {
    worst_bias = std::max(worst_bias, std::abs(median(group.error_percent)));
    worst_scatter = std::max(worst_scatter, robust_deviation(group.error_percent));
  }
  const int n = all_main.numbers;
  return {{"region blur: |bias|, all c together", std::abs(median(all_main.error_percent)), 5, true, "%", n},
          {"region blur: |bias|, worst c", worst_bias, 5, true, "%", n},
          {"region blur: scatter, all c together", robust_deviation(all_main.error_percent), 8, true, "%", n},
          {"region blur: scatter, worst c", worst_scatter, 8, true, "%", n},
          {"region blur: 95 % interval covers, at least", mean(all_main.covered), 92, false, "%", n},
          {"region blur: 95 % interval covers, at most", mean(all_main.covered), 98, true, "%", n},
          {"region blur: median width / (25 % of c + .8 px)", median(all_main.width_of_allowed), 1, true, "", n},
          run_flat(options)};
}

}  // namespace focusfall::accuracy
