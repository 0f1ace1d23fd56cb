// `lens`: does this lens on this body focus in front or behind, by how much, and how sure is that?
#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <map>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "src/commands/command.h"
#include "src/commands/common_options.h"
#include "src/commands/lens_records.h"
#include "src/output/data_stream.h"
#include "src/output/frame_json.h"
#include "src/output/lens_plot.h"
#include "src/output/lens_report.h"
#include "src/output/owned_file.h"
#include "src/output/progress.h"
#include "src/output/sheet.h"
#include "src/output/visible_text.h"
#include "src/pipeline/lens_bench_input.h"
#include "src/pipeline/lens_input.h"

namespace focusfall {
namespace {

constexpr const char* kCautions =
    "Never point a long lens at or near the sun, by eye or by sensor. A finding is evidence, not a repair order: adjust "
    "a lens or body by its maker's procedure or leave it to a qualified technician. Keep the originals.";

struct LensOptions {
  RecordRequest request;
  Format format = Format::text;
  bool brief = false;
  std::string plot;   // file for the plot; empty: none
  std::vector<ApproachRule> approach;
  LensReportOptions report;
  SurfaceAttitude attitude;
  bool focus_series = false;
  std::optional<double> focus_step_um;
  bool flat = false;
  FlatRequest wall;
};

class LensRun {
 public:
  explicit LensRun(const LensOptions& options) : options_(options) {}

  ExitCode run() {
    const GatheredRecords gathered = gather_records(options_.request);
    if (gathered.interrupted) return ExitCode::interrupted;
    if (gathered.read_back > 0 && options_.request.values.near_side)
      throw WrongUse("--near-side is for photographs; records of check hold the side already");
    const LensInput input = lens_input(gathered.records, options_.approach);
    ask_for_optics(gathered.records, input);
    warn_of_copies(input);
    const LensReport report = lens_report(input.readings, options_.report);
    LensOutput output{gathered.records, input, report};
    if (options_.attitude.tilt_rad || options_.attitude.camera_height_m)
      output.diaphragms = group_diaphragms(gathered.records, input, report, options_.attitude);
    if (options_.focus_series || options_.focus_step_um)
      output.focus_series = focus_series(gathered.records, options_.focus_step_um);
    if (options_.flat) output.flat = flat_field(gathered.records, options_.wall);
    write(output);
    const bool drawn = options_.plot.empty() || draw(output);
    return gathered.complete && drawn ? ExitCode::done : ExitCode::frames_missing;
  }

 private:
  // A run in which nothing counts because the files do not hold what is needed: the person can say it.
  static void ask_for_optics(const std::vector<FrameRecord>& records, const LensInput& input) {
    if (!input.readings.empty()) return;
    bool focal_length = false, f_number = false, pitch = false;
    for (std::size_t i = 0; i < records.size(); ++i) {
      if (input.left_out[i] != LeftOut::no_optics) continue;
      const Capture& capture = *records[i].capture;
      focal_length = focal_length || !capture.focal_length_mm;
      f_number = f_number || !capture.f_number;
      pitch = pitch || (capture.focal_length_mm && capture.f_number);
    }
    std::string options;
    const auto ask = [&](bool needed, const char* option) {
      if (needed) options += (options.empty() ? "" : ", ") + std::string(option);
    };
    ask(focal_length, "--focal-length");
    ask(f_number, "--f-number");
    ask(pitch, "--pixel-pitch or --sensor");
    if (!options.empty()) throw WrongUse(fmt::format("no file records what is needed; give {}", options));
  }

  static void warn_of_copies(const LensInput& input) {
    const auto copies = std::ranges::count(input.left_out, std::optional(LeftOut::copy));
    if (copies == 0) return;
    say(fmt::format("{} {} measured to the last digit as an earlier frame: a copied file is not a repeat, and does not "
                    "count.",
                    copies, copies == 1 ? "frame" : "frames"));
  }

  // Written where nothing or an older plot stands, never over another file.
  bool draw(const LensOutput& output) {
    const OwnedFile file{.path = options_.plot, .first_bytes = kMarkBytes, .is_ours = [](std::string_view first_bytes) {
                           return is_marked_svg(first_bytes, kLensPlotMark);
                         }};
    const auto written = write_owned_file(file, lens_plot_svg(output));
    if (!written) say(fmt::format("{}: {}", visible_text(options_.plot), written.error()));
    return written.has_value();
  }

  void write(const LensOutput& output) {
    switch (options_.format) {
      case Format::json:
        for (const auto& line : lens_frames_json(output)) {
          if (!out_.write(json_line(line))) return;
        }
        out_.write(json_line(lens_set_json(output)));
        return;
      case Format::csv:
        out_.write(lens_csv_header() + lens_csv_lines(output));
        return;
      case Format::text: break;
    }
    int longest = 0;
    for (const FrameRecord& record : output.records)
      longest = std::max(longest, text_columns(visible_text(record.path)));
    out_.write(lens_text(output, {.layout = text_layout(terminal_columns(STDOUT_FILENO), longest),
                                  .frames = !options_.brief}));
  }

  const LensOptions& options_;
  DataStream out_{STDOUT_FILENO};
};

// An option whose text `parse` turns into `target`.
template <class T, class Parse>
CLI::Option* add_parsed(CLI::App& app, const char* name, std::optional<T>& target, Parse parse) {
  return app.add_option_function<std::string>(name, [&target, name, parse](const std::string& text) {
    const auto value = parse(text);
    if (!value) throw CLI::ValidationError(name, value.error());
    target = *value;
  });
}

void add_bench_options(CLI::App& app, LensOptions& options) {
  constexpr const char* kGroup = "On the bench";
  auto* tilt = add_parsed(app, "--tilt", options.attitude.tilt_rad, parse_tilt_rad);
  tilt->description("How far the surface leans away from square-on, such as 45deg: gives the working f-number from the "
                    "slope of the blur. Default: not known.")
      ->type_name("ANGLE")
      ->group(kGroup);
  add_parsed(app, "--camera-height", options.attitude.camera_height_m, parse_distance_m)
      ->description("Height of the lens above level ground, such as 1.6m: the same from the ground. Default: not known.")
      ->type_name("LENGTH")
      ->group(kGroup)
      ->excludes(tilt);
  app.add_flag("--focus-series", options.focus_series,
               "The frames, in their order, are one fixed surface at focus positions that go on in one direction: finds "
               "the best position. Default: off.")
      ->group(kGroup);
  add_parsed(app, "--focus-step", options.focus_step_um, parse_focus_step_um)
      ->description("The same with equal steps of this size at the sensor, such as 20um. Default: positions from the "
                    "recorded focus distances.")
      ->type_name("LENGTH")
      ->group(kGroup);
  auto* flat = app.add_flag("--flat", options.flat,
                            "The frames show a flat wall, square-on: size and axis of the field's tilt and its "
                            "curvature. Default: off.")
                   ->group(kGroup);
  app.add_option("--focus-travel", options.wall.travel,
                 "Direction in which focus moves from frame to frame: near-to-far or far-to-near. Gives the field its "
                 "sign. Default: not known.")
      ->transform(CLI::CheckedTransformer(std::map<std::string, FocusTravel>{{"near-to-far", FocusTravel::near_to_far},
                                                                            {"far-to-near", FocusTravel::far_to_near}})
                      .description(""))
      ->type_name("DIRECTION")
      ->group(kGroup)
      ->needs(flat);
  app.add_option("--upside-down", options.wall.upside_down,
                 "File or folder of a second series with the camera upside down: tells lens and body from the wall; may "
                 "be given again. Default: none.")
      ->type_name("PATH")
      ->group(kGroup)
      ->allow_extra_args(false)
      ->needs(flat);
}

}  // namespace

std::function<ExitCode()> add_lens(CLI::App& app) {
  auto options = std::make_shared<LensOptions>();
  app.footer(kCautions);
  add_input_argument(app, options->request.inputs, true);
  app.get_option("files")->description(
      "Photographs, folders, and files of records that check --format json wrote; @LIST or @- for a list of paths, one "
      "a line or separated by NUL; ./@x for a name that starts with @.");
  add_format_option(app, options->format, {Format::text, Format::json, Format::csv});
  app.add_flag("--brief", options->brief, "Text without a line for every frame. Default: off.");
  app.add_option_function<std::vector<std::string>>(
         "--approach",
         [options](const std::vector<std::string>& texts) {
           for (const std::string& text : texts) {
             const auto rule = parse_approach(text);
             if (!rule) throw CLI::ValidationError("--approach", rule.error());
             options->approach.push_back(*rule);
           }
         },
         "From which side focus was approached: near or far for all frames, near=FOLDER or far=FOLDER for those of a "
         "folder or a file; may be given again. Default: not known.")
      ->type_name("SIDE[=PATH]")
      ->allow_extra_args(false);
  app.add_option("--series", options->report.kind,
                 "test: frames made to test the lens; ordinary: any others, which give a finding from 20 acts of "
                 "focusing on. Default: test where every aim lies on the surface, at one distance and within four "
                 "hours.")
      ->transform(CLI::CheckedTransformer(std::map<std::string, SeriesKind>{{"test", SeriesKind::test_series},
                                                                           {"ordinary", SeriesKind::ordinary_frames}})
                      .description(""))
      ->type_name("KIND");
  app.add_option("--plot", options->plot,
                 "File for a plot (SVG) of every frame's defocus with its interval, group by group. Default: none.")
      ->type_name("FILE");
  add_bench_options(app, *options);
  app.add_option("--workers", options->request.workers, "Frames measured at a time. Default: one for each core.")
      ->check(CLI::Range(1, 256).description(""))
      ->type_name("COUNT");
  add_value_options(app, options->request.values);
  add_settings_options(app, options->request.settings);
  return [options] {
    options->request.values.tiles = options->flat;
    return LensRun(*options).run();
  };
}

}  // namespace focusfall
