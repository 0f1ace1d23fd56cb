// `predict`: the model of a shot from values, or from a file's capture data; and the model turned round.
#include "analysis/optics/predict.h"

#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <cmath>
#include <limits>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "analysis/optics/exposure.h"
#include "analysis/optics/series.h"
#include "analysis/optics/solve.h"
#include "metadata/read_capture.h"
#include "src/commands/command.h"
#include "src/commands/common_options.h"
#include "src/decode/decoder.h"
#include "src/output/data_stream.h"
#include "src/output/frame_json.h"
#include "src/output/frame_text.h"
#include "src/output/predict_text.h"
#include "src/output/progress.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"
#include "src/pipeline/frame_worker.h"
#include "src/pipeline/resolve.h"

namespace focusfall {
namespace {

// Sensor that is assumed where neither the values nor the file say one: 36 x 24 mm, the size that depth-of-field
// tables are made for.
constexpr SensorSize kAssumedSensor{.width_mm = 36, .height_mm = 24};

struct DistanceRange {
  double near_m = 0;
  double far_m = 0;
};

// What is to be solved for; at most one is given.
struct Wanted {
  std::optional<DistanceRange> hold_depth;   // f-number and focus distance that keep a range sharp
  std::optional<double> hold_blur_at_m;      // f-number that keeps a point within the acceptable blur
  std::optional<double> hold_motion_um;      // slowest exposure time
  std::optional<double> hold_motion_px;
  std::optional<double> reach_depth_m;       // focus distance from which on the depth is reached
  bool hold_brightness = false;              // exposure time that renders the luminance as a mid-tone

  bool f_number() const { return hold_depth || hold_blur_at_m; }
};

struct PredictOptions {
  std::vector<std::string> inputs;
  UserValues values;
  SettingsChoice settings;
  Format format = Format::text;
  std::vector<double> at_m;
  Wanted wanted;
};

// ---- reading the options of this command ----------------------------------------------------------------------------

std::vector<double> parsed_distances(const std::string& text) {
  std::vector<double> distances;
  for (std::size_t start = 0; start <= text.size();) {
    const std::size_t end = std::min(text.find(',', start), text.size());
    const auto distance = parse_distance_m(text.substr(start, end - start));
    if (!distance) throw CLI::ValidationError("--at", distance.error());
    distances.push_back(*distance);
    start = end + 1;
  }
  return distances;
}

DistanceRange parsed_range(const std::string& text) {
  const auto dots = text.find("..");
  const auto near_m = parse_distance_m(text.substr(0, dots));
  const auto far_m = dots == std::string::npos ? near_m : parse_distance_m(text.substr(dots + 2));
  if (dots == std::string::npos || !near_m || !far_m || !(*near_m < *far_m)) {
    throw CLI::ValidationError("--hold-depth", fmt::format("'{}' is no range such as 28m..33m, near first", text));
  }
  return {.near_m = *near_m, .far_m = *far_m};
}

double parsed_distance(const std::string& option, const std::string& text) {
  const auto distance = parse_distance_m(text);
  if (!distance) throw CLI::ValidationError(option, distance.error());
  return *distance;
}

void add_wanted(CLI::App& app, Wanted& wanted) {
  constexpr const char* kGroup = "The model turned round (at most one)";
  std::vector<CLI::Option*> options;
  const auto add = [&](const char* name, const char* type, const char* help, auto take) {
    options.push_back(app.add_option_function<std::string>(name, take, help)->type_name(type)->group(kGroup));
  };
  add("--hold-depth", "NEAR..FAR", "f-number and focus distance that keep all of a range sharp: 28m..33m.",
      [&wanted](const std::string& text) { wanted.hold_depth = parsed_range(text); });
  add("--hold-blur-at", "M", "f-number that keeps a point at this distance within the acceptable blur: 33m.",
      [&wanted](const std::string& text) { wanted.hold_blur_at_m = parsed_distance("--hold-blur-at", text); });
  add("--hold-blur", "LENGTH",
      "Slowest exposure time whose motion blur stays within this: 3px, 20um. Needs --angular-rate or --subject-speed.",
      [&wanted](const std::string& text) {
        UserValues blur;
        if (const auto result = set_acceptable_blur(blur, text); !result) {
          throw CLI::ValidationError("--hold-blur", result.error());
        }
        wanted.hold_motion_um = blur.acceptable_blur_um;
        wanted.hold_motion_px = blur.acceptable_blur_px;
      });
  add("--reach-depth", "M", "Focus distance from which on the depth of field is this deep: 1.5m.",
      [&wanted](const std::string& text) { wanted.reach_depth_m = parsed_distance("--reach-depth", text); });
  options.push_back(app.add_flag("--hold-brightness", wanted.hold_brightness,
                                 "Exposure time that renders the luminance as a mid-tone. Needs --luminance and --iso. "
                                 "Default: off.")
                        ->group(kGroup));
  for (CLI::Option* one : options) {
    for (CLI::Option* other : options) {
      if (one != other) one->excludes(other);
    }
  }
}

// ---- solving --------------------------------------------------------------------------------------------------------

// What was solved, for JSON and for people, with the shot set to it.
struct Solution {
  SolvedValue value;
  std::string sentence;
};

// A wish that no setting fulfils is no fault of the command line: it is said, and the run ends with frames_missing.
struct Unsolvable {
  std::string reason;
};

template <class T>
T solved_or_throw(const Solved<T>& solved) {
  if (!solved) throw Unsolvable{solved.error().reason};
  return *solved;
}

void set_f_number(PredictReport& report, double f_number) {
  report.record.setup->f_number = f_number;
  report.record.capture->f_number = {f_number, Source::derived};
}

void set_focus(PredictReport& report, double distance_m) {
  report.record.setup->focus_distance_m = Interval{distance_m, distance_m, distance_m};
  report.record.capture->focus_distance = {
      {.value_m = distance_m, .low_m = distance_m, .high_m = distance_m}, Source::derived};
}

void set_time(PredictReport& report, double time_s) {
  report.record.setup->exposure_time_s = time_s;
  report.record.capture->exposure_time_s = {time_s, Source::derived};
}

// "f/10.3 (f/11 on the ring)"
std::string f_number_with_mark(double f_number) {
  std::string text = fmt::format("f/{}", plain_number(f_number));
  if (const auto mark = f_number_mark_at_least(f_number)) text += fmt::format(" ({} on the ring)", f_number_text(*mark));
  return text;
}

std::string time_with_mark(double time_s) {
  std::string text = time_text(time_s);
  if (const auto mark = exposure_time_mark_at_most_s(time_s)) text += fmt::format(" ({} on the dial)", time_text(*mark));
  return text;
}

Solution hold_depth(PredictReport& report, const DistanceRange& range) {
  const auto solved = solved_or_throw(f_number_for_limits(*report.record.setup, range.near_m, range.far_m));
  set_f_number(report, solved.f_number);
  set_focus(report, solved.focus_distance_m);
  std::string sentence =
      fmt::format("{} stays sharp at {}, focused at {}.", distance_range_text(range.near_m, range.far_m),
                  f_number_with_mark(solved.f_number), distance_text(solved.focus_distance_m));
  if (solved.diffraction_exceeds_blur) {
    sentence += fmt::format(" Diffraction alone is larger there than the acceptable blur: {} across.",
                            micrometres_text(solved.airy_diameter_um));
  }
  return {{.quantity = "f_number", .value = solved.f_number, .unit = ""}, sentence};
}

Solution hold_blur_at(PredictReport& report, double distance_m) {
  const auto blur = acceptable_blur(*report.record.setup);
  if (!blur.um) throw WrongUse("--hold-blur-at needs --acceptable-blur, --sensor or --pixel-pitch");
  const auto solved = solved_or_throw(f_number_for_blur(*report.record.setup, distance_m, *blur.um));
  set_f_number(report, solved.f_number);
  return {{.quantity = "f_number", .value = solved.f_number, .unit = ""},
          fmt::format("A point at {} stays within {} at {}.", distance_text(distance_m), micrometres_text(*blur.um),
                      f_number_with_mark(solved.f_number))};
}

Solution hold_motion(PredictReport& report, const Wanted& wanted) {
  const OpticalSetup& setup = *report.record.setup;
  const auto pitch = pixel_pitch_um(setup);
  if (!setup.angular_rate_rad_s && !setup.subject_speed_m_s) {
    throw WrongUse("--hold-blur needs --angular-rate or --subject-speed");
  }
  if (wanted.hold_motion_px && !pitch) throw WrongUse("--hold-blur in px needs --pixel-pitch");
  const double blur_um = wanted.hold_motion_um ? *wanted.hold_motion_um : *wanted.hold_motion_px * *pitch;
  const double time_s = solved_or_throw(exposure_time_for_motion_s(setup, blur_um));
  set_time(report, time_s);
  return {{.quantity = "exposure_time", .value = time_s, .unit = "s"},
          fmt::format("Motion stays within {} up to {}.", micrometres_text(blur_um), time_with_mark(time_s))};
}

Solution reach_depth(PredictReport& report, double depth_m) {
  const double distance_m = solved_or_throw(distance_for_depth_m(*report.record.setup, depth_m));
  set_focus(report, distance_m);
  return {{.quantity = "focus_distance", .value = distance_m, .unit = "m"},
          fmt::format("The depth of field is {} from a focus distance of {} on.", distance_text(depth_m),
                      distance_text(distance_m))};
}

Solution hold_brightness(PredictReport& report) {
  const OpticalSetup& setup = *report.record.setup;
  if (!setup.scene_luminance_cd_m2 || !setup.iso_speed) throw WrongUse("--hold-brightness needs --luminance and --iso");
  const double time_s = solved_or_throw(exposure_time_for_level_s(setup, kMidToneLevel));
  set_time(report, time_s);
  return {{.quantity = "exposure_time", .value = time_s, .unit = "s"},
          fmt::format("A scene of {} cd/m\xC2\xB2 is rendered as a mid-tone at {}.",
                      plain_number(*setup.scene_luminance_cd_m2), time_with_mark(time_s))};
}

std::optional<Solution> solve(PredictReport& report, const Wanted& wanted) {
  if (wanted.hold_depth) return hold_depth(report, *wanted.hold_depth);
  if (wanted.hold_blur_at_m) return hold_blur_at(report, *wanted.hold_blur_at_m);
  if (wanted.hold_motion_um || wanted.hold_motion_px) return hold_motion(report, wanted);
  if (wanted.reach_depth_m) return reach_depth(report, *wanted.reach_depth_m);
  if (wanted.hold_brightness) return hold_brightness(report);
  return std::nullopt;
}

// ---- one shot -------------------------------------------------------------------------------------------------------

nlohmann::ordered_json at_json(const std::vector<BlurAtDistance>& at) {
  auto list = nlohmann::ordered_json::array();
  const auto number = [](const std::optional<double>& value) {
    return value && std::isfinite(*value) ? nlohmann::ordered_json(rounded(*value, 6)) : nlohmann::ordered_json();
  };
  for (const BlurAtDistance& point : at) {
    list.push_back({{"distance_m", number(point.distance_m)},
                    {"at_infinity", std::isinf(point.distance_m)},
                    {"signed_disc_um", number(point.signed_disc_um.value)},
                    {"signed_disc_px", number(point.signed_disc_px ? std::optional(point.signed_disc_px->value)
                                                                   : std::nullopt)},
                    {"limits", number(point.limits)},
                    {"edge_rise_px", number(point.edge_rise_px)},
                    {"mtf50_cycles_per_px", number(point.mtf50_cycles_per_px)}});
  }
  return list;
}

class PredictRun {
 public:
  explicit PredictRun(const PredictOptions& options) : options_(options) {}

  ExitCode run() {
    settings_ = load_settings(options_.settings);
    if (options_.inputs.empty()) {
      FrameRecord plan;
      plan.capture.emplace();
      predict_one(std::move(plan), {});
      return exit_;
    }
    const Inputs inputs = load_inputs(options_.inputs);
    if (!inputs.problems.empty()) exit_ = ExitCode::frames_missing;
    for (const std::string& path : inputs.paths) {
      if (interrupted()) return ExitCode::interrupted;
      if (!predict_file(path)) break;
    }
    return exit_;
  }

 private:
  // False once nobody reads any more.
  bool predict_file(const std::string& path) {
    if (const auto read = read_file(path, file_); !read) return not_done(unread_frame(path, read.error()));
    const auto format = picture_format(file_.bytes());
    const DecodedSize size = format ? DecodedSize{format->width_px, format->height_px} : DecodedSize{};
    CaptureReading reading = read_capture(file_.bytes(), size);
    FrameRecord record;
    record.path = path;
    record.capture = std::move(reading.capture);
    for (CaptureRemark& remark : reading.remarks) {
      record.issues.push_back({Stage::read, std::move(remark.code), std::move(remark.message)});
    }
    if (!format) record.issues.push_back({Stage::decode, format.error().code, format.error().message});
    return predict_one(std::move(record), size);
  }

  bool predict_one(FrameRecord record, DecodedSize size) {
    UserValues values = options_.values;
    // The f-number that is to be found need not be said; what stands here is replaced.
    constexpr double kAnyFNumber = 8;
    if (options_.wanted.f_number() && !values.f_number) values.f_number = kAnyFNumber;
    Resolved resolved = resolve(*record.capture, values, settings_, size);
    record.capture = std::move(resolved.capture);
    record.setup = resolved.setup;
    if (!record.setup) {
      if (record.path.empty()) throw WrongUse("predict needs --focal-length and --f-number, or a photograph");
      for (Issue& issue : resolved.issues) {
        if (issue.code == "setup-incomplete") record.issues.push_back(std::move(issue));
      }
      return not_done(record);
    }
    return print(std::move(record));
  }

  bool print(FrameRecord record) {
    PredictReport report;
    report.record = std::move(record);
    prepare(report);
    std::optional<Solution> solution;
    try {
      solution = solve(report, options_.wanted);
    } catch (const Unsolvable& unsolvable) {
      report.record.issues.push_back({Stage::predict, "no-solution", unsolvable.reason});
      return not_done(report.record);
    }
    if (const auto problem = focus_distance_problem(*report.record.setup)) {
      report.record.issues.push_back({Stage::predict, "focus-distance-unusable", *problem});
    }
    report.record.prediction = predict(*report.record.setup);
    report.record.done = true;
    for (const double distance_m : options_.at_m) {
      if (const auto blur = blur_at(*report.record.setup, distance_m)) report.at.push_back(*blur);
    }
    if (report.at.size() < options_.at_m.size()) {
      report.assumptions.push_back("No blur is given for a point nearer than the lens can see, or without a focus "
                                   "distance.");
    }
    if (solution) report.solved.push_back(solution->sentence);
    return out_.write(options_.format == Format::json ? json_text(report, solution)
                                                      : predict_text(report, terminal_columns(STDOUT_FILENO)));
  }

  // What holds for a plan: the trade's circle of confusion, and a sensor where none is known.
  void prepare(PredictReport& report) const {
    OpticalSetup& setup = *report.record.setup;
    setup.acceptable_blur_rule = AcceptableBlurRule::circle_of_confusion;
    const bool size_known = setup.sensor_width_mm || (setup.pixel_pitch_um && setup.width_px > 0);
    if (!size_known) {
      setup.sensor_width_mm = kAssumedSensor.width_mm;
      setup.sensor_height_mm = kAssumedSensor.height_mm;
      report.assumptions.push_back("The sensor was not said; 36 \xC3\x97 24 mm is assumed. --sensor says it.");
    }
  }

  std::string json_text(const PredictReport& report, const std::optional<Solution>& solution) const {
    auto json = frame_json(report.record);
    json["solved"] = solution ? solved_json(solution->value) : nlohmann::ordered_json();
    if (!options_.at_m.empty()) json["blur_at"] = at_json(report.at);
    return json_line(json);
  }

  bool not_done(const FrameRecord& record) {
    exit_ = ExitCode::frames_missing;
    say((record.path.empty() ? std::string("focusfall") : visible_text(record.path)) + ": " + failure_text(record));
    if (options_.format != Format::json) return true;
    return out_.write(json_line(frame_json(record)));
  }

  const PredictOptions& options_;
  Settings settings_;
  FileBuffer file_;
  DataStream out_{STDOUT_FILENO};
  ExitCode exit_ = ExitCode::done;
};

}  // namespace

constexpr const char* kExamples =
    "Examples\n"
    "  focusfall predict --focal-length 400mm --f-number 2.8 --focus-distance 30m --at 28m,33m\n"
    "  focusfall predict --focal-length 400mm --hold-depth 28m..33m\n"
    "  focusfall predict --focal-length 400mm --f-number 2.8 --focus-distance 30m --pixel-pitch 4.3um "
    "--subject-speed 8m/s --hold-blur 3px\n"
    "  focusfall predict boat.jpg";

std::function<ExitCode()> add_predict(CLI::App& app) {
  app.footer(kExamples);
  auto options = std::make_shared<PredictOptions>();
  add_input_argument(app, options->inputs, false);
  add_format_option(app, options->format, {Format::text, Format::json});
  app.add_option_function<std::string>(
         "--at", [options](const std::string& text) { options->at_m = parsed_distances(text); },
         "Distances whose blur disc is wanted: 28m,30m,inf. Default: none.")
      ->type_name("M,...");
  add_wanted(app, options->wanted);
  add_value_options(app, options->values);
  add_settings_options(app, options->settings);
  return [options] { return PredictRun(*options).run(); };
}

}  // namespace focusfall
