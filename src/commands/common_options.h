// Options that several commands share, bound to the structs that the pipeline takes.
#pragma once

#include <CLI/CLI.hpp>
#include <string>
#include <utility>
#include <vector>

#include "src/pipeline/inputs.h"
#include "src/pipeline/options.h"
#include "src/pipeline/settings.h"

namespace focusfall {

struct SettingsChoice {
  std::string file;      // empty: the default place
  bool none = false;
};

enum class Format { text, json, csv };

// FILE..., with the words on folders and lists. `required` is for the help; load_inputs() asks for it.
void add_input_argument(CLI::App& app, std::vector<std::string>& inputs, bool required);

// Every row of value_options(), by group, and --trust-centre.
void add_value_options(CLI::App& app, UserValues& values);

void add_settings_options(CLI::App& app, SettingsChoice& choice);

// --format with the formats that the command has.
void add_format_option(CLI::App& app, Format& format, const std::vector<Format>& offered);

// An option that takes one of a few words. The error names them all.
template <class T>
CLI::Option* add_choice(CLI::App& app, const std::string& name, T& target,
                        const std::vector<std::pair<std::string, T>>& choices, const std::string& help);

// Throws WrongUse with the file and the line of what is wrong.
Settings load_settings(const SettingsChoice& choice);

// Throws WrongUse where there is nothing to read or a list cannot be read. Says on standard error what was passed over.
Inputs load_inputs(const std::vector<std::string>& arguments);

template <class T>
CLI::Option* add_choice(CLI::App& app, const std::string& name, T& target,
                        const std::vector<std::pair<std::string, T>>& choices, const std::string& help) {
  std::string words;
  for (const auto& choice : choices) words += (words.empty() ? "" : "|") + choice.first;
  const auto take = [&target, choices, name, words](const std::string& text) {
    for (const auto& [word, value] : choices) {
      if (text != word) continue;
      target = value;
      return;
    }
    throw CLI::ValidationError(name, "'" + text + "' is none of " + words);
  };
  return app.add_option_function<std::string>(name, take, help)->type_name(words);
}

}  // namespace focusfall
