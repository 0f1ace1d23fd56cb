// Files with known capture data, built in memory: a JPEG of no size worth mentioning around Exif and XMP.
#pragma once

#include <cstddef>
#include <cstdint>
#include <exiv2/exiv2.hpp>
#include <string>
#include <vector>

#include "metadata/read_capture.h"

namespace focusfall {

struct ExifFile {
  Exiv2::ExifData exif;
  std::string xmp;  // an XMP packet; empty: none
  DecodedSize decoded{6000, 4000};

  // Sets a tag from its text, in the type that the tag has by the standard: "28/10", "200 0", "Nikon".
  ExifFile& set(const std::string& key, const std::string& text);
  // Sets a tag in a type of the test's choice.
  ExifFile& set(const std::string& key, Exiv2::TypeId type, const std::string& text);
  ExifFile& set_bytes(const std::string& key, const std::vector<std::uint8_t>& bytes);

  std::vector<std::byte> jpeg(Exiv2::ByteOrder order = Exiv2::littleEndian) const;
  CaptureReading read(Exiv2::ByteOrder order = Exiv2::littleEndian) const;
};

// SOI, the segments, a frame header of 1 x 1 px, a scan without content, EOI.
std::vector<std::byte> jpeg_around(const std::vector<std::uint8_t>& tiff, const std::string& xmp);

// Whether a remark of this code was made.
bool has_remark(const CaptureReading& reading, const std::string& code);

}  // namespace focusfall
