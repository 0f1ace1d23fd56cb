// The program: finds the command, reads its options, turns what went wrong into an exit code.
#include <fcntl.h>
#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <clocale>
#include <csignal>
#include <exception>
#include <filesystem>
#include <string>
#include <system_error>
#include <vector>

#include "metadata/read_capture.h"
#include "src/commands/command.h"
#include "src/commands/help_text.h"
#include "src/output/data_stream.h"
#include "src/output/progress.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr const char* kAbout =
    "Focusfall predicts each shot from its own capture data with the thin-lens, f-number and exposure model, measures "
    "the pixels, and compares the two.";

constexpr const char* kFooter =
    "A bare file or folder runs check. focusfall COMMAND --help says more.\n\n"
    "Exit codes: 0 done, 1 some frames could not be done, 2 wrong use, 3 the run could not go on, 130 interrupted.";

bool is_command(const std::string& word) {
  return std::ranges::any_of(commands(), [&word](const Command& command) { return word == command.name; });
}

std::string command_names() {
  std::string names;
  for (const Command& command : commands()) names.append(names.empty() ? "" : ", ").append(command.name);
  return names;
}

// "focusfall FOLDER" and "focusfall FILE" mean check; what was chosen is said.
void put_implied_command(std::vector<std::string>& arguments) {
  if (arguments.empty()) throw WrongUse("a command or a photograph is needed; focusfall --help says more");
  if (arguments.front().starts_with('-') || is_command(arguments.front())) return;
  std::error_code error;
  const bool folder = std::filesystem::is_directory(arguments.front(), error);
  const bool list = arguments.front().starts_with('@');
  if (!folder && !list && !std::filesystem::exists(std::filesystem::symlink_status(arguments.front(), error))) {
    throw WrongUse(fmt::format("{} is neither a command ({}) nor a file that is there",
                               visible_text(arguments.front()), command_names()));
  }
  say(fmt::format("{} runs check.", folder ? "A bare folder" : list ? "A bare list" : "A bare file"));
  arguments.insert(arguments.begin(), "check");
}

// A descriptor that was closed before the start must not be given to the first file that is opened.
void open_standard_descriptors() {
  for (const int descriptor : {STDIN_FILENO, STDOUT_FILENO, STDERR_FILENO}) {
    if (fcntl(descriptor, F_GETFD) >= 0) continue;
    const int null = open("/dev/null", descriptor == STDIN_FILENO ? O_RDONLY : O_WRONLY);
    if (null >= 0 && null != descriptor) {
      dup2(null, descriptor);
      close(null);
    }
  }
}

// In our words, on one line.
std::string parse_error_text(const CLI::ParseError& error) {
  std::string text = error.what();
  if (dynamic_cast<const CLI::ExtrasError*>(&error) != nullptr) {
    text = "unknown option or word: " + text.substr(text.find(": ") + 2);
  } else if (dynamic_cast<const CLI::RequiredError*>(&error) != nullptr && text.find("subcommand") != text.npos) {
    text = "no command was given; known are " + command_names();
  }
  return visible_text(text);
}

ExitCode run(std::vector<std::string> arguments) {
  CLI::App app(kAbout, "focusfall");
  app.footer(kFooter);
  app.formatter(help_formatter());
  app.set_version_flag("--version", "focusfall " FOCUSFALL_VERSION);
  app.require_subcommand(1);
  std::function<ExitCode()> chosen;
  for (const Command& command : commands()) {
    CLI::App* sub = app.add_subcommand(command.name, command.summary);
    sub->callback([&chosen, action = command.add(*sub)] { chosen = action; });
  }

  put_implied_command(arguments);
  std::ranges::reverse(arguments);   // as CLI11 takes them
  try {
    app.parse(arguments);
  } catch (const CLI::Success& success) {
    // --help and --version: their text is data.
    DataStream out(STDOUT_FILENO);
    const auto subcommands = app.get_subcommands();
    const bool version = dynamic_cast<const CLI::CallForVersion*>(&success) != nullptr;
    out.write(version                 ? std::string(success.what()) + "\n"
              : subcommands.empty() ? app.help()
                                    : subcommands.front()->help());
    return ExitCode::done;
  } catch (const CLI::ParseError& error) {
    const auto subcommands = app.get_subcommands();
    throw WrongUse(fmt::format("{} (focusfall {}{}--help says more)", parse_error_text(error),
                               subcommands.empty() ? "" : subcommands.front()->get_name(),
                               subcommands.empty() ? "" : " "));
  }
  return chosen();
}

ExitCode run_guarded(const std::vector<std::string>& arguments) {
  try {
    return run(arguments);
  } catch (const WrongUse& error) {
    say(fmt::format("focusfall: {}", error.what()));
    return ExitCode::wrong_use;
  } catch (const std::exception& error) {
    say(fmt::format("focusfall: {}", visible_text(error.what())));
    return ExitCode::broken_off;
  }
}

}  // namespace
}  // namespace focusfall

int main(int argc, char** argv) {
  focusfall::open_standard_descriptors();
  std::setlocale(LC_CTYPE, "C.UTF-8");   // for the width of characters; numbers stay as in the C locale
  std::signal(SIGPIPE, SIG_IGN);
  focusfall::install_interrupt_handler();
  focusfall::initialise_capture_reading();
  return static_cast<int>(focusfall::run_guarded({argv + 1, argv + argc}));
}
