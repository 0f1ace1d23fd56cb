#include <cmath>

#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// ---- lens data ------------------------------------------------------------------------------------------------------

// The layouts of lens data that hold a distance. They are encrypted with the serial number and the shutter count, and
// an editor that changes one of these leaves noise.
struct LensDataKeys {
  const char* focal_length;
  const char* distance;
  const char* lens;
};
constexpr LensDataKeys kLensData[] = {
    {"Exif.NikonLd2.FocalLength", "Exif.NikonLd2.FocusDistance", "Exif.NikonLd2.LensIDNumber"},
    {"Exif.NikonLd3.FocalLength", "Exif.NikonLd3.FocusDistance", "Exif.NikonLd3.LensIDNumber"},
    {"Exif.NikonLd4.FocalLength", "Exif.NikonLd4.FocusDistance", "Exif.NikonLd4.LensIDNumber"},
};

// Focal length as 5 mm x 2^(v/24).
double focal_length_of(double code) {
  return 5 * std::exp2(code / 24);
}

// The steps of the scale and the rounding of Exif.
bool is_near(double decoded_mm, double focal_length_mm) {
  constexpr double kRelative = 0.06, kAbsoluteMm = 0.5;
  return std::abs(decoded_mm - focal_length_mm) <= kRelative * focal_length_mm + kAbsoluteMm;
}

// Noise passes this test by chance in some percent of the files.
bool is_readable(const LensDataKeys& keys, const NoteContext& context) {
  const auto code = context.tags.integer(keys.focal_length);
  if (!code || !context.focal_length_mm) return false;
  return is_near(focal_length_of(static_cast<double>(*code)), *context.focal_length_mm);
}

// Metres as 0.01 x 10^(v/40).
double distance_of(double code) {
  return 0.01 * std::pow(10, code / 40);
}

// One step of v is 5.9 %; the reading is within half of one.
constexpr double kStepBound = 0.03;
// The finer scale of the newest mount: judgement, a little under half a step of the coarse one.
constexpr double kFineBound = 0.02;

template <std::size_t layout>
void take_distance(const NoteContext& context, const char* key, MakerNote& note) {
  const LensDataKeys& keys = kLensData[layout];
  const auto code = context.tags.integer(key);
  if (note.focus_distance || !code || !is_readable(keys, context)) return;
  note.focus_distance = *code == 0 ? distance_at_infinity(kInfinityFromM)
                                   : distance_within(distance_of(static_cast<double>(*code)), kStepBound);
}

// Lenses of the newest mount: the structure is read by its offsets. 0x35: 1 for these lenses; 0x3c: focal length in mm;
// 0x4c: 0 at infinity; 0x4f whole steps, 0x4e their 256th parts.
void take_fine_distance(const NoteContext& context, const char*, MakerNote& note) {
  const auto bytes = context.tags.structure("NikonLd4");
  constexpr std::size_t kEnd = 0x50;
  if (note.focus_distance || bytes.size() < kEnd || bytes[0x35] != 1 || !context.focal_length_mm) return;
  // In whichever order of bytes: Exiv2 reads it as little-endian, and writes it as the note around it is written.
  const auto fits = [&](bool big_endian) {
    return is_near(two_bytes(bytes, 0x3c, big_endian).value_or(0), *context.focal_length_mm);
  };
  if (!fits(false) && !fits(true)) return;
  if (bytes[0x4c] == 0) {
    note.focus_distance = distance_at_infinity(kInfinityFromM);
    return;
  }
  const double steps = bytes[0x4f] + bytes[0x4e] / 256.0;
  if (steps > 0) note.focus_distance = distance_within(distance_of(steps), kFineBound);
}

// The printed name of a lens number, where the lens data are readable and the name is known.
template <std::size_t layout>
void take_lens_by_number(const NoteContext& context, const char* key, MakerNote& note) {
  if (note.lens || !is_readable(kLensData[layout], context)) return;
  const auto name = context.tags.printed(key);
  if (name && name->find("mm") != std::string::npos) note.lens = *name;
}

// "18-55mm F3.5-5.6" from the four numbers of the lens.
void take_lens_range(const NoteContext& context, const char* key, MakerNote& note) {
  const auto longest = context.tags.real(key, 1);
  if (note.lens || !longest || *longest <= 0) return;
  note.lens = context.tags.printed(key);
}

// ---- focus area -----------------------------------------------------------------------------------------------------

// Where the picture's width in AF pixels stands; height, centre x, centre y, width, height of the area follow.
struct AreaLayout {
  std::string_view version;  // the first characters of the structure
  std::size_t offset;
};
constexpr AreaLayout kAreaLayouts[] = {{"0100", 0x10}, {"0101", 0x46}, {"03", 0x2a}, {"0400", 0x3e}};

// Byte 4: 0 the phase detection points, which have no place in the picture; 1 and 2 detection on the sensor. In the
// layouts 03xx the place is written with 2, and with 1 from 0301 on.
bool area_is_valid(const std::vector<std::uint8_t>& bytes, std::string_view version) {
  if (version.starts_with("0400")) return true;
  if (version.starts_with("03")) return bytes[4] == 2 || (bytes[4] == 1 && version == "0301");
  return bytes[4] == 1;
}

std::optional<FractionRect> contrast_area(const std::vector<std::uint8_t>& bytes, bool big_endian) {
  if (bytes.size() < 5) return std::nullopt;
  const std::string version(bytes.begin(), bytes.begin() + 4);
  if (!area_is_valid(bytes, version)) return std::nullopt;
  for (const AreaLayout& layout : kAreaLayouts) {
    if (!version.starts_with(layout.version)) continue;
    double v[6] = {};
    for (std::size_t i = 0; i < 6; ++i) v[i] = two_bytes(bytes, layout.offset + 2 * i, big_endian).value_or(0);
    if (v[0] <= 0 || v[1] <= 0 || v[2] <= 0 || v[3] <= 0 || v[2] > v[0] || v[3] > v[1]) return std::nullopt;
    return FractionRect{(v[2] - v[4] / 2) / v[0], (v[3] - v[5] / 2) / v[1], v[4] / v[0], v[5] / v[1]};
  }
  return std::nullopt;
}

void take_area(const NoteContext& context, const char*, MakerNote& note) {
  if (!note.focus_areas.empty()) return;
  for (const char* group : {"NikonAf2", "NikonAf22"}) {
    const auto bytes = context.tags.structure(group);
    if (const auto area = contrast_area(bytes, context.tags.maker_note_is_big_endian())) {
      note.focus_areas.push_back(*area);
      return;
    }
  }
}

// ---- the rest -------------------------------------------------------------------------------------------------------

// "AF-S", "AF-C", "MANUAL", "MF"; with "AF-A" the body chose, and does not say what.
void take_focus_mode(const NoteContext& context, const char* key, MakerNote& note) {
  const auto text = context.tags.text(key);
  if (note.focus_mode || !text) return;
  if (text->starts_with("AF-S")) note.focus_mode = FocusMode::single;
  if (text->starts_with("AF-C") || text->starts_with("AF-F")) note.focus_mode = FocusMode::continuous;
  if (text->starts_with("MANUAL") || text->starts_with("MF")) note.focus_mode = FocusMode::manual;
}

// First byte of the structure.
constexpr take::Code<bool> kStabiliser[] = {{1, true}, {2, false}};

constexpr std::int64_t kNoCount = 4294965247;  // written by bodies that do not tell

constexpr NoteRow kRows[] = {
    {"Exif.NikonLd4.Version", take_fine_distance},
    {"Exif.NikonLd3.FocusDistance", take_distance<1>},
    {"Exif.NikonLd2.FocusDistance", take_distance<0>},
    {"Exif.NikonLd4.FocusDistance", take_distance<2>},
    {"Exif.NikonAf2.Version", take_area},
    {"Exif.NikonAf22.Version", take_area},
    {"Exif.Nikon3.Focus", take_focus_mode},
    {"Exif.NikonVr.VibrationReduction", take::stabiliser<kStabiliser>},
    {"Exif.Nikon3.ShutterCount", take::sequence<0, kNoCount>},
    {"Exif.Nikon3.SerialNumber", take::text<&MakerNote::body_serial>},
    {"Exif.NikonLd3.LensIDNumber", take_lens_by_number<1>},
    {"Exif.NikonLd2.LensIDNumber", take_lens_by_number<0>},
    {"Exif.NikonLd4.LensIDNumber", take_lens_by_number<2>},
    {"Exif.Nikon3.Lens", take_lens_range},
};

constexpr Maker kMakers[] = {{"NIKON", kRows}};

}  // namespace

std::span<const Maker> nikon_notes() {
  return kMakers;
}

}  // namespace focusfall
