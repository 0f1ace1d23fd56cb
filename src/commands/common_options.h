// Options that several commands share, bound to the structs that the pipeline takes.
#pragma once

#include <string>
#include <vector>

#include "src/pipeline/inputs.h"
#include "src/pipeline/options.h"
#include "src/pipeline/settings.h"

namespace CLI {
class App;
}

namespace focusfall {

struct SettingsChoice {
  std::string file;      // empty: the default place
  bool none = false;
};

enum class Format { text, json, csv };

// FILE..., with the words on folders and lists.
void add_input_argument(CLI::App& app, std::vector<std::string>& inputs, bool required);

// Every row of value_options(), by group, and --trust-centre.
void add_value_options(CLI::App& app, UserValues& values);

void add_settings_options(CLI::App& app, SettingsChoice& choice);

// --format with the formats that the command has.
void add_format_option(CLI::App& app, Format& format, const std::vector<Format>& offered);

// Throws WrongUse with the file and the line of what is wrong.
Settings load_settings(const SettingsChoice& choice);

// Throws WrongUse where a list cannot be read. Says on standard error what was passed over.
Inputs load_inputs(const std::vector<std::string>& arguments);

}  // namespace focusfall
