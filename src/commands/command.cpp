#include "src/commands/command.h"

#include <csignal>

namespace focusfall {
namespace {

constexpr Command kCommands[] = {
    {"check", "Judge frames one by one: capture, predicted, measured, verdict.", add_check},
    {"exposure", "A set: clipping, level against the exposure that was set, the odd ones out, stops to pull back.",
     add_exposure},
    {"lens", "Front or back focus of a lens and body from many frames: bias, repeatability, trends.", add_lens},
    {"predict", "The model of a shot or a plan: depth of field, blur, diffraction, motion, exposure.", add_predict},
    {"report", "One page to look at: where focus fell in every frame of a shoot.", add_report},
};

std::atomic<bool> interrupt_flag{false};
static_assert(std::atomic<bool>::is_always_lock_free, "set from a signal handler");

void on_interrupt(int /*signal*/) { interrupt_flag = true; }

}  // namespace

std::span<const Command> commands() { return kCommands; }

const std::atomic<bool>& interrupted() { return interrupt_flag; }

void install_interrupt_handler() {
  struct sigaction action{};
  action.sa_handler = on_interrupt;
  action.sa_flags = static_cast<int>(SA_RESETHAND);   // the second one has its usual effect
  sigaction(SIGINT, &action, nullptr);
  sigaction(SIGTERM, &action, nullptr);
}

}  // namespace focusfall
