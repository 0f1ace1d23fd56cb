#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// The numerator in mm; the denominator means nothing. From 0xfffffff0 on: infinity or no reading, which of the two is
// not told.
void take_focus_distance(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr std::int64_t kNone = 0xFFFFFFF0;
  constexpr double kBound = 0.05;   // judgement: a lens encoder, better than those that write in steps of 6 %
  const auto ratio = context.tags.ratio(key);
  if (note.focus_distance || !ratio || ratio->numerator <= 0 || ratio->numerator >= kNone) return;
  note.focus_distance = distance_within(static_cast<double>(ratio->numerator) / 1000, kBound);
}

// The second to the fifth fraction: left, top, right, bottom; 0/0 or all the same place with no extent is none.
void take_selected_point(const NoteContext& context, const char* key, MakerNote& note) {
  if (!note.focus_areas.empty()) return;
  double v[4] = {};
  for (std::size_t i = 0; i < 4; ++i) {
    const auto fraction = context.tags.real(key, i + 1);
    if (!fraction || *fraction < 0 || *fraction > 1) return;
    v[i] = *fraction;
  }
  if (v[2] < v[0] || v[3] < v[1] || (v[2] == 0 && v[3] == 0)) return;
  note.focus_areas.push_back({v[0], v[1], v[2] - v[0], v[3] - v[1]});
}

// Four bytes of each number: left, top, right, bottom in 255ths; 0 is none. The first one counts.
void take_areas(const NoteContext& context, const char* key, MakerNote& note) {
  const auto packed = context.tags.integer(key);
  if (!note.focus_areas.empty() || !packed || *packed == 0) return;
  const auto byte = [&](int shift) { return static_cast<double>(*packed >> shift & 0xFF) / 255; };
  const double left = byte(24), top = byte(16), right = byte(8), bottom = byte(0);
  if (right >= left && bottom >= top) note.focus_areas.push_back({left, top, right - left, bottom - top});
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
    {"Exif.OlympusCs.AFPointSelected", take_selected_point},
    {"Exif.OlympusCs.AFAreas", take_areas},
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

std::span<const Maker> olympus_notes() { return kMakers; }

}  // namespace focusfall
