// Reads the capture data of one file from the bytes that the caller has already read.
#pragma once

#include <cstddef>
#include <span>

#include "metadata/capture.h"

namespace focusfall {

// Size of the picture as decoded, needed to turn recorded positions and sizes into fractions and pitches.
struct DecodedSize {
  int width_px = 0;
  int height_px = 0;
};

// Must be called once, before any other call and before threads start.
void initialise_capture_reading();

// Reads Exif, maker notes and XMP. `file` may be the whole file or, for JPEG, its first 256 KB or more.
// Never throws: what cannot be read is absent, and the remark says why. Thread-safe.
CaptureReading read_capture(std::span<const std::byte> file, DecodedSize decoded);

}  // namespace focusfall
