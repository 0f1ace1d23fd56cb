// `check`: every frame on its own, capture -> predicted -> measured -> verdict.
#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <array>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "src/commands/command.h"
#include "src/commands/common_options.h"
#include "src/output/csv.h"
#include "src/output/data_stream.h"
#include "src/output/frame_json.h"
#include "src/output/frame_text.h"
#include "src/output/names.h"
#include "src/output/overlay_folder.h"
#include "src/output/progress.h"
#include "src/output/visible_text.h"
#include "src/pipeline/frame_pool.h"

namespace focusfall {
namespace {

struct CheckOptions {
  std::vector<std::string> inputs;
  UserValues values;
  SettingsChoice settings;
  Format format = Format::text;
  bool brief = false;            // one line a frame
  bool tiles = false;            // the tile map in the JSON
  std::string overlay;           // folder for pictures; empty: none
  int workers = 0;               // 0: one a core
};

// What came out, counted for the closing line.
struct Tally {
  std::size_t frames = 0;
  std::size_t not_done = 0;
  std::size_t not_drawn = 0;            // overlays that could not be written
  std::array<std::size_t, 6> focus{};   // by FocusVerdict
};

std::string tally_text(const Tally& tally) {
  std::string text = fmt::format("{} frames", tally.frames);
  const char* separator = ": ";
  for (const auto& entry : names_of<FocusVerdict>()) {
    const std::size_t count = tally.focus[static_cast<std::size_t>(entry.value)];
    if (count == 0) continue;
    text += fmt::format("{}{} {}", separator, count, entry.name);
    separator = ", ";
  }
  if (tally.not_done > 0) text += fmt::format("{}{} could not be done", separator, tally.not_done);
  return text + ".";
}

class CheckRun {
 public:
  explicit CheckRun(const CheckOptions& options) : options_(options) {}

  ExitCode run() {
    const Settings settings = load_settings(options_.settings);
    const Inputs inputs = load_inputs(options_.inputs);
    layout_ = text_layout(terminal_columns(STDOUT_FILENO), longest_name(inputs.paths));
    layout_.bold = bold_is_wanted(STDOUT_FILENO);
    if (!options_.overlay.empty()) open_overlays(inputs.paths);
    if (options_.format == Format::csv) out_.write(csv_header());

    Progress progress(inputs.paths.size(), is_terminal(STDERR_FILENO));
    const PoolOutcome outcome =
        run_frames(inputs.paths, options_.values, settings, {.workers = options_.workers, .cancel = &interrupted()},
                   [&](FrameRecord&& record) { return deliver(record, progress); });
    progress.clear();
    if (options_.format == Format::text && tally_.frames > 1 && !out_.closed()) say(tally_text(tally_));
    if (interrupted()) return ExitCode::interrupted;
    static_cast<void>(outcome);
    const bool all_done = tally_.not_done == 0 && tally_.not_drawn == 0 && inputs.problems.empty();
    return !all_done ? ExitCode::frames_missing : ExitCode::done;
  }

 private:
  static int longest_name(const std::vector<std::string>& paths) {
    int longest = 0;
    for (const std::string& path : paths) {
      longest = std::max(longest, text_columns(visible_text(path.substr(path.find_last_of('/') + 1))));
    }
    return longest;
  }

  void open_overlays(const std::vector<std::string>& inputs) {
    try {
      overlays_.emplace(options_.overlay, inputs);
    } catch (const std::exception& error) {
      throw WrongUse(fmt::format("--overlay: {}", visible_text(error.what())));
    }
  }

  void draw(const FrameRecord& record) {
    if (!overlays_ || !record.done) return;
    if (const auto drawn = overlays_->write(record); !drawn) {
      ++tally_.not_drawn;
      say(drawn.error());
    }
  }

  // False once nobody reads any more.
  bool deliver(const FrameRecord& record, Progress& progress) {
    ++tally_.frames;
    progress.clear();
    if (!record.done) {
      ++tally_.not_done;
      say(visible_text(record.path) + ": " + failure_text(record));
    } else if (record.verdict) {
      ++tally_.focus[static_cast<std::size_t>(record.verdict->focus)];
    }
    draw(record);
    const bool open = out_.write(text_of(record));
    progress.advance();
    return open;
  }

  std::string text_of(const FrameRecord& record) {
    switch (options_.format) {
      case Format::json: return json_line(frame_json(record, {.tiles = options_.tiles}));
      case Format::csv: return csv_line(record);
      case Format::text: break;
    }
    return options_.brief ? brief_lines(record) : frame_text(record, layout_);
  }

  // A brief line under the heading of its folder, which stands once for all that follow in it.
  std::string brief_lines(const FrameRecord& record) {
    std::string text;
    if (tally_.frames == 1) text += brief_heading(layout_);
    if (const std::string folder = folder_heading(record.path, layout_); folder != folder_) {
      folder_ = folder;
      text += folder;
    }
    return text + brief_text(record, layout_);
  }

  const CheckOptions& options_;
  DataStream out_{STDOUT_FILENO};
  TextLayout layout_;
  Tally tally_;
  std::string folder_;           // heading of the last brief line
  std::optional<OverlayFolder> overlays_;
};

}  // namespace

constexpr const char* kExamples =
    "Examples\n"
    "  focusfall check boat.jpg\n"
    "  focusfall check --brief shoot/\n"
    "  focusfall check --aim 0.4,0.3,0.1,0.15 --overlay pictures boat.jpg\n"
    "  focusfall check --format json shoot/ > frames.jsonl";

std::function<ExitCode()> add_check(CLI::App& app) {
  app.footer(kExamples);
  auto options = std::make_shared<CheckOptions>();
  add_input_argument(app, options->inputs, true);
  add_format_option(app, options->format, {Format::text, Format::json, Format::csv});
  app.add_flag("--brief", options->brief, "Text with one line a frame. Default: a paragraph.");
  app.add_flag("--tiles", options->tiles, "Put the map of blur over the frame into the JSON. Default: off.");
  app.add_option("--overlay", options->overlay,
                 "Folder for a picture of each frame (PNG, long side at most 1600 px): contours of blur, aim, line of best "
                 "focus, motion, clipped parts. Default: none.")
      ->type_name("DIR");
  add_choice<MeasureLevel>(app, "--level", options->values.level,
                           {{"full", MeasureLevel::full}, {"aim-only", MeasureLevel::aim_only}},
                           "How much of a frame is measured; aim-only is about three times as fast and tells no side. "
                           "Default: full.");
  app.add_option("--workers", options->workers, "Frames measured at a time. Default: one for each core.")
      ->check(CLI::Range(1, 256).description(""))
      ->type_name("COUNT");
  add_value_options(app, options->values);
  add_settings_options(app, options->settings);
  return [options] {
    options->values.tiles = options->tiles || !options->overlay.empty();
    return CheckRun(*options).run();
  };
}

}  // namespace focusfall
