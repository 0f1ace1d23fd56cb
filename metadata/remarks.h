// Values that a file holds and that cannot be used: how they are tested and how they are told.
#pragma once

#include <string>
#include <vector>

#include "metadata/capture.h"

namespace focusfall {

// The codes of all remarks about capture data.
inline constexpr const char* kMetadataUnreadable = "metadata-unreadable";   // the block as a whole, or a part of it
inline constexpr const char* kValueAbsurd = "metadata-value-absurd";        // one value that no camera can have meant
inline constexpr const char* kPitchUnknown = "pixel-pitch-unknown";         // recorded, but not to be relied upon
inline constexpr const char* kMakerNoteUnusable = "maker-note-unusable";    // displaced by an editor
inline constexpr const char* kFocusAreaMisplaced = "focus-area-misplaced";  // cropped or turned since

using Remarks = std::vector<CaptureRemark>;

// What a quantity may be in the world, ends included; beyond, a file is damaged or was never set.
struct Plausible {
  const char* name;  // "focal length"
  const char* unit;  // " mm", with the space before it; empty for none
  double least;
  double greatest;
};

// Judgement throughout: wider than anything that was ever built or photographed, so that only nonsense falls outside.
inline constexpr Plausible kFocalLength{"focal length", " mm", 0.5, 20000};
inline constexpr Plausible kFNumber{"f-number", "", 0.7, 1000};  // f/0.7 is the fastest photographic lens
inline constexpr Plausible kExposureTime{"exposure time", " s", 1e-7, 86400};
inline constexpr Plausible kIsoSpeed{"ISO speed", "", 1, 2e7};
inline constexpr Plausible kExposureBias{"exposure bias", " EV", -20, 20};
inline constexpr Plausible kBrightness{"brightness value", " APEX", -30, 30};
inline constexpr Plausible kDistance{"focus distance", " m", 1e-4, 1e6};
inline constexpr Plausible kPixelPitch{"pixel pitch", " um", 0.2, 500};  // also of much reduced pictures

// `value` where it is plausible; else nothing, and a remark that says what was seen and what was expected.
std::optional<double> plausible(double value, const Plausible& limits, Remarks& remarks);

// A remark about a text or a fraction that is no value at all, as it was written.
void remark_absurd(const char* name, const std::string& seen, const std::string& expected, Remarks& remarks);

}  // namespace focusfall
