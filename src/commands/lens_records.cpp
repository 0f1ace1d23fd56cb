#include "src/commands/lens_records.h"

#include <fmt/format.h>
#include <unistd.h>

#include <array>
#include <filesystem>
#include <fstream>
#include <system_error>
#include <utility>

#include "src/commands/command.h"
#include "src/output/data_stream.h"
#include "src/output/frame_json.h"
#include "src/output/frame_text.h"
#include "src/output/progress.h"
#include "src/output/visible_text.h"
#include "src/pipeline/frame_pool.h"

namespace focusfall {
namespace {

// JSON Lines start with an object. No format of photographs starts with a brace.
bool starts_like_records(const std::string& path) {
  std::error_code error;
  if (!std::filesystem::is_regular_file(path, error)) return false;
  std::ifstream file(path, std::ios::binary);
  std::array<char, 64> head{};
  file.read(head.data(), head.size());
  for (std::streamsize i = 0; i < file.gcount(); ++i) {
    const char c = head[static_cast<std::size_t>(i)];
    if (c != ' ' && c != '\t' && c != '\r' && c != '\n') return c == '{';
  }
  return false;
}

// One line that is no record is said and passed over; the others count.
void read_records(const std::string& path, GatheredRecords& gathered) {
  std::ifstream file(path, std::ios::binary);
  std::string line;
  for (std::size_t number = 1; std::getline(file, line); ++number) {
    if (line.find_first_not_of(" \t\r") == std::string::npos) continue;
    const auto json = nlohmann::ordered_json::parse(line, nullptr, false);
    auto record = json.is_discarded() ? tl::make_unexpected(std::string("it is no JSON"))
                                      : frame_record_from_json(json);
    if (!record) {
      say(fmt::format("{}, line {}: no frame record as check --format json writes it: {}", visible_text(path), number,
                      visible_text(record.error())));
      gathered.complete = false;
      continue;
    }
    ++gathered.read_back;
    gathered.records.push_back(std::move(*record));
  }
}

void measure(const std::vector<std::string>& paths, const RecordRequest& request, GatheredRecords& gathered) {
  if (paths.empty()) return;
  const Settings settings = load_settings(request.settings);
  Progress progress(paths.size(), is_terminal(STDERR_FILENO));
  run_frames(paths, request.values, settings, {.workers = request.workers, .cancel = &interrupted()},
             [&](FrameRecord&& record) {
               progress.clear();
               if (!record.done) {
                 gathered.complete = false;
                 say(visible_text(record.path) + ": " + failure_text(record));
               }
               gathered.records.push_back(std::move(record));
               progress.advance();
               return true;
             });
  progress.clear();
}

}  // namespace

GatheredRecords gather_records(const RecordRequest& request) {
  const Inputs inputs = load_inputs(request.inputs);
  GatheredRecords gathered;
  gathered.complete = inputs.problems.empty();
  // Photographs in a row are measured together, several at a time.
  std::vector<std::string> photographs;
  for (const std::string& path : inputs.paths) {
    if (!starts_like_records(path)) {
      photographs.push_back(path);
      continue;
    }
    measure(std::exchange(photographs, {}), request, gathered);
    read_records(path, gathered);
  }
  measure(photographs, request, gathered);
  gathered.interrupted = interrupted();
  return gathered;
}

}  // namespace focusfall
