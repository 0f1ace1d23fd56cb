#include "metadata/read_capture.h"

#include <exiv2/exiv2.hpp>
#include <fmt/format.h>

#include <limits>
#include <mutex>

#include "metadata/exif_tags.h"
#include "metadata/pixel_pitch.h"
#include "metadata/remarks.h"
#include "metadata/standard_exif.h"

namespace focusfall {
namespace {

// Exiv2's XMP parser keeps state of its own: with several threads some readings lost all XMP without an error, even
// with the lock that XmpParser::initialize takes. One thread opens and parses at a time; it takes some hundredths of
// a millisecond for a JPEG.
std::mutex& parser_mutex() {
  static std::mutex mutex;
  return mutex;
}

// What one file holds, parsed. The image is kept because it owns the tags.
struct ParsedFile {
  Exiv2::ExifData exif;
  Exiv2::XmpData xmp;
};

// A damaged file may give much before it fails: what was read until then counts.
ParsedFile parse(std::span<const std::byte> file, Remarks& remarks) {
  ParsedFile parsed;
  if (file.empty() || file.size() > static_cast<std::size_t>(std::numeric_limits<long>::max())) return parsed;
  const std::lock_guard lock(parser_mutex());
  try {
    auto image = Exiv2::ImageFactory::open(reinterpret_cast<const Exiv2::byte*>(file.data()),
                                           static_cast<long>(file.size()));
    try {
      image->readMetadata();
    } catch (const std::exception& error) {
      remarks.push_back({kMetadataUnreadable, fmt::format("The capture data are damaged ({}); what could be read before "
                                                          "is used.", error.what())});
    }
    parsed.exif = image->exifData();
    parsed.xmp = image->xmpData();
  } catch (const std::exception& error) {
    remarks.push_back({kMetadataUnreadable, fmt::format("No capture data can be read ({}); expected Exif or XMP in a "
                                                        "picture format.", error.what())});
  }
  return parsed;
}

void interpret(const ParsedFile& parsed, DecodedSize decoded, CaptureReading& reading) {
  Capture& capture = reading.capture;
  const ExifTags tags(parsed.exif);
  read_standard_exif(tags, decoded, capture, reading.remarks);

  PitchEvidence evidence = pitch_evidence(tags, decoded);
  if (capture.focal_length_mm) evidence.focal_length_mm = capture.focal_length_mm->value;
  if (const auto pitch = pixel_pitch_um(evidence, reading.remarks)) {
    capture.pixel_pitch_um = Sourced<CoarseValue>{*pitch, Source::derived};
  }
}

}  // namespace

void initialise_capture_reading() {
  Exiv2::LogMsg::setLevel(Exiv2::LogMsg::mute);
  // Without it HEIF and CR3 open without an error and without Exif.
  Exiv2::enableBMFF(true);
  Exiv2::XmpParser::initialize();
}

CaptureReading read_capture(std::span<const std::byte> file, DecodedSize decoded) {
  CaptureReading reading;
  try {
    const ParsedFile parsed = parse(file, reading.remarks);
    interpret(parsed, decoded, reading);
  } catch (const std::exception& error) {
    reading.remarks.push_back({kMetadataUnreadable, fmt::format("The capture data cannot be read to their end ({}).",
                                                                error.what())});
  }
  return reading;
}

}  // namespace focusfall
