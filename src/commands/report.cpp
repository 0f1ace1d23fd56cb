// `report`: one self-contained page that shows where focus fell in every frame of a shoot.
#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <memory>
#include <string>

#include "src/commands/command.h"
#include "src/commands/page_frames.h"
#include "src/output/data_stream.h"
#include "src/output/owned_file.h"
#include "src/output/page.h"
#include "src/output/progress.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

struct ReportOptions {
  PageInputOptions input;
  std::string output;
  std::string title;
};

ExitCode write_page(const std::string& path, const std::string& html) {
  if (path == "-") {
    DataStream out(STDOUT_FILENO);
    out.write(html);
    return ExitCode::done;
  }
  const OwnedFile file{.path = path, .is_ours = [](std::string_view start) { return start.starts_with(kPageStart); }};
  if (const auto written = write_owned_file(file, html); !written) {
    say(visible_text(path) + ": " + written.error());
    return ExitCode::broken_off;
  }
  say(fmt::format("Wrote {} ({:.1f} MB).", visible_text(path), static_cast<double>(html.size()) / 1e6));
  return ExitCode::done;
}

ExitCode run_report(const ReportOptions& options) {
  if (!page_is_built()) {
    throw WrongUse("this focusfall was built without Node, so it carries no page; the README says how to build with it");
  }
  PageInput input = load_page_input(options.input);
  if (interrupted()) return ExitCode::interrupted;
  const std::string title = options.title.empty() ? shoot_title(options.input.inputs) : options.title;
  const std::string html = page_html(input.frames, {.title = title, .version = FOCUSFALL_VERSION, .more = {}});
  if (const ExitCode code = write_page(options.output, html); code != ExitCode::done) return code;
  return input.not_done > 0 ? ExitCode::frames_missing : ExitCode::done;
}

}  // namespace

std::function<ExitCode()> add_report(CLI::App& app) {
  auto options = std::make_shared<ReportOptions>();
  app.add_option("-o,--output", options->output,
                 "The page to write, or - for standard output. A page that is there is replaced, any other file is not.")
      ->type_name("FILE")
      ->required();
  app.add_option("--title", options->title, "What the page is called. Default: the name of the folder.")
      ->type_name("TEXT");
  add_page_input_options(app, options->input);
  app.add_flag("!--no-pictures", options->input.pictures, "Leave the small pictures out. Default: off.");
  return [options] { return run_report(*options); };
}

}  // namespace focusfall
