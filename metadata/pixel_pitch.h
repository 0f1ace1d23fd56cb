// How large a pixel of the delivered picture is on the sensor, from what cameras record about it.
#pragma once

#include <optional>

#include "metadata/capture.h"
#include "metadata/exif_tags.h"
#include "metadata/read_capture.h"
#include "metadata/remarks.h"

namespace focusfall {

// A digital zoom of which only the use is recorded, not the factor.
inline constexpr double kUnknownDigitalZoom = 65535;

// Everything that bears on the pitch. Sizes: `recorded` is what the camera says it wrote, `decoded` what the decoder
// found, 0 x 0 where either is not known.
struct PitchEvidence {
  DecodedSize recorded;
  DecodedSize decoded;
  std::optional<Ratio> focal_plane_resolution;  // FocalPlaneXResolution as written
  int focal_plane_unit = 2;                     // FocalPlaneResolutionUnit; 2, inch, is the default of the standard
  std::optional<int> sensor_active_width_px;    // maker note: columns of the sensor that make pictures
  std::optional<double> sensor_diagonal_mm;     // maker note: of the whole sensor, 4:3
  std::optional<double> focal_length_mm;
  std::optional<double> equivalent_mm;  // FocalLengthIn35mmFilm
  std::optional<double> digital_zoom;   // DigitalZoomRatio
  bool cropped_by_editor = false;               // XMP: a raw developer says that it cut off a part
  bool rewritten = false;               // the maker note is gone that this maker's cameras always write
  bool reduced_by_camera = false;       // maker note: a smaller picture of the whole sensor was asked for
};

// Pitch of the delivered (decoded) pixels, um, with 95 % bounds. Absent where nothing is recorded, and, with a remark,
// where what is recorded contradicts itself or belongs to another picture than this one.
std::optional<CoarseValue> pixel_pitch_um(const PitchEvidence& evidence, Remarks& remarks);

// The evidence that the standard tags hold.
PitchEvidence pitch_evidence(const ExifTags& tags, DecodedSize decoded);

}  // namespace focusfall
