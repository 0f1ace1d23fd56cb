// What a person keeps in settings.toml: values that fill what a file does not say, for all frames, for one body, for
// one lens.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "analysis/conventions.h"
#include "src/pipeline/options.h"

namespace focusfall {

// [[body]]: chosen by serial number where given, else by the camera's name.
struct BodySettings {
  std::optional<std::string> serial;
  std::optional<std::string> model;              // as in `capture.camera`, compared without regard to case
  UserValues values;                             // pixel pitch and sensor size
  std::optional<Interval> baseline_px2;          // what the camera's processing adds to S
  std::optional<double> clock_offset_s;          // added to the time taken
  bool override_file = false;                    // `override = true`: wins over the file's metadata
};

// [[lens]]: chosen by serial number where given, else by the lens's name.
struct LensSettings {
  std::optional<std::string> serial;
  std::optional<std::string> model;
  UserValues values;                             // focal length, teleconverter, transmittance, pupil magnification
  bool override_file = false;
};

struct Settings {
  std::string path;                              // where it was read; empty: none
  UserValues defaults;                           // [defaults]
  bool override_file = false;                    // [defaults] override = true
  std::vector<BodySettings> bodies;
  std::vector<LensSettings> lenses;
};

// What is wrong with a settings file: "path:line: what was seen and what was expected".
struct SettingsError {
  std::string message;
};

// Reads one file. A missing file, bad TOML, an unknown key or a value that cannot be is an error.
tl::expected<Settings, SettingsError> read_settings(const std::string& path);

// $XDG_CONFIG_HOME/focusfall/settings.toml, or ~/.config/focusfall/settings.toml; empty where neither is known.
std::string default_settings_path();

// The default file where it exists, else empty settings.
tl::expected<Settings, SettingsError> read_default_settings();

}  // namespace focusfall
