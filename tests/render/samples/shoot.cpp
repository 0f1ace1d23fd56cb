#include "tests/render/samples/shoot.h"

#include <cmath>
#include <fmt/format.h>
#include <map>
#include <numbers>

#include "tests/render/samples/art_tools.h"

namespace focusfall::render {
namespace {

// Textures are large and shared by many frames: drawn at first use.
TexturePtr cached(const std::string& name, const std::function<cv::Mat()>& draw, bool tiled) {
  static std::map<std::string, TexturePtr> textures;
  auto& texture = textures[name];
  if (!texture) texture = std::make_shared<MipTexture>(draw(), tiled);
  return texture;
}

double radians(double degrees) { return degrees * std::numbers::pi / 180; }

// A flat thing lying on a ground: its far left corner stands `left_m` beside and `away_m` along the ground from the
// foot of the camera.
Surface lying(TexturePtr texture, const GroundPlace& place, double texel_m, double left_m, double away_m) {
  GroundPlace fine = place;
  fine.texel_x_m = fine.texel_z_m = texel_m;
  Surface surface = ground(std::move(texture), fine);
  const double pitch = radians(place.pitch_deg);
  surface.origin += cv::Vec3d(left_m, -away_m * std::sin(pitch), away_m * std::cos(pitch));
  return surface;
}

// Camera coordinates of a point on the ground at depth z along the axis: how far below the axis it lies.
double ground_below_m(const GroundPlace& place, double depth_m) {
  const double pitch = radians(place.pitch_deg);
  return (place.height_m - depth_m * std::sin(pitch)) / std::cos(pitch);
}

std::string clock_time(int hour, int minute, int second) { return fmt::format("2026:06:14 {:02}:{:02}:{:02}", hour, minute, second); }

// ---- The regatta: 400 mm from a jetty, boats at 120 m and beyond, the far shore at 600 m.

constexpr double kBoatDepth = 120, kShoreDepth = 600;

GroundPlace lake(const LensSpec& lens, double pitch_deg) {
  const double step = metres_per_px(lens, kBoatDepth);
  return {.height_m = 2.2, .pitch_deg = pitch_deg, .texel_x_m = step / 2, .texel_z_m = 0.18, .farthest_m = kShoreDepth};
}

struct BoatPlace {
  std::string look;
  double depth_m, left_m;
  cv::Vec2d motion_px;
};

TexturePtr boat_texture(const std::string& name) {
  return cached("boat " + name, [&] {
    BoatLook look;
    if (name == "blue") look = {.number = "27"};
    if (name == "red") look = {.hull = {0.45f, 0.03f, 0.02f}, .stripe = {0.6f, 0.6f, 0.58f}, .jacket = {0.02f, 0.12f, 0.35f}, .number = "31", .random_key = 2};
    if (name == "far") look = {.texel_m = 0.006, .hull = {0.02f, 0.10f, 0.08f}, .stripe = {0.6f, 0.5f, 0.05f}, .number = "14", .heel_deg = 4, .random_key = 3};
    if (name == "kite") look = {.texel_m = 0.006, .stripe = {0.4f, 0.03f, 0.02f}, .spinnaker = {0.70f, 0.12f, 0.02f}, .number = "08", .heel_deg = 3, .random_key = 4};
    return boat_picture(look);
  }, false);
}

void add_boat(std::vector<Surface>& surfaces, const GroundPlace& water, const BoatPlace& place, double texel_m) {
  const TexturePtr texture = boat_texture(place.look);
  const double below = ground_below_m(water, place.depth_m);
  Surface boat = billboard(texture, {.depth_m = place.depth_m, .left_m = place.left_m, .bottom_m = below + 0.02, .texel_m = texel_m});
  boat.motion_px = place.motion_px;
  // The padding below the texture's own rows is transparent: let the waterline sit on the ground all the same.
  boat.origin[1] = below - kBoatHeight;
  surfaces.push_back(boat);
  Surface mirror = boat;
  mirror.texture = cached("mirror " + place.look, [&] {
    BoatLook look;
    look.texel_m = 0.012;
    if (place.look == "red") look.hull = {0.45f, 0.03f, 0.02f};
    if (place.look == "kite") look.spinnaker = {0.70f, 0.12f, 0.02f};
    return reflection_of(boat_picture(look), 1, 9);
  }, false);
  mirror.along_u = {0.012, 0, 0};
  mirror.along_v = {0, 0.012, 0};
  mirror.origin[1] = below;
  surfaces.push_back(mirror);
}

struct LakeScene {
  double pitch_deg = -0.35;
  double boat_left_m = -2.6;
  double glints = 0.5;
  bool second_boat = false;
  bool buoy_only = false;
};

std::vector<Surface> build_lake(const SampleFrame& frame, const LakeScene& scene) {
  const GroundPlace water = lake(frame.lens, scene.pitch_deg);
  std::vector<Surface> surfaces;
  if (scene.buoy_only) {
    Surface buoy = billboard(cached("buoy", [] { return buoy_picture(0.0012); }, false),
                             {.depth_m = frame.aim_depth_m, .left_m = scene.boat_left_m, .bottom_m = 0, .texel_m = 0.0012});
    buoy.origin[1] = ground_below_m(water, frame.aim_depth_m) - 2.2;
    surfaces.push_back(buoy);
  } else {
    add_boat(surfaces, water, {"blue", kBoatDepth, scene.boat_left_m, frame.subject_motion_px}, 0.00225);
  }
  if (scene.second_boat) add_boat(surfaces, water, {"red", kBoatDepth + 9, scene.boat_left_m + 3.6, frame.subject_motion_px}, 0.00225);
  add_boat(surfaces, water, {"far", 230, -9.5, {0, 0}}, 0.006);
  add_boat(surfaces, water, {"kite", 330, 9.0, {0, 0}}, 0.006);
  surfaces.push_back(ground(cached(fmt::format("water {}", scene.glints), [&] { return water_picture(scene.glints, 21); }, true), water));
  const double shore_width = 84, shore_height = 34;
  Surface shore = billboard(cached("shore", [&] { return shore_picture(0.03, shore_width, shore_height, 22); }, false),
                            {.depth_m = kShoreDepth, .left_m = -shore_width / 2, .bottom_m = 0, .texel_m = 0.03});
  shore.origin[1] = ground_below_m(water, kShoreDepth) - shore_height;
  surfaces.push_back(shore);
  return surfaces;
}

SampleFrame regatta(const std::string& file, const std::string& what, double disc_px, int second, int hundredth) {
  SampleFrame frame;
  frame.file = "regatta-" + file;
  frame.scene = "regatta";
  frame.what = what;
  frame.lens = {.focal_length_mm = 400, .f_number = 2.8, .focus_m = kBoatDepth};
  frame.aim_depth_m = kBoatDepth;
  frame.lens.focus_m = focus_for_disc_m(frame.lens, kBoatDepth, disc_px);
  frame.aim = {620, 760, 240, 200};
  frame.camera = {.iso_speed = 200, .mosaic = true, .sharpening = 0.3, .jpeg_quality = 90, .chroma = ChromaSampling::half};
  frame.data.body_serial = "FF-0104";
  frame.data.lens = "Invented 400 mm f/2.8";
  frame.data.lens_serial = "LL-4001";
  frame.data.taken_at = clock_time(10, 42, second);
  frame.data.subsecond = fmt::format("{:02}", hundredth);
  frame.data.exposure_time_s = 1.0 / 2000;
  frame.build = [](const SampleFrame& self) { return build_lake(self, {}); };
  return frame;
}

}  // namespace

std::vector<SampleFrame> regatta_frames() {
  std::vector<SampleFrame> frames;
  const auto add = [&](SampleFrame frame, const std::string& focus, const std::string& cause) -> SampleFrame& {
    frame.focus = focus;
    frame.cause = cause;
    frames.push_back(std::move(frame));
    return frames.back();
  };
  const auto lake_with = [](const LakeScene& scene) { return [scene](const SampleFrame& self) { return build_lake(self, scene); }; };

  // One burst of six at ten frames a second: focus hunts behind and catches up.
  const double hunt[] = {-6.5, -4.2, -1.9, 0.3, 0.6, 4.8};
  const char* names[] = {"front", "front", "unsure", "on", "on", "back"};
  for (int i = 0; i < 6; ++i) {
    SampleFrame frame = regatta(fmt::format("{:02}-{}", i + 1, names[i]), "burst, the boat sails in while focus catches up", hunt[i], 5, 10 * i);
    frame.build = lake_with({.boat_left_m = -2.9 + 0.12 * i});
    frame.aim.x += 18 * i - 40;
    frame.lens.focus_m = focus_for_disc_m(frame.lens, kBoatDepth, hunt[i]);
    add(frame, names[i], std::abs(hunt[i]) > 3 ? "defocus" : "");
  }
  {
    SampleFrame frame = regatta("07-panned", "camera follows the boat and lags a little", 0.2, 31, 0);
    frame.lens.f_number = 8;
    frame.lens.focus_m = focus_for_disc_m(frame.lens, kBoatDepth, 0.2);
    frame.camera_motion_px = {24, 0};
    frame.subject_motion_px = {-17, 0};
    frame.data.exposure_time_s = 1.0 / 125;
    frame.camera.iso_speed = 100;
    add(frame, "off", "subject motion");
  }
  {
    SampleFrame frame = regatta("08-subject-motion", "camera still, the boat passes", 0.2, 48, 0);
    frame.lens.f_number = 11;
    frame.lens.focus_m = focus_for_disc_m(frame.lens, kBoatDepth, 0.2);
    frame.subject_motion_px = {11, 0};
    frame.data.exposure_time_s = 1.0 / 160;
    frame.camera.iso_speed = 100;
    add(frame, "off", "subject motion");
  }
  {
    SampleFrame frame = regatta("09-camera-shake", "the jetty was bumped", 0.3, 12, 0);
    frame.data.taken_at = clock_time(10, 47, 12);
    frame.lens.f_number = 11;
    frame.lens.focus_m = focus_for_disc_m(frame.lens, kBoatDepth, 0.3);
    const double angle = radians(35);
    frame.camera_motion_px = {9 * std::cos(angle), 9 * std::sin(angle)};
    frame.data.exposure_time_s = 1.0 / 160;
    frame.camera.iso_speed = 100;
    add(frame, "off", "camera shake");
  }
  {
    SampleFrame frame = regatta("10-no-evidence", "focus left at eight metres", 0, 20, 0);
    frame.data.taken_at = clock_time(10, 51, 20);
    frame.lens.focus_m = 8;
    add(frame, "no evidence", "defocus");
  }
  {
    SampleFrame frame = regatta("11-clipped-area", "two stops too long for white sails", 0.2, 2, 0);
    frame.data.taken_at = clock_time(10, 55, 2);
    frame.exposure = 2.6;
    frame.data.exposure_time_s = 1.0 / 500;
    add(frame, "on", "");
  }
  {
    SampleFrame frame = regatta("12-clipped-points", "low sun on the waves", 0.4, 37, 0);
    frame.data.taken_at = clock_time(11, 20, 37);
    frame.build = lake_with({.boat_left_m = -2.2, .glints = 1.6});
    frame.exposure = 0.9;
    add(frame, "on", "");
  }
  {
    SampleFrame frame = regatta("13-no-focus-distance", "the lens records no distance", -5.5, 5, 0);
    frame.data.taken_at = clock_time(11, 24, 5);
    frame.data.lens = "";
    frame.data.lens_serial = "";
    frame.build = lake_with({.boat_left_m = -1.6, .second_boat = false});
    frame.aim = {760, 760, 240, 200};
    add(frame, "front", "defocus");
  }
  {
    SampleFrame frame = regatta("14-half-on-background", "focus area half on the boat, half on the far shore", 0.2, 40, 0);
    frame.data.taken_at = clock_time(11, 26, 40);
    frame.build = lake_with({.boat_left_m = -2.6});
    // The upper edge of the sail before trees and sky.
    frame.aim = {600, 330, 300, 260};
    add(frame, "on", "");
  }
  {
    SampleFrame frame = regatta("15-upright", "the mark, camera turned", -5.0, 10, 0);
    frame.data.taken_at = clock_time(11, 31, 10);
    frame.orientation = 8;
    frame.aim_depth_m = 45;
    frame.lens.width_px = 1067;
    frame.lens.height_px = 1600;
    frame.lens.focus_m = focus_for_disc_m(frame.lens, 45, -5.0);
    frame.aim = {420, 760, 230, 260};
    frame.build = lake_with({.pitch_deg = 1.0, .boat_left_m = -0.65, .buoy_only = true});
    add(frame, "front", "defocus");
  }
  for (SampleFrame& frame : frames) frame.plane = 0;  // the water; resolved by its texture when built
  return frames;
}

namespace {

// ---- The stage: 135 mm from the tenth row.

constexpr double kActorDepth = 12, kCurtainDepth = 17;

GroundPlace stage_floor(const LensSpec& lens) {
  const double step = metres_per_px(lens, kActorDepth);
  return {.height_m = 1.5, .pitch_deg = 2.95, .texel_x_m = step / 2.2, .texel_z_m = step * 3, .farthest_m = kCurtainDepth};
}

struct StageScene {
  double actor_left_m = -0.75;
  double arm_raise = 0;
  bool second_actor = true;
  double second_depth_m = 14.6, second_left_m = 0.15;
  bool stand_before = false;        // a microphone stand nearer than the actor
  bool floods = false;
};

void add_actor(std::vector<Surface>& people, std::vector<Surface>& shadows, const GroundPlace& floor, TexturePtr texture,
               double depth_m, double left_m, cv::Vec2d motion) {
  Surface actor = billboard(std::move(texture), {.depth_m = depth_m, .left_m = left_m, .bottom_m = 0, .texel_m = 0.00067});
  actor.origin[1] = ground_below_m(floor, depth_m) - kActorHeight + 0.005;
  actor.motion_px = motion;
  people.push_back(actor);
  const double pitch = radians(floor.pitch_deg);
  const double away = depth_m / std::cos(pitch) - floor.height_m * std::tan(pitch);  // along the ground, to depth_m
  shadows.push_back(lying(cached("shadow", [] { return shadow_picture(1.9, 1.3, 0.02, 0.75); }, false), floor, 0.02, left_m - 0.1, away + 0.75));
}

std::vector<Surface> build_stage(const SampleFrame& frame, const StageScene& scene) {
  const GroundPlace floor = stage_floor(frame.lens);
  std::vector<Surface> surfaces, shadows;
  if (scene.stand_before) {
    Surface stand = billboard(cached("stand", [] { return stand_picture(0.0006); }, false), {.depth_m = 10.4, .left_m = -0.62, .bottom_m = 0, .texel_m = 0.0006});
    stand.origin[1] = ground_below_m(floor, 10.4) - 1.69;
    surfaces.push_back(stand);
  }
  const bool raised = scene.arm_raise > 0.5;
  add_actor(surfaces, shadows, floor, cached(raised ? "actor raised" : "actor", [&] { return actor_picture({.arm_raise = scene.arm_raise}); }, false),
            kActorDepth, scene.actor_left_m, frame.subject_motion_px);
  if (scene.second_actor)
    add_actor(surfaces, shadows, floor, cached("second actor", [] {
      return actor_picture({.jacket = {0.22f, 0.15f, 0.07f}, .trousers = {0.03f, 0.022f, 0.016f}, .shirt = {0.35f, 0.4f, 0.42f}, .hair = {0.16f, 0.09f, 0.035f}, .long_coat = true, .arm_raise = 1, .random_key = 6});
    }, false), scene.second_depth_m, scene.second_left_m, {0, 0});
  surfaces.insert(surfaces.end(), shadows.begin(), shadows.end());
  surfaces.push_back(ground(cached("boards", [] { return boards_picture(31); }, true), floor));
  surfaces.push_back(billboard(cached(scene.floods ? "floods" : "lamps", [&] { return lamps_picture(0.004, 7, 2, scene.floods, 33); }, false),
                               {.depth_m = 16.5, .left_m = -3.4, .bottom_m = ground_below_m(floor, 16.5) - (scene.floods ? 0.55 : 1.25), .texel_m = 0.004}));
  Surface curtain = billboard(cached("curtain", [] { return curtain_picture(0.005, 8, 4.5, 32); }, false),
                              {.depth_m = kCurtainDepth, .left_m = -4, .bottom_m = 0, .texel_m = 0.005});
  curtain.origin[1] = ground_below_m(floor, kCurtainDepth) - 4.5;
  surfaces.push_back(curtain);
  return surfaces;
}

SampleFrame stage(const std::string& file, const std::string& what, double disc_px, int minute) {
  SampleFrame frame;
  frame.file = "stage-" + file;
  frame.scene = "stage";
  frame.what = what;
  frame.lens = {.focal_length_mm = 135, .f_number = 2, .focus_m = kActorDepth};
  frame.aim_depth_m = kActorDepth;
  frame.lens.focus_m = focus_for_disc_m(frame.lens, kActorDepth, disc_px);
  frame.aim = {690, 330, 220, 260};
  frame.camera = {.iso_speed = 400, .mosaic = true, .noise_reduction = 1.0, .sharpening = 0.3, .jpeg_quality = 90, .chroma = ChromaSampling::half};
  frame.exposure = 1.5;
  frame.data.body_serial = "FF-0207";
  frame.data.lens = "Invented 135 mm f/2";
  frame.data.lens_serial = "LL-1352";
  frame.data.taken_at = clock_time(20, minute, 14);
  frame.data.exposure_time_s = 1.0 / 250;
  frame.build = [](const SampleFrame& self) { return build_stage(self, {}); };
  return frame;
}

}  // namespace

std::vector<SampleFrame> stage_frames() {
  std::vector<SampleFrame> frames;
  const auto add = [&](SampleFrame frame, const std::string& focus, const std::string& cause) {
    frame.focus = focus;
    frame.cause = cause;
    frames.push_back(std::move(frame));
  };
  const auto with = [](const StageScene& scene) { return [scene](const SampleFrame& self) { return build_stage(self, scene); }; };
  add(stage("01-on", "reading the script", 0.3, 4), "on", "");
  add(stage("02-front", "focus fell towards the hall", -5.5, 5), "front", "defocus");
  add(stage("03-back", "focus fell on the colleague behind", 6.5, 7), "back", "defocus");
  {
    SampleFrame frame = stage("04-subject-motion", "a quick step during 1/60 s", 0.3, 9);
    frame.subject_motion_px = {8, -3};
    frame.data.exposure_time_s = 1.0 / 60;
    frame.camera.iso_speed = 200;
    add(frame, "off", "subject motion");
  }
  {
    SampleFrame frame = stage("05-clipped-area", "flood lamps in the frame", 0.4, 16);
    frame.build = with({.arm_raise = 1, .floods = true});
    add(frame, "on", "");
  }
  {
    SampleFrame frame = stage("06-clipped-points", "a string of bulbs behind, in the frame", 0.2, 21);
    frame.build = with({.actor_left_m = -1.15, .arm_raise = 1, .second_actor = false});
    frame.aim.x = 480;
    add(frame, "on", "");
  }
  {
    SampleFrame frame = stage("07-shallow", "two people, one of them in the depth of field", 0.2, 26);
    frame.build = with({.actor_left_m = -1.1, .second_depth_m = 13.4, .second_left_m = -0.55});
    frame.aim = {540, 310, 470, 330};
    add(frame, "on", "shallow depth of field");
  }
  {
    SampleFrame frame = stage("08-missed-aim", "focus on the microphone, the actor meant", 5.2, 33);
    frame.build = with({.stand_before = true});
    frame.lens.focus_m = 10.4;
    add(frame, "front", "missed aim");
  }
  for (SampleFrame& frame : frames) frame.plane = 0;
  return frames;
}

namespace {

// ---- The bench: 85 mm looking down on gravel, a printed card at the aim.

constexpr double kBenchHeight = 1.3, kBenchPitchDeg = 30;

std::vector<Surface> build_bench(const SampleFrame&, double card_left_m) {
  const GroundPlace gravel{.height_m = kBenchHeight, .pitch_deg = kBenchPitchDeg, .texel_x_m = 0.00045, .texel_z_m = 0.00045};
  const double away = kBenchHeight / std::tan(radians(kBenchPitchDeg));  // where the axis meets the ground
  std::vector<Surface> surfaces;
  surfaces.push_back(lying(cached("card", [] { return card_picture(0.0003); }, false), gravel, 0.0003, card_left_m, away + 0.21));
  surfaces.push_back(lying(cached("card shadow", [] { return shadow_picture(0.44, 0.56, 0.004, 0.8); }, false), gravel, 0.004, card_left_m - 0.055, away + 0.27));
  surfaces.push_back(ground(cached("gravel", [] { return gravel_picture(2048, 41); }, true), gravel));
  return surfaces;
}

}  // namespace

std::vector<SampleFrame> bench_frames() {
  std::vector<SampleFrame> frames;
  // A lens that focuses 150 um behind, repeatable to 30 um.
  constexpr double kBackFocusUm = 150, kScatterUm = 30;
  Random random(77);
  for (int i = 0; i < 12; ++i) {
    SampleFrame frame;
    frame.file = fmt::format("bench-{:02}", i + 1);
    frame.scene = "bench";
    frame.what = "lens focused anew from far, card on gravel";
    frame.lens = {.focal_length_mm = 85, .f_number = 1.8, .focus_m = 2.6, .pitch_um = 36000.0 / 1080, .width_px = 1080, .height_px = 720};
    frame.aim_depth_m = kBenchHeight / std::sin(radians(kBenchPitchDeg));
    const double defocus_um = kBackFocusUm + kScatterUm * random.normal();
    frame.lens.focus_m = frame.aim_depth_m;
    const double disc = defocus_um / (frame.lens.pitch_um * working_f_number(frame.lens));
    frame.lens.focus_m = focus_for_disc_m(frame.lens, frame.aim_depth_m, disc);
    frame.aim = {432, 262, 216, 200};
    frame.camera = {.iso_speed = 100, .mosaic = true, .sharpening = 0.3, .jpeg_quality = 78, .chroma = ChromaSampling::half};
    frame.exposure = 1.25;
    frame.data.body_serial = "FF-0311";
    frame.data.lens = "Invented 85 mm f/1.8";
    frame.data.lens_serial = "LL-0851";
    frame.data.taken_at = fmt::format("2026:06:16 09:{:02}:{:02}", 10 + i / 4, 12 * (i % 4));
    frame.data.exposure_time_s = 1.0 / 400;
    frame.focus = disc > 2 ? "back" : "on";
    frame.cause = disc > 2 ? "defocus" : "";
    frame.plane = 0;
    const double left = -0.15 + 0.004 * random.normal();
    frame.build = [left](const SampleFrame& self) { return build_bench(self, left); };
    frames.push_back(std::move(frame));
  }
  SampleFrame close;
  close.file = "bench-13-diffraction";
  close.scene = "bench";
  close.what = "washers at life size, f/45";
  close.focus = "off";
  close.cause = "diffraction";
  close.lens = {.focal_length_mm = 100, .f_number = 45, .focus_m = 0.2};
  close.aim_depth_m = 0.2;
  close.aim = {680, 430, 260, 220};
  close.wavelength_um = 0.55;
  close.camera = {.iso_speed = 100, .mosaic = true, .sharpening = 0.3, .jpeg_quality = 90, .chroma = ChromaSampling::half};
  close.exposure = 1.2;
  close.data.body_serial = "FF-0311";
  close.data.lens = "Invented 100 mm f/2.8 close-up";
  close.data.lens_serial = "LL-1001";
  close.data.taken_at = "2026:06:16 09:40:00";
  close.data.exposure_time_s = 0.5;
  close.build = [](const SampleFrame&) {
    return std::vector<Surface>{billboard(cached("washers", [] { return washers_picture(0.000011, 0.038, 0.026, 51); }, false),
                                          {.depth_m = 0.2, .left_m = -0.019, .bottom_m = 0.013, .texel_m = 0.000011})};
  };
  frames.push_back(close);
  return frames;
}

}  // namespace focusfall::render
