#include "src/pipeline/settings.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <initializer_list>
#include <iterator>
#include <string_view>
#include <system_error>
#include <toml++/toml.h>
#include <utility>

namespace focusfall {
namespace {

// A value that cannot be, with the line where it stands. Caught in read_settings().
struct BadSetting {
  unsigned line = 0;
  std::string message;
};

[[noreturn]] void refuse(const toml::node& node, std::string message) {
  throw BadSetting{.line = node.source().begin.line, .message = std::move(message)};
}

// "pixel_pitch" is the settings' spelling of --pixel-pitch.
std::string option_name(std::string_view key) {
  std::string name(key);
  std::ranges::replace(name, '_', '-');
  return name;
}

// Numbers and texts are read alike, so that `f_number = 2.8` and `pixel_pitch = "4.3um"` go the way of the command line.
std::string as_text(std::string_view key, const toml::node& node) {
  if (const auto text = node.value_exact<std::string>()) return *text;
  if (node.is_number()) return fmt::format("{}", *node.value<double>());
  refuse(node, fmt::format("{} should be a number or a text with a unit", key));
}

bool as_switch(std::string_view key, const toml::node& node) {
  if (const auto value = node.value_exact<bool>()) return *value;
  refuse(node, fmt::format("{} should be true or false", key));
}

std::string as_name(std::string_view key, const toml::node& node) {
  if (const auto text = node.value_exact<std::string>(); text && !text->empty()) return *text;
  refuse(node, fmt::format("{} should be a text in quotes", key));
}

// A bare number is a value without an interval.
Interval as_interval(std::string_view key, const toml::node& node) {
  if (node.is_number()) {
    const double value = *node.value<double>();
    if (std::isfinite(value)) return {.value = value, .low = value, .high = value};
  }
  if (const auto* array = node.as_array(); array != nullptr && array->size() == 3) {
    const auto low = (*array)[0].value<double>(), value = (*array)[1].value<double>(),
               high = (*array)[2].value<double>();
    if (low && value && high && std::isfinite(*low) && std::isfinite(*high) && *low <= *value && *value <= *high) {
      return {.value = *value, .low = *low, .high = *high};
    }
  }
  refuse(node, fmt::format("{} should be a number or [low, value, high]", key));
}

// True where `key` is one of the values that the command line knows too, and may stand in this table.
bool take_value(UserValues& values, std::string_view key, const toml::node& node,
                std::initializer_list<std::string_view> allowed) {
  // A key is spelled with underscores only.
  if (key.find('-') != std::string_view::npos) return false;
  const std::string name = option_name(key);
  if (allowed.size() != 0 && std::ranges::find(allowed, name) == allowed.end()) return false;
  const auto options = value_options();
  const auto option = std::ranges::find(options, std::string_view(name), &ValueOption::name);
  if (option == options.end()) return false;
  if (const auto result = option->set(values, as_text(key, node)); !result) {
    refuse(node, fmt::format("{}: {}", key, result.error()));
  }
  return true;
}

[[noreturn]] void refuse_key(const toml::key& key, std::string_view table) {
  throw BadSetting{.line = key.source().begin.line, .message = fmt::format("unknown key {} in {}", key.str(), table)};
}

void read_defaults(const toml::table& table, Settings& settings) {
  for (const auto& [key, node] : table) {
    if (key == "override") {
      settings.override_file = as_switch(key, node);
    } else if (key == "trust_centre") {
      settings.defaults.trust_centre = as_switch(key, node);
    } else if (!take_value(settings.defaults, key.str(), node, {})) {
      refuse_key(key, "[defaults]");
    }
  }
}

BodySettings read_body(const toml::table& table) {
  BodySettings body;
  for (const auto& [key, node] : table) {
    if (key == "serial") {
      body.serial = as_name(key, node);
    } else if (key == "model") {
      body.model = as_name(key, node);
    } else if (key == "override") {
      body.override_file = as_switch(key, node);
    } else if (key == "baseline_px2") {
      body.baseline_px2 = as_interval(key, node);
    } else if (key == "clock_offset_s") {
      const auto offset = node.value<double>();
      if (!node.is_number() || !std::isfinite(*offset)) refuse(node, "clock_offset_s should be a number of seconds");
      body.clock_offset_s = *offset;
    } else if (!take_value(body.values, key.str(), node, {"pixel-pitch", "sensor"})) {
      refuse_key(key, "[[body]]");
    }
  }
  if (!body.serial && !body.model) refuse(table, "a [[body]] needs a serial or a model");
  return body;
}

LensSettings read_lens(const toml::table& table) {
  LensSettings lens;
  for (const auto& [key, node] : table) {
    if (key == "serial") {
      lens.serial = as_name(key, node);
    } else if (key == "model") {
      lens.model = as_name(key, node);
    } else if (key == "override") {
      lens.override_file = as_switch(key, node);
    } else if (!take_value(lens.values, key.str(), node,
                           {"focal-length", "f-number", "focus-distance", "teleconverter", "transmittance",
                            "pupil-magnification"})) {
      refuse_key(key, "[[lens]]");
    }
  }
  if (!lens.serial && !lens.model) refuse(table, "a [[lens]] needs a serial or a model");
  return lens;
}

// Runs `read` on each table of an array of tables.
template <class Read>
void each_table(std::string_view name, const toml::node& node, Read read) {
  const auto* array = node.as_array();
  if (array == nullptr) refuse(node, fmt::format("{0} should be written [[{0}]]", name));
  for (const toml::node& element : *array) {
    const auto* table = element.as_table();
    if (table == nullptr) refuse(element, fmt::format("{0} should be written [[{0}]]", name));
    read(*table);
  }
}

Settings settings_from(const toml::table& document) {
  Settings settings;
  for (const auto& [key, node] : document) {
    if (key == "defaults") {
      const auto* table = node.as_table();
      if (table == nullptr) refuse(node, "defaults should be written [defaults]");
      read_defaults(*table, settings);
    } else if (key == "body") {
      each_table("body", node, [&](const toml::table& table) { settings.bodies.push_back(read_body(table)); });
    } else if (key == "lens") {
      each_table("lens", node, [&](const toml::table& table) { settings.lenses.push_back(read_lens(table)); });
    } else {
      refuse_key(key, "the file; known are [defaults], [[body]], [[lens]]");
    }
  }
  return settings;
}

}  // namespace

tl::expected<Settings, SettingsError> read_settings(const std::string& path) {
  const auto failed = [&path](unsigned line, std::string_view message) {
    return tl::make_unexpected(SettingsError{line > 0 ? fmt::format("{}:{}: {}", path, line, message)
                                                      : fmt::format("{}: {}", path, message)});
  };
  std::error_code error;
  if (!std::filesystem::is_regular_file(path, error)) return failed(0, "there is no such settings file");
  std::ifstream file(path, std::ios::binary);
  if (!file) return failed(0, "the settings file cannot be read");
  const std::string text{std::istreambuf_iterator<char>(file), {}};
  try {
    Settings settings = settings_from(toml::parse(text, path));
    settings.path = path;
    return settings;
  } catch (const BadSetting& bad) {
    return failed(bad.line, bad.message);
  } catch (const toml::parse_error& bad) {
    return failed(bad.source().begin.line, bad.description());
  }
}

std::string default_settings_path() {
  // The XDG base directory specification: a relative path is to be ignored.
  if (const char* config = std::getenv("XDG_CONFIG_HOME"); config != nullptr && config[0] == '/') {
    return std::string(config) + "/focusfall/settings.toml";
  }
  if (const char* home = std::getenv("HOME"); home != nullptr && home[0] == '/') {
    return std::string(home) + "/.config/focusfall/settings.toml";
  }
  return {};
}

tl::expected<Settings, SettingsError> read_default_settings() {
  const std::string path = default_settings_path();
  std::error_code error;
  if (path.empty() || !std::filesystem::exists(path, error)) return Settings{};
  return read_settings(path);
}

}  // namespace focusfall
