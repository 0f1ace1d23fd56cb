// What a file format offers to decoder.cpp. A new format is one file that defines one Codec, and one row in the table
// of decoder.cpp. A library's exceptions, longjmps and handlers stay in that file.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string_view>

#include "src/decode/decoder.h"

namespace focusfall {

struct Codec {
  const char* kind;                                      // as PictureFormat::kind
  bool (*recognises)(std::span<const std::byte> file);   // from the content alone; must not trust any length
  Decoded<PictureFormat> (*format)(std::span<const std::byte> file, DecodeWorkspace& workspace);
  Decoded<PictureFormat> (*decode)(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace);
};

extern const Codec kJpegCodec;   // jpeg.cpp
extern const Codec kPngCodec;    // png.cpp
extern const Codec kTiffCodec;   // tiff.cpp
extern const Codec kHeifCodec;   // heif.cpp
extern const Codec kRawCodec;    // raw.cpp

// True where `file` has these bytes at `offset`.
bool has_bytes(std::span<const std::byte> file, std::size_t offset, std::string_view bytes);

// Refuses a declared size that holds no pixels or more than kMaxPicturePixels.
std::optional<DecodeError> size_error(std::string_view kind, std::int64_t width_px, std::int64_t height_px);

}  // namespace focusfall
