#include "metadata/read_capture.h"

#include <fmt/format.h>
#include <exiv2/exiv2.hpp>

#include <algorithm>
#include <cmath>
#include <limits>

#include "metadata/exif_tags.h"
#include "metadata/exiv2_lock.h"
#include "metadata/focus_area.h"
#include "metadata/focus_distance.h"
#include "metadata/maker_notes/maker_note.h"
#include "metadata/picture_shape.h"
#include "metadata/pixel_pitch.h"
#include "metadata/remarks.h"
#include "metadata/standard_exif.h"
#include "metadata/standard_xmp.h"
#include "metadata/xmp_tags.h"

namespace focusfall {
namespace {

// What one file holds, parsed.
struct ParsedFile {
  Exiv2::ExifData exif;
  Exiv2::XmpData xmp;
};

// A damaged file may give much before it fails: what was read until then counts.
ParsedFile parse(std::span<const std::byte> file, Remarks& remarks) {
  ParsedFile parsed;
  if (file.empty() || file.size() > static_cast<std::size_t>(std::numeric_limits<long>::max())) return parsed;
  const std::lock_guard lock(exiv2_mutex());
  try {
    auto image =
        Exiv2::ImageFactory::open(reinterpret_cast<const Exiv2::byte*>(file.data()), static_cast<long>(file.size()));
    try {
      image->readMetadata();
    } catch (const std::exception& error) {
      remarks.push_back(
          {kMetadataUnreadable, fmt::format("The capture data are damaged ({}); what could be read before "
                                            "is used.",
                                            error.what())});
    }
    parsed.exif = image->exifData();
    parsed.xmp = image->xmpData();
  } catch (const std::exception& error) {
    remarks.push_back({kMetadataUnreadable, fmt::format("No capture data can be read ({}); expected Exif or XMP in a "
                                                        "picture format.",
                                                        error.what())});
  }
  return parsed;
}

template <class T>
void fill(OptionalSourced<T>& field, const std::optional<T>& value, Source source) {
  if (!field && value) field = Sourced<T>{*value, source};
}

NoteContext note_context(const ExifTags& tags, DecodedSize decoded, const Capture& capture) {
  NoteContext context{.tags = tags,
                      .model = tags.text("Exif.Image.Model").value_or(""),
                      .size = recorded_size(tags).value_or(decoded),
                      .focal_length_mm = std::nullopt,
                      .equivalent_mm = tags.real("Exif.Photo.FocalLengthIn35mmFilm"),
                      .subject_distance_m = std::nullopt};
  if (capture.focal_length_mm) context.focal_length_mm = capture.focal_length_mm->value;
  if (capture.focus_distance) context.subject_distance_m = capture.focus_distance->value.value_m;
  return context;
}

// A maker's reading of the lens is better than what Exif SubjectDistance holds, which stands in few files; a maker's
// rough one is worse.
void merge_focus_distance(const MakerNote& note, Capture& capture, Remarks& remarks) {
  const auto usable = [&](const std::optional<FocusDistance>& distance) -> std::optional<FocusDistance> {
    if (!distance || std::isinf(distance->value_m)) return distance;
    return plausible(distance->value_m, kDistance, remarks) ? distance : std::nullopt;
  };
  if (const auto good = usable(note.focus_distance)) capture.focus_distance = {*good, Source::maker_note};
  fill(capture.focus_distance, usable(note.rough_focus_distance), Source::maker_note);
}

// No name or number of a camera is longer; a text of the size of a file would be carried through every record.
void shorten(OptionalSourced<std::string>& text) {
  constexpr std::size_t kMostBytes = 200;
  if (text && text->value.size() > kMostBytes) text->value.resize(kMostBytes);
}

void shorten_texts(Capture& capture) {
  for (auto* text : {&capture.camera, &capture.lens, &capture.body_serial, &capture.lens_serial, &capture.software}) {
    shorten(*text);
  }
}

// Lenses and bodies without a number write zeros; two of these are not the same thing.
void drop_serial_of_zeros(OptionalSourced<std::string>& serial) {
  if (serial && serial->value.find_first_not_of("0 .-") == std::string::npos) serial.reset();
}

void merge_note(const MakerNote& note, Capture& capture, Remarks& remarks) {
  drop_serial_of_zeros(capture.body_serial);
  drop_serial_of_zeros(capture.lens_serial);
  fill(capture.body_serial, note.body_serial, Source::maker_note);
  fill(capture.lens, note.lens, Source::maker_note);
  fill(capture.lens_serial, note.lens_serial, Source::maker_note);
  fill(capture.sequence, note.sequence, Source::maker_note);
  if (!capture.focal_length_mm && note.focal_length_mm) {
    fill(capture.focal_length_mm, plausible(*note.focal_length_mm, kFocalLength, remarks), Source::maker_note);
  }
  if (!capture.iso_speed && note.iso_speed) {
    fill(capture.iso_speed, plausible(*note.iso_speed, kIsoSpeed, remarks), Source::maker_note);
  }
  if (note.exposure_time_s) {
    if (const auto time = plausible(*note.exposure_time_s, kExposureTime, remarks)) {
      capture.exposure_time_s = {*time, Source::maker_note};
    }
  }
  fill(capture.focus_mode, note.focus_mode, Source::maker_note);
  fill(capture.stabiliser_on, note.stabiliser_on, Source::maker_note);
  merge_focus_distance(note, capture, remarks);
  for (const FractionRect& area : note.focus_areas) {
    if (lies_in_frame(area)) {
      capture.focus_areas.push_back({area, FocusAreaKind::focus_area, Source::maker_note});
    } else {
      remark_absurd(
          "focus area",
          fmt::format("{:.3g} x {:.3g} of the frame at {:.3g}, {:.3g}", area.width, area.height, area.x, area.y),
          "a place inside the frame", remarks);
    }
  }
}

// Raw developers say in their own settings whether they cut off a part; sizes alone do not show it where the shape is
// kept and the recorded size written anew.
bool is_cropped_by_editor(const XmpTags& xmp) {
  const std::string crop = xmp.text("Xmp.crs.HasCrop").value_or("");
  return crop == "True" || crop == "true";
}

struct TagsOfFile {
  const ExifTags& exif;
  const XmpTags& xmp;
};

void derive_pitch(const TagsOfFile& tags, DecodedSize decoded, const MakerNote& note, CaptureReading& reading) {
  PitchEvidence evidence = pitch_evidence(tags.exif, decoded);
  evidence.cropped_by_editor = is_cropped_by_editor(tags.xmp);
  if (reading.capture.focal_length_mm) evidence.focal_length_mm = reading.capture.focal_length_mm->value;
  evidence.sensor_active_width_px = note.sensor_active_width_px;
  evidence.sensor_diagonal_mm = note.sensor_diagonal_mm;
  evidence.reduced_by_camera = note.reduced_by_camera;
  if (note.digital_zoom && evidence.digital_zoom.value_or(0) <= 1) evidence.digital_zoom = kUnknownDigitalZoom;
  fill(reading.capture.pixel_pitch_um, pixel_pitch_um(evidence, reading.remarks), Source::derived);
}

// Areas that the camera recorded have their place in the picture that it wrote; one that was cropped or turned since
// has its subject elsewhere. Regions of XMP are for programs to keep in order.
void drop_misplaced_areas(const TagsOfFile& tags, DecodedSize decoded, CaptureReading& reading) {
  const DecodedSize recorded = recorded_size(tags.exif).value_or(decoded);
  if (!is_known(recorded) || !is_known(decoded)) return;
  const bool cropped = is_cropped_by_editor(tags.xmp) || !same_shape(recorded, decoded);
  if (!cropped && !is_turned(recorded, decoded)) return;
  const auto dropped =
      std::erase_if(reading.capture.focus_areas, [](const FocusArea& area) { return area.source != Source::xmp; });
  if (dropped == 0) return;
  reading.remarks.push_back(
      {kFocusAreaMisplaced,
       fmt::format("The picture of {} x {} px was {} since it was recorded, and the focus area is not where it was.",
                   decoded.width_px, decoded.height_px, cropped ? "cropped" : "turned")});
}

void interpret(const ParsedFile& parsed, DecodedSize decoded, CaptureReading& reading) {
  Capture& capture = reading.capture;
  const ExifTags tags(parsed.exif);
  read_standard_exif(tags, decoded, capture, reading.remarks);

  const NoteResult maker =
      read_maker_note(tags.text("Exif.Image.Make").value_or(""), note_context(tags, decoded, capture));
  if (maker.unusable) {
    reading.remarks.push_back({kMakerNoteUnusable,
                               "The maker note was moved by an editor and reads as nonsense; the "
                               "focus distance and the focus area in it are not used."});
  }
  merge_note(maker.note, capture, reading.remarks);
  fill(capture.lens, lens_by_specification(tags), Source::exif);
  const XmpTags xmp(parsed.xmp);
  read_standard_xmp(xmp, decoded, capture, reading.remarks);

  drop_serial_of_zeros(capture.body_serial);
  drop_serial_of_zeros(capture.lens_serial);
  shorten_texts(capture);
  drop_misplaced_areas({tags, xmp}, decoded, reading);
  std::ranges::stable_sort(capture.focus_areas, {}, &FocusArea::kind);
  if (capture.focus_distance && capture.focal_length_mm) {
    allow_for_origin(capture.focus_distance->value, capture.focal_length_mm->value);
  }
  derive_pitch({tags, xmp}, decoded, maker.note, reading);
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
    reading.remarks.push_back(
        {kMetadataUnreadable, fmt::format("The capture data cannot be read to their end ({}).", error.what())});
  }
  return reading;
}

}  // namespace focusfall
