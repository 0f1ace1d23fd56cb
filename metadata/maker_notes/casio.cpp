#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// Millimetres. From 0x20000000 on: infinity or not measured, which of the two is not told.
void take_object_distance(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr std::int64_t kNone = 0x20000000;
  constexpr double kBound = 0.1;  // judgement
  const auto number = context.tags.integer(key);
  if (note.rough_focus_distance || !number || *number <= 0 || *number >= kNone) return;
  note.rough_focus_distance = distance_within(static_cast<double>(*number) / 1000, kBound);
}

constexpr take::Code<FocusMode> kOldFocusModes[] = {{4, FocusMode::manual}};
constexpr take::Code<FocusMode> kFocusModes[] = {
    {0, FocusMode::manual}, {3, FocusMode::single}, {6, FocusMode::single}};
constexpr take::Code<bool> kStabiliser[] = {{0, false}, {1, true}};

constexpr NoteRow kRows[] = {
    {"Exif.Casio.ObjectDistance", take_object_distance},
    {"Exif.Casio2.ObjectDistance", take_object_distance},
    {"Exif.Casio.FocusMode", take::focus_mode<kOldFocusModes>},
    {"Exif.Casio2.FocusMode2", take::focus_mode<kFocusModes>},
    {"Exif.Casio2.SequenceNumber", take::sequence<>},
    {"Exif.Casio2.ImageStabilization", take::stabiliser<kStabiliser>},
};

// The later notes have six bytes before the directory: "QVC" and three NUL bytes.
bool is_in_place(const NoteContext& context) {
  const auto note = context.tags.bytes("Exif.Photo.MakerNote");
  const bool later = note.size() > 6 && note[0] == 'Q' && note[1] == 'V' && note[2] == 'C';
  return offsets_lie_in_note(context, later ? 6 : 0);
}

constexpr Maker kMakers[] = {{"CASIO", kRows, is_in_place}};

}  // namespace

std::span<const Maker> casio_notes() {
  return kMakers;
}

}  // namespace focusfall
