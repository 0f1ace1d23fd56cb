#include "src/commands/help_text.h"

#include <fmt/format.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <string>
#include <vector>

#include "src/output/data_stream.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr int kTextColumns = 100;      // no wider: longer lines are hard to read (judgement)
constexpr int kNameColumns = 30;       // two blanks, the option, two blanks

class HelpFormatter final : public CLI::FormatterBase {
 public:
  std::string make_help(const CLI::App* app, std::string, CLI::AppFormatMode) const override {
    const int columns = std::min(terminal_columns(STDOUT_FILENO), kTextColumns);
    std::string text = folded(app->get_description(), columns, 0);
    text += "\nUsage: " + usage(*app) + "\n";
    for (const CLI::App* command : app->get_subcommands(nullptr)) {
      if (text.find("\nCommands\n") == std::string::npos) text += "\nCommands\n";
      text += entry(command->get_name(), command->get_description(), columns);
    }
    text += positionals(*app, columns) + groups(*app, columns);
    if (!app->get_footer().empty()) text += "\n" + folded(app->get_footer(), columns, 0);
    return text;
  }

 private:
  // Each line of the text on its own; a line keeps the blanks it starts with.
  static std::string folded(const std::string& text, int columns, int indent) {
    std::string result;
    for (std::size_t start = 0; start <= text.size();) {
      const std::size_t end = std::min(text.find('\n', start), text.size());
      const std::string line = text.substr(start, end - start);
      const std::size_t blanks = std::min(line.find_first_not_of(' '), line.size());
      const int inner = indent + static_cast<int>(blanks);
      result += std::string(blanks, ' ') + wrapped(line.substr(blanks), columns - static_cast<int>(blanks), inner) + "\n";
      start = end + 1;
    }
    return result;
  }

  static std::string entry(const std::string& name, const std::string& help, int columns) {
    std::string text = padded("  " + name, kNameColumns);
    if (text_columns(text) > kNameColumns) text += "\n" + std::string(kNameColumns, ' ');
    std::string body = wrapped(help, columns - kNameColumns, 0);
    for (std::size_t at = body.find('\n'); at != std::string::npos; at = body.find('\n', at + 1)) {
      body.insert(at + 1, kNameColumns, ' ');
    }
    return text + body + "\n";
  }

  static std::string usage(const CLI::App& app) {
    std::string text = app.get_name();
    for (const CLI::App* parent = app.get_parent(); parent != nullptr; parent = parent->get_parent()) {
      text = parent->get_name() + " " + text;
    }
    if (!app.get_subcommands(nullptr).empty()) return text + " COMMAND [OPTIONS] FILE...";
    text += " [OPTIONS]";
    for (const CLI::Option* option : app.get_options()) {
      if (!option->get_positional()) continue;
      text += " " + option->get_type_name() + (option->get_expected_max() > 1 ? "..." : "");
    }
    return text;
  }

  static std::string positionals(const CLI::App& app, int columns) {
    std::string text;
    for (const CLI::Option* option : app.get_options()) {
      if (option->get_positional()) text += entry(option->get_type_name(), option->get_description(), columns);
    }
    return text.empty() ? text : "\nFiles\n" + text;
  }

  static std::string groups(const CLI::App& app, int columns) {
    std::string text;
    std::vector<std::string> names = app.get_groups();
    for (const std::string& group : names) {
      std::string entries;
      for (const CLI::Option* option : app.get_options()) {
        if (option->get_positional() || option->get_group() != group || group.empty()) continue;
        std::string name = option->get_name(false, true);
        std::ranges::replace(name, ',', ' ');
        if (option->get_expected_max() > 0 && !option->get_type_name().empty()) name += " " + option->get_type_name();
        entries += entry(name, option->get_description(), columns);
      }
      if (!entries.empty()) text += "\n" + group + "\n" + entries;
    }
    return text;
  }
};

}  // namespace

std::shared_ptr<CLI::FormatterBase> help_formatter() { return std::make_shared<HelpFormatter>(); }

}  // namespace focusfall
