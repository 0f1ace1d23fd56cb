// What the makers of cameras keep in notes of their own. One file for each maker; in it a table, one row for a value.
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "metadata/capture.h"
#include "metadata/exif_tags.h"
#include "metadata/read_capture.h"

namespace focusfall {

// What a maker note says, in the units and the frame of capture.h.
struct MakerNote {
  std::optional<std::string> body_serial;
  std::optional<std::string> lens;
  std::optional<std::string> lens_serial;
  std::optional<long> sequence;
  std::optional<double> focal_length_mm;
  std::optional<double> exposure_time_s;  // where the one in Exif is not the camera's own
  std::optional<double> iso_speed;
  std::optional<FocusMode> focus_mode;
  std::optional<bool> stabiliser_on;
  std::optional<FocusDistance> focus_distance;        // better than Exif SubjectDistance
  std::optional<FocusDistance> rough_focus_distance;  // where the file gives no better one
  std::vector<FractionRect> focus_areas;              // unrotated frame, best first
  std::optional<int> sensor_active_width_px;          // columns of the sensor that make pictures
  std::optional<double> sensor_diagonal_mm;           // of the whole sensor
  bool reduced_by_camera = false;                     // a smaller picture of the whole sensor was asked for
  bool digital_zoom = false;                          // a part of the sensor was enlarged
};

// The tags of a file, and what its standard tags say about the frame that the note belongs to.
struct NoteContext {
  const ExifTags& tags;
  std::string model;
  DecodedSize size;  // recorded, else decoded
  std::optional<double> focal_length_mm;
  std::optional<double> equivalent_mm;       // 35 mm equivalent
  std::optional<double> subject_distance_m;  // Exif SubjectDistance
};

// One value of a maker note. `take` reads the tag `key` into its field, and leaves the field alone where the tag is
// absent or says "not known". Rows stand in order of preference: the first that fills a field wins.
struct NoteRow {
  const char* key;
  void (*take)(const NoteContext&, const char* key, MakerNote&);
};

// One maker: how Exif Make starts, in capitals, and the rows. `usable` is false where an editor moved the note without
// moving the places that it points to, so that it reads as nonsense; null: cannot be told, or cannot happen.
struct Maker {
  const char* make;
  std::span<const NoteRow> rows;
  bool (*usable)(const NoteContext&) = nullptr;
};

// The tables, one from each file of this folder.
std::span<const Maker> apple_notes();
std::span<const Maker> canon_notes();
std::span<const Maker> casio_notes();
std::span<const Maker> fujifilm_notes();
std::span<const Maker> minolta_notes();
std::span<const Maker> nikon_notes();
std::span<const Maker> olympus_notes();
std::span<const Maker> panasonic_notes();
std::span<const Maker> pentax_notes();
std::span<const Maker> samsung_notes();
std::span<const Maker> sony_notes();

// Whether a note whose offsets count from the start of the TIFF header stands where they expect it: most of its values
// that stand elsewhere in the file must lie inside the note. `directory_at`: where in the note its directory starts.
// True where that cannot be told.
bool offsets_lie_in_note(const NoteContext& context, std::size_t directory_at);

struct NoteResult {
  MakerNote note;
  bool unusable = false;
};

// Reads the maker note by the tables of the makers that `make` (Exif Make) names.
NoteResult read_maker_note(const std::string& make, const NoteContext& context);

}  // namespace focusfall
