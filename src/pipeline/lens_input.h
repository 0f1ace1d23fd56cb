// From frame records to what `lens` counts: one signed reading a frame, or the reason why a frame is left out.
//
// No frame is left out for what it says: neither by its verdict on focus nor because its defocus is not significant.
// Cutting the frames near zero would turn a true bias of a quarter of the limit into nearly twice that.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <tl/expected.hpp>
#include <vector>

#include "analysis/compare/lens_report.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

enum class LeftOut {
  not_done,            // the frame could not be read or measured
  manual_focus,        // a person focused, not the lens and body
  motion,              // blur of motion or shake at the aim
  no_evidence,         // nothing at the aim can be measured
  no_plane,            // no surface whose blur tells where focus fell
  aim_not_on_surface,  // the aim neither lies nor stands on that surface
  no_optics,           // focal length, f-number or pixel pitch is not known
  copy,                // every measured number is that of an earlier frame
};

// From which side focus came, for the frames whose path is or lies under `path`; an empty path means all frames.
struct ApproachRule {
  ApproachSide side = ApproachSide::unknown;
  std::string path;
};

struct LensInput {
  std::vector<LensReading> readings;             // `frame` counts the records
  std::vector<std::optional<LeftOut>> left_out;  // one a record
};

LensInput lens_input(std::span<const FrameRecord> records, std::span<const ApproachRule> approach = {});

// "near", "far", "near=FOLDER", ... The error is one sentence.
tl::expected<ApproachRule, std::string> parse_approach(const std::string& text);

// "Invented 85 mm f/1.8 (LL-0851)": the model and the serial number; "" where neither is recorded.
std::string lens_name(const Capture& capture);
std::string body_name(const Capture& capture);

}  // namespace focusfall
