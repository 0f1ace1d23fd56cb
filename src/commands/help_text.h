// The text of --help: folded to the terminal, options in their groups, every one with its unit and default.
#pragma once

#include <memory>

namespace CLI {
class App;
class FormatterBase;
}  // namespace CLI

namespace focusfall {

// For the program and, inherited, for its commands.
std::shared_ptr<CLI::FormatterBase> help_formatter();

}  // namespace focusfall
