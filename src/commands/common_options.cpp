#include "src/commands/common_options.h"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <iostream>
#include <map>
#include <utility>

#include "src/commands/command.h"
#include "src/output/progress.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

const char* group_title(ValueOption::Group group) {
  switch (group) {
    case ValueOption::Group::shot: return "The shot (command line, then the file, then the settings)";
    case ValueOption::Group::motion: return "Motion and flash";
    case ValueOption::Group::blur: return "How much blur is too much";
    case ValueOption::Group::place: return "Where it counts";
    case ValueOption::Group::picture: return "The picture";
  }
  return "Options";
}

std::string counted(std::size_t count, const char* one, const char* many) {
  return fmt::format("{} {}", count, count == 1 ? one : many);
}

// What a walk through folders passed over, as one line.
std::string passed_over(const Inputs& inputs) {
  std::string text;
  const auto add = [&text](std::size_t count, const char* one, const char* many) {
    if (count == 0) return;
    text += (text.empty() ? "" : ", ") + counted(count, one, many);
  };
  add(inputs.other_files, "file of another type", "files of other types");
  add(inputs.hidden, "hidden entry", "hidden entries");
  add(inputs.folder_links, "link to a folder", "links to folders");
  add(inputs.repeats, "file met twice", "files met twice");
  return text;
}

}  // namespace

void add_input_argument(CLI::App& app, std::vector<std::string>& inputs, bool required) {
  app.add_option("files", inputs,
                 "Photographs and folders; @LIST or @- for a list of paths, one a line or separated by NUL; ./@x for a "
                 "name that starts with @.")
      ->type_name(required ? "FILE" : "[FILE]");
}

void add_value_options(CLI::App& app, UserValues& values) {
  for (const ValueOption& row : value_options()) {
    const std::string name = "--" + std::string(row.name);
    app.add_option_function<std::string>(
           name,
           [&values, &row, name](const std::string& text) {
             if (const auto result = row.set(values, text); !result) throw CLI::ValidationError(name, result.error());
           },
           std::string(row.help))
        ->type_name(std::string(row.placeholder))
        ->group(group_title(row.group));
  }
  app.add_flag("--trust-centre", values.trust_centre,
               "Judge the centre of the frame as if it had been named. Default: off; a bare centre gives only on, "
               "unsure or no evidence.")
      ->group(group_title(ValueOption::Group::place));
}

void add_settings_options(CLI::App& app, SettingsChoice& choice) {
  constexpr const char* kGroup = "Settings";
  auto* file = app.add_option("--settings", choice.file,
                              "Settings file (TOML). Default: $XDG_CONFIG_HOME/focusfall/settings.toml, if there.");
  file->type_name("FILE")->group(kGroup);
  app.add_flag("--no-settings", choice.none, "Read no settings file. Default: off.")->group(kGroup)->excludes(file);
}

void add_format_option(CLI::App& app, Format& format, const std::vector<Format>& offered) {
  std::vector<std::pair<std::string, Format>> names;
  for (const Format one : offered) {
    names.emplace_back(one == Format::text ? "text" : one == Format::json ? "json" : "csv", one);
  }
  add_choice(app, "--format", format, names,
             "Form of the data on standard output; json is one object a line. Default: text.");
}

Settings load_settings(const SettingsChoice& choice) {
  if (choice.none) return {};
  auto settings = choice.file.empty() ? read_default_settings() : read_settings(choice.file);
  if (!settings) throw WrongUse(settings.error().message);
  return std::move(*settings);
}

Inputs load_inputs(const std::vector<std::string>& arguments) {
  // Asked here and not of the parser: a mistyped option is the better message.
  if (arguments.empty()) throw WrongUse("a photograph or a folder is needed");
  auto inputs = find_inputs(arguments, std::cin);
  if (!inputs) throw WrongUse(inputs.error().message);
  if (const std::string text = passed_over(*inputs); !text.empty()) say("Passed over: " + text + ".");
  for (const std::string& problem : inputs->problems) say(visible_text(problem));
  return std::move(*inputs);
}

}  // namespace focusfall
