// What every command gives to main: a name, a line of help, and how it joins the command line.
#pragma once

#include <atomic>
#include <functional>
#include <span>
#include <stdexcept>

namespace CLI {
class App;
}

namespace focusfall {

enum class ExitCode {
  done = 0,             // misses and `no evidence` included
  frames_missing = 1,   // some frames could not be done
  wrong_use = 2,        // unknown option, missing value, bad settings
  broken_off = 3,       // the run could not go on
  interrupted = 130,
};

// A value that is needed and was not given, or one that cannot be. main prints the message and returns wrong_use.
struct WrongUse : std::runtime_error {
  using std::runtime_error::runtime_error;
};

struct Command {
  const char* name;
  const char* summary;
  // Adds the options to `app`; what it returns runs the command after they have been read.
  std::function<ExitCode()> (*add)(CLI::App& app);
};

// All commands, in the order of the help. A new command is one file and one line of command.cpp.
std::span<const Command> commands();

std::function<ExitCode()> add_check(CLI::App& app);
std::function<ExitCode()> add_exposure(CLI::App& app);
std::function<ExitCode()> add_lens(CLI::App& app);
std::function<ExitCode()> add_predict(CLI::App& app);
std::function<ExitCode()> add_report(CLI::App& app);

// Set by the first interrupt; frames begun are finished, no other is begun. A second interrupt ends the program.
const std::atomic<bool>& interrupted();
void install_interrupt_handler();

}  // namespace focusfall
