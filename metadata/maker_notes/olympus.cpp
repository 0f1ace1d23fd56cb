#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// The numerator in mm; the denominator means nothing. From 0xfffffff0 on: infinity or no reading, which of the two is
// not told.
void take_focus_distance(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr std::int64_t kNone = 0xFFFFFFF0;
  constexpr double kBound = 0.05;  // judgement: a lens encoder, better than those that write in steps of 6 %
  const auto ratio = context.tags.ratio(key);
  if (note.focus_distance || !ratio || ratio->numerator <= 0 || ratio->numerator >= kNone) return;
  note.focus_distance = distance_within(static_cast<double>(ratio->numerator) / 1000, kBound);
}

// Four bytes: left, top, right, bottom in 255ths; 0 is none. The first of the areas counts.
std::optional<FractionRect> first_area(const ExifTags& tags) {
  const auto packed = tags.integer("Exif.OlympusCs.AFAreas");
  if (!packed || *packed == 0) return std::nullopt;
  const auto byte = [&](int shift) { return static_cast<double>(*packed >> shift & 0xFF) / 255; };
  const double left = byte(24), top = byte(16), right = byte(8), bottom = byte(0);
  if (right < left || bottom < top) return std::nullopt;
  return FractionRect{left, top, right - left, bottom - top};
}

// The second to the fifth fraction: left, top, right, bottom, often of no extent; 0/0 is none.
std::optional<FractionRect> selected_point(const ExifTags& tags) {
  double v[4] = {};
  for (std::size_t i = 0; i < 4; ++i) {
    const auto fraction = tags.real("Exif.OlympusCs.AFPointSelected", i + 1);
    if (!fraction || *fraction < 0 || *fraction > 1) return std::nullopt;
    v[i] = *fraction;
  }
  if (v[2] < v[0] || v[3] < v[1] || (v[2] == 0 && v[3] == 0)) return std::nullopt;
  return FractionRect{v[0], v[1], v[2] - v[0], v[3] - v[1]};
}

bool contains(const FractionRect& box, double x, double y) {
  return x >= box.x && x <= box.x + box.width && y >= box.y && y <= box.y + box.height;
}

// The point that was used; the area gives it its extent where it lies in it.
void take_focus_area(const NoteContext& context, const char*, MakerNote& note) {
  if (!note.focus_areas.empty()) return;
  const auto point = selected_point(context.tags), area = first_area(context.tags);
  if (point && !(area && contains(*area, point->x + point->width / 2, point->y + point->height / 2))) {
    note.focus_areas.push_back(*point);
  } else if (area) {
    note.focus_areas.push_back(*area);
  }
}

constexpr take::Code<FocusMode> kFocusModes[] = {
    {0, FocusMode::single}, {2, FocusMode::continuous}, {10, FocusMode::manual}};
constexpr take::Code<bool> kStabiliser[] = {{0, false}, {1, true}, {2, true}, {3, true}, {4, true}};

void take_diagonal(const NoteContext& context, const char* key, MakerNote& note) {
  const auto diagonal = context.tags.real(key);
  if (diagonal && *diagonal > 0) note.sensor_diagonal_mm = *diagonal;
}

constexpr NoteRow kRows[] = {
    {"Exif.OlympusFi.FocusDistance", take_focus_distance},
    {"Exif.OlympusCs.AFPointSelected", take_focus_area},
    {"Exif.OlympusCs.AFAreas", take_focus_area},
    {"Exif.OlympusCs.FocusMode", take::focus_mode<kFocusModes>},
    {"Exif.OlympusCs.ImageStabilization", take::stabiliser<kStabiliser>},
    {"Exif.OlympusCs.DriveMode", take::sequence<1>},
    {"Exif.OlympusEq.SerialNumber", take::text<&MakerNote::body_serial>},
    {"Exif.OlympusEq.LensModel", take::text<&MakerNote::lens>},
    {"Exif.OlympusEq.LensType", take::lens_by_number},
    {"Exif.OlympusEq.LensSerialNumber", take::text<&MakerNote::lens_serial>},
    {"Exif.OlympusEq.FocalPlaneDiagonal", take_diagonal},
};

constexpr Maker kMakers[] = {{"OLYMPUS", kRows}, {"OM DIGITAL", kRows}};

}  // namespace

std::span<const Maker> olympus_notes() {
  return kMakers;
}

}  // namespace focusfall
