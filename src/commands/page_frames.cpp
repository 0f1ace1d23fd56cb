#include "src/commands/page_frames.h"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <atomic>
#include <filesystem>
#include <fstream>
#include <string_view>
#include <thread>
#include <unistd.h>
#include <utility>

#include "src/commands/command.h"
#include "src/decode/preview.h"
#include "src/output/base64.h"
#include "src/output/data_stream.h"
#include "src/output/frame_json.h"
#include "src/output/frame_text.h"
#include "src/output/progress.h"
#include "src/output/visible_text.h"
#include "src/pipeline/frame_pool.h"
#include "src/pipeline/read_file.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

// Records of `check` start with a brace; no photograph does.
bool holds_records(const std::string& argument) {
  std::error_code error;
  if (argument.empty() || argument.front() == '@' || !std::filesystem::is_regular_file(argument, error)) return false;
  std::ifstream file(argument, std::ios::binary);
  return file.get() == '{';
}

// The bytes of the name, also where the record had to replace some of them.
std::string path_of(const Json& record) {
  if (const auto bytes = record.find("path_bytes"); bytes != record.end() && bytes->is_string()) {
    if (auto path = bytes_of_base64(bytes->get<std::string>())) return *path;
  }
  const auto path = record.find("path");
  return path != record.end() && path->is_string() ? path->get<std::string>() : std::string();
}

// Reads JSON Lines; what is no record is said with its line.
void read_records(const std::string& path, PageInput& input) {
  std::ifstream file(path, std::ios::binary);
  std::string line;
  for (int number = 1; std::getline(file, line); ++number) {
    if (line.find_first_not_of(" \t\r") == std::string::npos) continue;
    Json object = Json::parse(line, nullptr, false);
    std::string problem = "is no JSON object; expected a record of `check --format json`";
    if (object.is_object()) {
      if (const auto record = frame_record_from_json(object); record) {
        input.frames.push_back({std::move(object), {}});
        continue;
      } else {
        problem = record.error();
      }
    }
    ++input.not_done;
    say(fmt::format("{}: line {}: {}", visible_text(path), number, visible_text(problem)));
  }
}

void measure(const std::vector<std::string>& arguments, const PageInputOptions& options, PageInput& input) {
  const Settings settings = load_settings(options.settings);
  const Inputs inputs = load_inputs(arguments);
  input.not_done += inputs.problems.size();
  UserValues values = options.values;
  values.tiles = true;
  Progress progress(inputs.paths.size(), is_terminal(STDERR_FILENO));
  run_frames(inputs.paths, values, settings, {.workers = options.workers, .cancel = &interrupted()},
             [&](FrameRecord&& record) {
               if (!record.done) {
                 ++input.not_done;
                 progress.clear();
                 say(visible_text(record.path) + ": " + failure_text(record));
               }
               input.frames.push_back({frame_json(record, {.tiles = true}), {}});
               progress.advance();
               return true;
             });
}

double number_at(const Json& object, const char* key) {
  const auto found = object.find(key);
  return found != object.end() && found->is_number() ? found->get<double>() : 0;
}

PreviewOptions preview_options(const Json& record) {
  PreviewOptions options;
  if (const auto aim = record.find("aim"); aim != record.end() && aim->is_object()) {
    options.aim = {number_at(*aim, "x"), number_at(*aim, "y"), number_at(*aim, "width"), number_at(*aim, "height")};
  }
  if (const auto capture = record.find("capture"); capture != record.end() && capture->is_object()) {
    if (const double orientation = number_at(*capture, "orientation"); orientation >= 1 && orientation <= 8) {
      options.orientation = static_cast<int>(orientation);
    }
  }
  return options;
}

// A frame whose file is gone, or is none any more, keeps its numbers and has no picture.
void make_pictures(PageFrame& frame, FileBuffer& buffer) {
  if (!read_file(path_of(frame.record), buffer)) return;
  try {
    if (auto previews = make_previews(buffer.bytes(), preview_options(frame.record))) {
      frame.pictures = {std::move(previews->whole), std::move(previews->aim)};
    }
  } catch (const std::exception&) {
    frame.pictures = {};   // memory that ran out on one large picture
  }
}

void make_all_pictures(PageInput& input, int workers) {
  std::atomic<std::size_t> next{0};
  const auto work = [&] {
    FileBuffer buffer;
    for (std::size_t i = next++; i < input.frames.size() && !interrupted(); i = next++) {
      make_pictures(input.frames[i], buffer);
    }
  };
  const int count = workers > 0 ? workers : static_cast<int>(std::max(1U, std::thread::hardware_concurrency()));
  std::vector<std::jthread> threads;
  for (int i = 0; i < count; ++i) threads.emplace_back(work);
}

}  // namespace

void add_page_input_options(CLI::App& app, PageInputOptions& options) {
  app.add_option("files", options.inputs,
                 "Photographs and folders, or files of records as `check --format json --tiles` writes them; @LIST or "
                 "@- for a list of paths.")
      ->type_name("FILE")
      ->required();
  app.add_option("--workers", options.workers, "Frames measured at a time. Default: one for each core.")
      ->check(CLI::Range(1, 256).description(""))
      ->type_name("COUNT");
  add_value_options(app, options.values);
  add_settings_options(app, options.settings);
}

PageInput load_page_input(const PageInputOptions& options) {
  PageInput input;
  std::vector<std::string> photographs;
  for (const std::string& argument : options.inputs) {
    if (holds_records(argument)) {
      read_records(argument, input);
    } else {
      photographs.push_back(argument);
    }
  }
  if (!photographs.empty()) measure(photographs, options, input);
  if (input.frames.empty()) throw WrongUse("there is no frame to show; expected photographs or records of `check`");
  if (options.pictures && !interrupted()) make_all_pictures(input, options.workers);
  return input;
}

std::string shoot_title(const std::vector<std::string>& inputs) {
  std::filesystem::path path = inputs.empty() ? std::filesystem::path(".") : std::filesystem::path(inputs.front());
  std::error_code error;
  path = std::filesystem::absolute(path, error).lexically_normal();
  if (inputs.size() > 1) path = path.parent_path();
  if (path.filename().empty()) path = path.parent_path();
  const std::string name = path.filename().string();
  return name.empty() ? "Shoot" : name;
}

}  // namespace focusfall
