#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// A point in fractions of the frame; 16777216 is none.
void take_point(const NoteContext& context, const char* key, MakerNote& note) {
  const auto x = context.tags.real(key, 0), y = context.tags.real(key, 1);
  if (!note.focus_areas.empty() || !x || !y) return;
  if (*x > 0 && *x <= 1 && *y > 0 && *y <= 1) note.focus_areas.push_back({*x, *y, 0, 0});
}

constexpr take::Code<FocusMode> kFocusModes[] = {
    {2, FocusMode::manual}, {5, FocusMode::continuous}, {6, FocusMode::single}, {7, FocusMode::continuous}};
constexpr take::Code<bool> kStabiliser[] = {{2, true}, {3, false}, {4, true},  {5, true},  {6, true},
                                            {7, true}, {9, true},  {10, true}, {11, true}, {12, true}};

constexpr NoteRow kRows[] = {
    {"Exif.Panasonic.AFPointPosition", take_point},
    {"Exif.Panasonic.FocusMode", take::focus_mode<kFocusModes>},
    {"Exif.Panasonic.ImageStabilization", take::stabiliser<kStabiliser>},
    {"Exif.Panasonic.SequenceNumber", take::sequence<>},
    {"Exif.Panasonic.LensType", take::text<&MakerNote::lens>},
    {"Exif.Panasonic.LensSerialNumber", take::text<&MakerNote::lens_serial>},
    {"Exif.Panasonic.InternalSerialNumber", take::text<&MakerNote::body_serial>},
};

// "Panasonic" and three NUL bytes stand before the directory.
bool is_in_place(const NoteContext& context) {
  return offsets_lie_in_note(context, 12);
}

constexpr Maker kMakers[] = {{"PANASONIC", kRows, is_in_place}, {"LEICA", kRows}};

}  // namespace

std::span<const Maker> panasonic_notes() {
  return kMakers;
}

}  // namespace focusfall
