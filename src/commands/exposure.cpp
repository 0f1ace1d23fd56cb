// `exposure`: a set of frames, exposed as the f-number and the shutter predicted?
#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <map>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "src/commands/command.h"
#include "src/commands/common_options.h"
#include "src/output/data_stream.h"
#include "src/output/exposure_plot.h"
#include "src/output/exposure_report.h"
#include "src/output/frame_json.h"
#include "src/output/frame_text.h"
#include "src/output/owned_file.h"
#include "src/output/progress.h"
#include "src/output/sheet.h"
#include "src/output/visible_text.h"
#include "src/pipeline/exposure_input.h"
#include "src/pipeline/frame_pool.h"

namespace focusfall {
namespace {

struct ExposureCommandOptions {
  std::vector<std::string> inputs;
  UserValues values;
  SettingsChoice settings;
  Format format = Format::text;
  ExposureOptions audit;
  std::string plot;  // empty: none
  int workers = 0;   // 0: one a core
};

// What the audit does not need is not kept: a day's shoot is thousands of records.
void drop_what_is_not_needed(FrameRecord& record) {
  if (!record.measurement) return;
  record.measurement->tiles.reset();
}

// The audit of some of `count` frames, numbered as all of them are.
ExposureAudit renumbered(ExposureAudit audit, const std::vector<std::size_t>& numbers, std::size_t count) {
  std::vector<FrameExposure> frames(count);
  for (std::size_t i = 0; i < numbers.size(); ++i) frames[numbers[i]] = audit.frames[i];
  audit.frames = std::move(frames);
  const auto renumber = [&](std::vector<std::size_t>& list) {
    for (std::size_t& frame : list) frame = numbers[frame];
  };
  for (ExposureSet& set : audit.sets) {
    renumber(set.frames);
    renumber(set.tested);
    for (Bracket& bracket : set.brackets) renumber(bracket.frames);
  }
  return audit;
}

class ExposureRun {
 public:
  explicit ExposureRun(const ExposureCommandOptions& options) : options_(options) {}

  ExitCode run() {
    const Settings settings = load_settings(options_.settings);
    const Inputs inputs = load_inputs(options_.inputs);
    Progress progress(inputs.paths.size(), is_terminal(STDERR_FILENO));
    run_frames(inputs.paths, options_.values, settings, {.workers = options_.workers, .cancel = &interrupted()},
               [&](FrameRecord&& record) {
                 progress.clear();
                 keep(std::move(record));
                 progress.advance();
                 return true;
               });
    progress.clear();
    if (interrupted()) return ExitCode::interrupted;
    report();
    return not_done_ > 0 || !inputs.problems.empty() ? ExitCode::frames_missing : ExitCode::done;
  }

 private:
  void keep(FrameRecord&& record) {
    if (!record.done) {
      ++not_done_;
      say(visible_text(record.path) + ": " + failure_text(record));
    } else if (may_be_edited(*record.capture)) {
      record.issues.push_back({Stage::compare, "tone-edited",
                               fmt::format("the file names the software '{}', which may have changed its tone; levels "
                                           "are those of the edited picture",
                                           visible_text(record.capture->software->value))});
      ++edited_;
    }
    drop_what_is_not_needed(record);
    records_.push_back(std::move(record));
  }

  void report() {
    // Frames that could not be done belong to no set, but keep their line.
    std::vector<ExposureFrame> frames;
    std::vector<std::size_t> done;
    for (std::size_t i = 0; i < records_.size(); ++i) {
      if (!records_[i].done) continue;
      done.push_back(i);
      frames.push_back(exposure_frame(records_[i]));
    }
    ExposureAudit audit = renumbered(audit_exposure(frames, options_.audit), done, records_.size());
    if (edited_ > 0) {
      say(fmt::format("{} of {} frames name software that may have changed their tone.", edited_, done.size()));
    }
    const ExposureReport exposure{records_, std::move(audit), options_.audit};
    if (!options_.plot.empty()) write_plot(exposure);
    write(exposure);
  }

  void write_plot(const ExposureReport& exposure) {
    const OwnedFile file{.path = options_.plot, .first_bytes = kMarkBytes, .is_ours = [](std::string_view first_bytes) {
                           return is_marked_svg(first_bytes, kExposurePlotMark);
                         }};
    if (const auto written = write_owned_file(file, exposure_plot_svg(exposure)); !written) {
      throw WrongUse(fmt::format("--plot {}: {}", visible_text(options_.plot), written.error()));
    }
  }

  void write(const ExposureReport& exposure) {
    switch (options_.format) {
      case Format::json:
        for (std::size_t i = 0; i < exposure.records.size(); ++i) out_.write(json_line(exposure_frame_json(exposure, i)));
        for (std::size_t s = 0; s < exposure.audit.sets.size(); ++s) out_.write(json_line(exposure_set_json(exposure, s)));
        return;
      case Format::csv:
        out_.write(exposure_csv_header());
        for (std::size_t i = 0; i < exposure.records.size(); ++i) out_.write(exposure_csv_line(exposure, i));
        return;
      case Format::text: break;
    }
    int longest = 0;
    for (const FrameRecord& record : exposure.records) {
      longest = std::max(longest, text_columns(visible_text(record.path)));
    }
    const TextLayout layout = text_layout(terminal_columns(STDOUT_FILENO), longest);
    for (std::size_t s = 0; s < exposure.audit.sets.size(); ++s) out_.write(exposure_set_text(exposure, s, layout));
  }

  const ExposureCommandOptions& options_;
  DataStream out_{STDOUT_FILENO};
  std::vector<FrameRecord> records_;
  std::size_t not_done_ = 0, edited_ = 0;
};

}  // namespace

std::function<ExitCode()> add_exposure(CLI::App& app) {
  auto options = std::make_shared<ExposureCommandOptions>();
  add_input_argument(app, options->inputs, true);
  add_format_option(app, options->format, {Format::text, Format::json, Format::csv});
  app.add_option("--plot", options->plot,
                 "SVG file to draw level against exposure and the error of every f-number in. Default: none. A plot of "
                 "an earlier run is replaced, anything else is kept.")
      ->type_name("FILE");
  constexpr const char* kGroup = "The set";
  app.add_flag("--same-light", options->audit.same_light,
               "All frames of a body show one scene under one light; frames that do not record exposure mode or flash "
               "count as manual and without. Default: off; sets are found by time and likeness.")
      ->group(kGroup);
  app.add_option("--clip-limit", options->audit.clip_limit,
                 "Fraction of the aim or the frame that may clip, 0..1. Default: 0.001.")
      ->check(CLI::Range(1e-6, 0.5).description(""))
      ->type_name("FRACTION")
      ->group(kGroup);
  app.add_option("--level", options->values.level,
                 "How much of a frame is measured beside its levels: full or aim-only. Default: full, as for check.")
      ->transform(CLI::CheckedTransformer(std::map<std::string, MeasureLevel>{{"full", MeasureLevel::full},
                                                                             {"aim-only", MeasureLevel::aim_only}})
                      .description(""))
      ->type_name("LEVEL");
  app.add_option("--workers", options->workers, "Frames measured at a time. Default: one for each core.")
      ->check(CLI::Range(1, 256).description(""))
      ->type_name("COUNT");
  add_value_options(app, options->values);
  add_settings_options(app, options->settings);
  return [options] { return ExposureRun(*options).run(); };
}

}  // namespace focusfall
