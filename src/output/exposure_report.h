// The exposure audit of a shoot for people and programs: text, CSV, and JSON of the schema "focusfall.exposure/1".
#pragma once

#include <nlohmann/json.hpp>
#include <span>
#include <string>

#include "analysis/compare/exposure_audit.h"
#include "src/output/frame_text.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

inline constexpr const char* kExposureSchema = "focusfall.exposure/1";

// Everything that was found; records and audit.frames belong together one by one.
struct ExposureReport {
  std::span<const FrameRecord> records;
  ExposureAudit audit;
  ExposureOptions options;
};

// One object with kind "frame"; one with kind "set". Absent = null, every number finite.
nlohmann::ordered_json exposure_frame_json(const ExposureReport& report, std::size_t frame);
nlohmann::ordered_json exposure_set_json(const ExposureReport& report, std::size_t set);

// A line a frame, as in JSON; sets are told by their number and stand in JSON and text only.
std::string exposure_csv_header();
std::string exposure_csv_line(const ExposureReport& report, std::size_t frame);

// A line a frame under a heading, and a paragraph about the set.
std::string exposure_set_text(const ExposureReport& report, std::size_t set, const TextLayout& layout);

}  // namespace focusfall
