#include <fmt/format.h>
#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <limits>

#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// 2 lets the body choose, and it does not say what it chose.
constexpr take::Code<FocusMode> kFocusModes[] = {{0, FocusMode::single},     {1, FocusMode::continuous},
                                                 {3, FocusMode::manual},     {4, FocusMode::single},
                                                 {5, FocusMode::continuous}, {6, FocusMode::manual}};

// The bit 0x100 is set by some bodies and changes nothing; 65535 is "not known".
constexpr take::Code<bool> kStabiliser[] = {{0, false}, {256, false}, {1, true},   {2, true},   {3, true},
                                            {4, true},  {257, true},  {258, true}, {259, true}, {260, true}};

// An editor that moves the note without its offsets leaves arrays that do not begin with their own length in bytes.
bool is_in_place(const NoteContext& context) {
  if (!offsets_lie_in_note(context, 0)) return false;
  const struct {
    const char* length;
    const char* group;
  } arrays[] = {
      {"Exif.CanonSi.0x0000", "CanonSi"}, {"Exif.CanonCs.0x0000", "CanonCs"}, {"Exif.CanonFi.0x0000", "CanonFi"}};
  constexpr std::int64_t kSlack = 4;
  for (const auto& [length, group] : arrays) {
    const auto stated = context.tags.integer(length);
    if (!stated) continue;
    const auto found = static_cast<std::int64_t>(context.tags.structure(group, 2).size());
    if (std::abs(*stated - found) > kSlack) return false;
  }
  return true;
}

// ---- focus distance -------------------------------------------------------------------------------------------------

// Nothing says that the distance follows a ring that is turned by hand after the camera had focused (judgement).
FocusDistance with_staleness(FocusDistance distance, const NoteContext& context) {
  distance.stale = meaning(kFocusModes, context.tags.integer("Exif.CanonCs.FocusMode")) == FocusMode::manual;
  return distance;
}

// Where only the far end is given (judgement; the interval is seldom narrower than that where both are).
constexpr double kOneEndBound = 0.2;

// Two ends in cm, unsigned although Exiv2 delivers them signed. Far end 0: not known. 65535: infinity, and with it the
// near end 8191 is infinity too.
void take_distance_interval(const NoteContext& context, const char* key, MakerNote& note) {
  const auto upper_tag = context.tags.integer(key);
  const auto lower_tag = context.tags.integer("Exif.CanonFi.FocusDistanceLower");
  if (note.focus_distance || !upper_tag) return;
  constexpr double kInfinite = 65535, kInfiniteNearEnd = 8191;
  const double upper = static_cast<std::uint16_t>(*upper_tag),
               lower = static_cast<std::uint16_t>(lower_tag.value_or(0));
  if (upper == 0) return;
  FocusDistance distance;
  if (upper == kInfinite && (lower == 0 || lower >= kInfiniteNearEnd)) {
    distance = distance_at_infinity(kInfiniteNearEnd / 100);
  } else if (upper == kInfinite) {
    distance = distance_between(lower / 100, std::numeric_limits<double>::infinity());
  } else if (lower == 0 || lower == kInfinite) {
    distance = distance_within(upper / 100, kOneEndBound);
  } else {
    distance = distance_between(lower / 100, upper / 100);
  }
  note.focus_distance = with_staleness(distance, context);
}

// In cm, but in mm on compacts of about 2001, which show it by the same number in Exif SubjectDistance. Some bodies
// write a second end into the next word. Little trust: the bound of a lone end is judgement. 0: not known; 65535 and
// 6553: infinity.
void take_subject_distance(const NoteContext& context, const char* key, MakerNote& note) {
  const auto number = context.tags.integer(key);
  if (note.rough_focus_distance || !number || *number <= 0) return;
  constexpr double kBound = 0.3, kInfinityFromM = 65.53;
  const auto is_infinite = [](std::int64_t end) { return end == 65535 || end == 6553; };
  const auto other = context.tags.integer("Exif.CanonSi.0x0014").value_or(0);
  if (is_infinite(*number)) {
    note.rough_focus_distance = with_staleness(distance_at_infinity(kInfinityFromM), context);
    return;
  }
  const double value = static_cast<double>(*number);
  const bool millimetres = context.subject_distance_m && std::abs(*context.subject_distance_m * 1000 - value) < 1;
  const double unit_m = millimetres ? 0.001 : 0.01;
  const auto distance = other > 0 && !is_infinite(other)
                            ? distance_between(value * unit_m, static_cast<double>(other) * unit_m)
                            : distance_within(value * unit_m, kBound);
  note.rough_focus_distance = with_staleness(distance, context);
}

// ---- focus area -----------------------------------------------------------------------------------------------------

struct AfPoint {
  double x = 0, y = 0;  // centre, from the centre of the AF space, y as the body counts it
  double width = 0, height = 0;
};

struct AfSpace {
  double width = 0, height = 0;
};

bool bit(const std::vector<std::uint16_t>& words, std::size_t first, std::size_t index) {
  const std::size_t word = first + index / 16;
  return word < words.size() && (words[word] >> (index % 16) & 1) != 0;
}

double as_signed(std::uint16_t word) {
  return static_cast<std::int16_t>(word);
}

// EOS bodies count y upwards, PowerShot bodies downwards.
FractionRect frame_rect(const AfPoint& point, const AfSpace& space, bool y_upwards) {
  const double width = point.width / space.width, height = point.height / space.height;
  const double y = point.y / space.height;
  return {0.5 + point.x / space.width - width / 2, 0.5 + (y_upwards ? -y : y) - height / 2, width, height};
}

FractionRect bounding_box(const std::vector<FractionRect>& boxes) {
  FractionRect all = boxes.front();
  for (const FractionRect& box : boxes) {
    const double right = std::max(all.x + all.width, box.x + box.width);
    const double bottom = std::max(all.y + all.height, box.y + box.height);
    all.x = std::min(all.x, box.x);
    all.y = std::min(all.y, box.y);
    all.width = right - all.x;
    all.height = bottom - all.y;
  }
  return all;
}

// Several points in focus are one area where they cover at least a quarter of the box around them (judgement: a
// cluster on one subject); scattered points are areas of their own, the one nearest to the centre first.
void add_areas(std::vector<FractionRect> boxes, MakerNote& note) {
  if (boxes.empty() || !note.focus_areas.empty()) return;
  const FractionRect all = bounding_box(boxes);
  double covered = 0;
  for (const FractionRect& box : boxes) covered += box.width * box.height;
  constexpr double kCluster = 0.25;
  if (boxes.size() == 1 || covered >= kCluster * all.width * all.height) {
    note.focus_areas.push_back(all);
    return;
  }
  const auto from_centre = [](const FractionRect& box) {
    return std::hypot(box.x + box.width / 2 - 0.5, box.y + box.height / 2 - 0.5);
  };
  std::ranges::stable_sort(boxes, {}, from_centre);
  note.focus_areas = std::move(boxes);
}

bool counts_upwards(const NoteContext& context) {
  return context.model.find("EOS") != std::string::npos;
}

// Most points that an array can be meant to hold (judgement; bodies have up to 1053).
constexpr std::size_t kMostPoints = 4096;

// Words: bytes, mode, points n, valid points, image size, AF space; then n widths, n heights, n x, n y, the bits of the
// points in focus, the bits of those selected. Mode 0 is focusing by hand.
void take_af_info(const NoteContext& context, const char* key, MakerNote& note) {
  std::vector<std::uint16_t> words;
  for (std::size_t i = 0; i < context.tags.count(key); ++i) {
    words.push_back(static_cast<std::uint16_t>(context.tags.integer(key, i).value_or(0)));
  }
  if (words.size() < 8 || words[1] == 0 || words[6] == 0 || words[7] == 0) return;
  const std::size_t n = words[2], valid = std::min<std::size_t>(words[3], n);
  if (n > kMostPoints || words.size() < 8 + 4 * n + (n + 15) / 16) return;
  const AfSpace space{static_cast<double>(words[6]), static_cast<double>(words[7])};
  std::vector<FractionRect> boxes;
  for (std::size_t i = 0; i < valid; ++i) {
    if (!bit(words, 8 + 4 * n, i)) continue;
    const AfPoint point{as_signed(words[8 + 2 * n + i]), as_signed(words[8 + 3 * n + i]), as_signed(words[8 + i]),
                        as_signed(words[8 + n + i])};
    boxes.push_back(frame_rect(point, space, counts_upwards(context)));
  }
  add_areas(std::move(boxes), note);
}

// The older form, one size for all points. Exiv2's names in it hold for seven points only.
void take_picture_info(const NoteContext& context, const char*, MakerNote& note) {
  const auto bytes = context.tags.structure("CanonPi", 2);
  std::vector<std::uint16_t> words;
  for (std::size_t i = 0; i + 2 <= bytes.size(); i += 2) {
    words.push_back(two_bytes(bytes, i, context.tags.maker_note_is_big_endian()).value_or(0));
  }
  if (words.size() < 8 || words[4] == 0 || words[5] == 0) return;
  const std::size_t n = words[0], valid = std::min<std::size_t>(words[1], n);
  if (n > kMostPoints || words.size() < 8 + 2 * n + (n + 15) / 16) return;
  const AfSpace space{static_cast<double>(words[4]), static_cast<double>(words[5])};
  std::vector<FractionRect> boxes;
  for (std::size_t i = 0; i < valid; ++i) {
    if (!bit(words, 8 + 2 * n, i)) continue;
    const AfPoint point{as_signed(words[8 + i]), as_signed(words[8 + n + i]), static_cast<double>(words[6]),
                        static_cast<double>(words[7])};
    boxes.push_back(frame_rect(point, space, counts_upwards(context)));
  }
  add_areas(std::move(boxes), note);
}

// ---- the rest -------------------------------------------------------------------------------------------------------

// Words 5 and 7: the first and the last column that belong to the picture.
void take_sensor_width(const NoteContext& context, const char* key, MakerNote& note) {
  const auto left = context.tags.integer(key, 5), right = context.tags.integer(key, 7);
  if (left && right && *left > 0 && *right > *left) note.sensor_active_width_px = static_cast<int>(*right - *left + 1);
}

// 0 large, 1 and above smaller ones; 65535 not known.
void take_image_size(const NoteContext& context, const char* key, MakerNote& note) {
  const auto size = context.tags.integer(key);
  note.reduced_by_camera = size && *size > 0 && *size < 0x8000;
}

void take_digital_zoom(const NoteContext& context, const char* key, MakerNote& note) {
  const auto zoom = context.tags.integer(key);
  note.digital_zoom = zoom && *zoom > 0 && *zoom < 0x8000;
}

// Two numbers "16-35" or one "400" in the name of a lens.
bool name_has_range(const std::string& name, double shortest, double longest) {
  const std::string low = std::to_string(static_cast<long>(std::lround(shortest)));
  const std::string high = std::to_string(static_cast<long>(std::lround(longest)));
  return name.find(low == high ? low + "mm" : low + "-" + high) != std::string::npos;
}

// Lens numbers are shared by several lenses; the name is believed where the range in it is the recorded one.
void take_lens_by_number(const NoteContext& context, const char* key, MakerNote& note) {
  const auto name = context.tags.printed(key);
  const auto longest = context.tags.real("Exif.CanonCs.Lens", 0), shortest = context.tags.real("Exif.CanonCs.Lens", 1);
  const auto units = context.tags.real("Exif.CanonCs.Lens", 2);
  if (note.lens || !name || !longest || !shortest || !units || *units <= 0) return;
  if (name_has_range(*name, *shortest / *units, *longest / *units)) note.lens = *name;
}

// "16-35 mm", where the lens can be changed and tells no name.
void take_lens_range(const NoteContext& context, const char* key, MakerNote& note) {
  const auto longest = context.tags.real(key, 0), shortest = context.tags.real(key, 1),
             units = context.tags.real(key, 2);
  if (note.lens || context.model.find("EOS") == std::string::npos) return;
  if (!longest || !shortest || !units || *units <= 0 || *shortest <= 0 || *longest < *shortest) return;
  const double low = *shortest / *units, high = *longest / *units;
  note.lens = low == high ? fmt::format("{:g} mm", low) : fmt::format("{:g}-{:g} mm", low, high);
}

// As it is engraved: ten digits on most bodies; the first ones print it as four hexadecimal digits and five decimal
// ones, or as six.
void take_serial(const NoteContext& context, const char* key, MakerNote& note) {
  const auto number = context.tags.integer(key);
  if (note.body_serial || !number || *number <= 0) return;
  if (context.model.ends_with("EOS D30")) {
    note.body_serial = fmt::format("{:04x}-{:05d}", *number >> 16, *number & 0xFFFF);
  } else {
    note.body_serial = fmt::format("{:0{}d}", *number, context.model.ends_with("EOS-1D") ? 6 : 10);
  }
}

// The speed set times the gain of the automatic, both as 32nds of a stop: ISO 100/32 x 2^(v/32), and 2^(v/32).
void take_iso_speed(const NoteContext& context, const char* key, MakerNote& note) {
  const auto base = context.tags.integer(key), gain = context.tags.integer("Exif.CanonSi.AutoISO");
  if (note.iso_speed || !base || *base <= 0 || !gain) return;
  note.iso_speed = 100.0 / 32 * std::exp2(static_cast<double>(*base + *gain) / 32);
}

// The second number, in units of the third number of the lens; the first raw files have no other.
void take_focal_length(const NoteContext& context, const char* key, MakerNote& note) {
  const auto number = context.tags.real(key, 1), units = context.tags.real("Exif.CanonCs.Lens", 2);
  if (!note.focal_length_mm && number && *number > 0 && units && *units > 0) note.focal_length_mm = *number / *units;
}

// 32nds of a stop, in which 12 and 20 stand for one and two thirds.
double stops(std::int64_t code) {
  const std::int64_t magnitude = std::abs(code), part = magnitude % 32;
  const double fraction = part == 12 ? 32.0 / 3 : part == 20 ? 64.0 / 3 : static_cast<double>(part);
  return (code < 0 ? -1 : 1) * (static_cast<double>(magnitude - part) + fraction) / 32;
}

// The first raw files have no Exif. What Exiv2 puts in its place is 1 s for every longer time, because it reads the
// number without its sign.
void take_exposure_time(const NoteContext& context, const char* key, MakerNote& note) {
  const auto number = context.tags.integer(key);
  if (note.exposure_time_s || !number || context.tags.has("Exif.Photo.ExifVersion")) return;
  note.exposure_time_s = std::exp2(-stops(static_cast<std::int16_t>(*number)));
}

constexpr NoteRow kRows[] = {
    {"Exif.CanonFi.FocusDistanceUpper", take_distance_interval},
    {"Exif.CanonSi.SubjectDistance", take_subject_distance},
    {"Exif.Canon.AFInfo", take_af_info},
    {"Exif.Canon.AFInfo3", take_af_info},
    {"Exif.CanonPi.0x0000", take_picture_info},
    {"Exif.CanonCs.FocusMode", take::focus_mode<kFocusModes>},
    {"Exif.CanonCs.ImageStabilization", take::stabiliser<kStabiliser>},
    {"Exif.Canon.LensModel", take::text<&MakerNote::lens>},
    {"Exif.CanonCs.LensType", take_lens_by_number},
    {"Exif.CanonCs.Lens", take_lens_range},
    {"Exif.Canon.SerialNumber", take_serial},
    {"Exif.Canon.FocalLength", take_focal_length},
    {"Exif.CanonSi.ISOSpeed", take_iso_speed},
    {"Exif.CanonSi.ShutterSpeedValue", take_exposure_time},
    {"Exif.Canon.SensorInfo", take_sensor_width},
    {"Exif.CanonCs.ImageSize", take_image_size},
    {"Exif.CanonCs.DigitalZoom", take_digital_zoom},
};

constexpr Maker kMakers[] = {{"CANON", kRows, is_in_place}};

}  // namespace

std::span<const Maker> canon_notes() {
  return kMakers;
}

}  // namespace focusfall
