// The signed blur on the ground: side, position, slope.
#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <map>

#include "analysis/measure/plane.h"
#include "tests/accuracy/scenes.h"
#include "tests/accuracy/scoring.h"

namespace focusfall::accuracy {
namespace {

// A side is called as measurement.md's cause rule does: |l| > 2.5 sqrt(sigma^2 + .15^2) and the slope stands out.
// and the aim is as blurred as the ground at the contact, | |l| - c | < 2 sigma.
constexpr double kCallSigmas = 2.5, kCallFloorPx = 0.08, kSlopeSigmas = 3, kAgreeSigmas = 2;
constexpr double kBaselineOfPlanePx2 = 1;  // what the line of best focus leaves open

struct Reading {
  bool fitted = false, at_contact = false, called = false, wrong = false, covered = false;
  double error_px = 0, slope_error_percent = 0;
};

struct Case {
  SceneSpec spec;
  std::string group;
};

bool agrees(const Measurement& m, double sigma_px) {
  if (!m.aim_blur.estimate || m.aim_blur.estimate->bound != Bound::none) return false;
  const BlurEstimate& aim = *m.aim_blur.estimate;
  const double excess = std::max(aim.squared_disc_px2 - m.plane->residual_squared_disc_px2, 0.0), disc = std::sqrt(excess);
  const double sigma_square = std::hypot((aim.squared_disc_high_px2 - aim.squared_disc_low_px2) / 4, kBaselineOfPlanePx2);
  const double sigma_disc = sigma_square / (2 * std::max(disc, std::sqrt(sigma_square) / 2));
  return std::abs(expected_disc_px(*m.plane, m.aim.box) - disc) < kAgreeSigmas * std::hypot(sigma_px, sigma_disc);
}

Reading measure(const SceneSpec& spec, FrameMeasurer& measurer) {
  const Scene scene = make_scene(spec);
  const render::Picture picture = render::render_frame(scene.frame);
  const Measurement m = measurer.measure({picture.luma, srgb_linear_of_code(256), picture.coding_step_codes}, request_for(scene.aim, picture.luma.size()));
  Reading r;
  if (!m.plane) return r;
  r.fitted = true;
  const double slope = std::hypot(m.plane->x_gradient_px / kSceneWidth, m.plane->y_gradient_px / kSceneHeight);
  const double truth = spec.ground ? std::hypot(scene.plane.x_gradient, scene.plane.y_gradient) : 0;
  if (truth > 0) r.slope_error_percent = 100 * (slope - truth) / truth;
  if (m.plane->contact == Contact::none || !m.plane->at_contact_px) return r;
  r.at_contact = true;
  const double l = m.plane->at_contact_px->value, sigma = m.plane->at_contact_sigma_px;
  r.called = std::abs(l) > kCallSigmas * std::hypot(sigma, kCallFloorPx) && slope * kSceneHeight > kSlopeSigmas * m.plane->gradient_sigma_px && agrees(m, sigma);
  // Truth where the program says that the subject meets the ground; without a ground any call is wrong.
  const double there = spec.ground ? spec.contact_disc : 0;
  r.wrong = r.called && (!spec.ground || l * there <= 0);
  r.error_px = l - there;
  r.covered = m.plane->at_contact_px->low <= there && there <= m.plane->at_contact_px->high;
  return r;
}

struct Group {
  int cases = 0, fitted = 0, contact = 0, called = 0, wrong = 0, calls_possible = 0;
  std::vector<double> position_percent, slope_percent, covered;
  void add(const SceneSpec& spec, const Reading& r) {
    ++cases;
    fitted += r.fitted;
    contact += r.at_contact;
    called += r.called;
    wrong += r.wrong;
    if (r.fitted && spec.ground) slope_percent.push_back(r.slope_error_percent);
    if (!r.at_contact) return;
    // The half depth is the acceptable blur: 2 px of signed disc.
    position_percent.push_back(100 * std::abs(r.error_px) / kAcceptablePx);
    covered.push_back(r.covered ? 100 : 0);
  }
};

void print_group(const std::string& name, const Group& g) {
  const double n = std::max(1, g.cases);
  std::vector<double> slope;
  for (const double s : g.slope_percent) slope.push_back(std::abs(s));
  fmt::print("  {:<38} {:4} {:7.1f} {:9.1f} {:8.1f} {:6} {:10.1f} {:8.1f} {:8.1f} {:9.1f} {:9.1f}\n", name, g.cases, 100 * g.fitted / n, 100 * g.contact / n,
             100 * g.called / n, g.wrong, median(g.position_percent), quantile(g.position_percent, 0.9), mean(g.covered), median(g.slope_percent), median(slope));
}

void print_head(const std::string& title) {
  fmt::print("\n{}\n  {:<38} {:>4} {:>7} {:>9} {:>8} {:>6} {:>10} {:>8} {:>8} {:>9} {:>9}\n", title, "", "n", "fit %", "contact %", "called %", "wrong",
             "position %", "p90 %", "cover %", "slope %", "|slope| %");
}

// Focus displaced by a quarter to two half-depths; half of the frames with the aim on the ground itself.
std::vector<Case> usual_cases(const SetOptions& options) {
  constexpr double kDiscs[] = {0.5, 1, 2, 4};  // quarter, half, whole and twice the half depth at 2 px
  std::vector<Case> cases;
  const int count = count_of(options, 640, 12);
  for (int i = 0; i < count; ++i) {
    const std::uint64_t key = first_key(options, 5) + static_cast<std::uint64_t>(i);
    render::Random random(key ^ 0x5555);
    SceneSpec spec{.key = key, .gradient = random.log_uniform(0.007, 0.07)};
    spec.contact_disc = kDiscs[i % 4] * (i / 4 % 2 == 0 ? 1 : -1);
    spec.figure = i / 8 % 2 == 0;
    spec.texture = static_cast<GroundTexture>(random.below(4));
    cases.push_back({spec, spec.figure ? "standing subject" : "aim on the ground"});
  }
  return cases;
}

// What must not mislead: steep fields, focus far behind a standing subject, no surface at all.
std::vector<Case> hard_cases(const SetOptions& options) {
  std::vector<Case> cases;
  const int count = count_of(options, 300, 6);
  for (int i = 0; i < count; ++i) {
    const std::uint64_t key = first_key(options, 6) + static_cast<std::uint64_t>(i);
    render::Random random(key ^ 0x5555);
    SceneSpec spec{.key = key, .gradient = random.log_uniform(0.07, 0.2)};
    spec.texture = static_cast<GroundTexture>(i / 3 % 4);
    if (i % 3 == 0) {
      spec.contact_disc = random.log_uniform(0.5, 6) * (i / 3 % 2 == 0 ? 1 : -1);
      cases.push_back({spec, "k .07-.2"});
    } else if (i % 3 == 1) {
      spec.gradient = random.log_uniform(0.03, 0.15);
      spec.contact_disc = random.uniform(8, 30);
      cases.push_back({spec, "focus far behind, k .03-.15"});
    } else {
      spec.gradient = random.log_uniform(0.007, 0.07);
      spec.contact_disc = random.uniform(-6, 6);
      spec.ground = false;
      cases.push_back({spec, "no surface in the frame"});
    }
  }
  return cases;
}

std::vector<Reading> measure_all(const std::vector<Case>& cases, const SetOptions& options) {
  std::vector<Reading> readings(cases.size());
  for_each_case(static_cast<int>(cases.size()), [&](int i, FrameMeasurer& measurer) {
    const auto k = static_cast<std::size_t>(i);
    readings[k] = measure(cases[k].spec, measurer);
    if (options.list && options.tuning)
      fmt::print(stderr, "{} key {} k {:.4f} {} l {:.2f}: {} error {:.2f} px slope {:.1f} %{}\n", cases[k].group, cases[k].spec.key, cases[k].spec.gradient,
                 ground_name(cases[k].spec.texture), cases[k].spec.contact_disc, !readings[k].fitted ? "no fit" : !readings[k].at_contact ? "no contact" : readings[k].called ? "called" : "not called",
                 readings[k].error_px, readings[k].slope_error_percent, readings[k].wrong ? " WRONG" : "");
  });
  return readings;
}

}  // namespace

std::vector<Figure> run_planes(const SetOptions& options) {
  const std::vector<Case> usual = usual_cases(options), hard = hard_cases(options);
  const std::vector<Reading> usual_readings = measure_all(usual, options), hard_readings = measure_all(hard, options);
  std::map<std::string, Group> groups, by_texture, by_disc, by_slope, hard_groups;
  Group all, bold, fine, all_hard;
  for (std::size_t i = 0; i < usual.size(); ++i) {
    const SceneSpec& s = usual[i].spec;
    all.add(s, usual_readings[i]);
    (is_bold(s.texture) ? bold : fine).add(s, usual_readings[i]);
    groups[usual[i].group].add(s, usual_readings[i]);
    by_texture[ground_name(s.texture)].add(s, usual_readings[i]);
    by_disc[fmt::format("|l| {:g} half depths", std::abs(s.contact_disc) / kAcceptablePx)].add(s, usual_readings[i]);
    by_slope[s.gradient < 0.022 ? "k .007-.022" : "k .022-.07"].add(s, usual_readings[i]);
  }
  for (std::size_t i = 0; i < hard.size(); ++i) {
    hard_groups[hard[i].group].add(hard[i].spec, hard_readings[i]);
    all_hard.add(hard[i].spec, hard_readings[i]);
  }
  print_head("Plane, k .007-.07, focus a quarter to two half-depths off; position in % of the half depth");
  for (const auto* table : {&groups, &by_texture, &by_disc, &by_slope})
    for (const auto& [name, group] : *table) print_group(name, group);
  print_group("together", all);
  print_head("Plane, hard cases");
  for (const auto& [name, group] : hard_groups) print_group(name, group);
  const auto share = [](int part, int whole) { return 100.0 * part / std::max(1, whole); };
  const auto slope = [](const Group& g) {
    std::vector<double> values;
    for (const double s : g.slope_percent) values.push_back(std::abs(s));
    return median(values);
  };
  return {{"plane k .007-.07: side right, of calls", 100 - share(all.wrong, all.called), 99.5, false, "%", all.called},
          {"plane k .007-.07: decided", share(all.called, all.cases), 95, false, "%", all.cases},
          {"plane: position, median, of the half depth", median(all.position_percent), 5, true, "%", all.contact},
          {"plane: f-number from the slope, bold surface", slope(bold), 3, true, "%", bold.fitted},
          {"plane: f-number from the slope, texture", slope(fine), 8, true, "%", fine.fitted},
          {"plane, hard cases: wrong, of all frames", share(all_hard.wrong, all_hard.cases), 0.5, true, "%", all_hard.cases}};
}

}  // namespace focusfall::accuracy
