// The frame record as JSON, schema "focusfall.frame/1", and back. Angles in degrees, fractions 0..1 of the unrotated
// frame, absent = null, every number finite. `low` and `high` are 95 % bounds.
#pragma once

#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <tl/expected.hpp>

#include "src/pipeline/frame_record.h"

namespace focusfall {

inline constexpr const char* kFrameSchema = "focusfall.frame/1";

// What `predict` solved for: the key `solved`.
struct SolvedValue {
  std::string quantity;   // "f_number", "exposure_time", "focus_distance", ...
  double value = 0;       // infinity becomes null
  std::string unit;       // "", "s", "m"
};

struct FrameJsonOptions {
  bool tiles = false;                  // with the tile map
  bool levels = false;                 // with what the exposure audit compares: the level grid and the highlights
};

// The object, keys in the order of the schema. Text may hold invalid UTF-8 until json_line() writes it.
nlohmann::ordered_json frame_json(const FrameRecord& record, const FrameJsonOptions& options = {});

// The key `solved` of `predict`.
nlohmann::ordered_json solved_json(const SolvedValue& solved);

// One line, newline included; invalid UTF-8 becomes U+FFFD.
std::string json_line(const nlohmann::ordered_json& object);

// Reads what frame_json() wrote, keys in any order, unknown keys passed over. What JSON does not carry (the optical
// set-up, single edges) stays absent. The error is one sentence with the key.
tl::expected<FrameRecord, std::string> frame_record_from_json(const nlohmann::ordered_json& object);

// `value` with so many significant decimal digits.
double rounded(double value, int digits);

}  // namespace focusfall
