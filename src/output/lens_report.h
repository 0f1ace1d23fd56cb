// The report of `lens` as JSON Lines ("focusfall.lens/1"), CSV and text. Functions of the records and the report alone.
#pragma once

#include <cstddef>
#include <nlohmann/json.hpp>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/compare/lens_report.h"
#include "src/output/frame_text.h"
#include "src/pipeline/frame_record.h"
#include "src/pipeline/lens_bench_input.h"
#include "src/pipeline/lens_flat_input.h"
#include "src/pipeline/lens_input.h"

namespace focusfall {

inline constexpr const char* kLensSchema = "focusfall.lens/1";

struct LensOutput {
  std::span<const FrameRecord> records;
  const LensInput& input;
  const LensReport& report;
  std::vector<GroupDiaphragm> diaphragms{};            // one a group where asked for, else empty
  std::optional<FocusSeriesResult> focus_series{};     // where asked for
  std::optional<FlatResult> flat{};                    // where asked for
};

const char* left_out_name(LeftOut reason);   // "no plane" ...

// kind "frame", one a record: its signed defocus and the group it counts in, or why it does not.
std::vector<nlohmann::ordered_json> lens_frames_json(const LensOutput& output);

// kind "set": groups, trends, lens or body, finding, summary.
nlohmann::ordered_json lens_set_json(const LensOutput& output);

// One line a group, after RFC 4180.
std::string lens_csv_header();
std::string lens_csv_lines(const LensOutput& output);

// Groups with their figures, frames left out, trends, findings.
struct LensTextOptions {
  TextLayout layout;
  bool frames = true;   // every frame's defocus under its group
};
std::string lens_text(const LensOutput& output, const LensTextOptions& options);

// The group in which each record counts; absent for those left out.
std::vector<std::optional<std::size_t>> groups_of_frames(const LensOutput& output);

}  // namespace focusfall
