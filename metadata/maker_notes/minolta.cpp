#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// Millimetres; 0 is infinity.
void take_focus_distance(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr double kBound = 0.1;         // judgement
  constexpr double kInfinityFromM = 10;  // judgement: compacts with short lenses
  const auto number = context.tags.integer(key);
  if (note.rough_focus_distance || !number || *number < 0) return;
  note.rough_focus_distance = *number == 0 ? distance_at_infinity(kInfinityFromM)
                                           : distance_within(static_cast<double>(*number) / 1000, kBound);
}

// The point chosen by the user, in recorded pixels; it counts where FocusArea says spot (1).
void take_spot(const NoteContext& context, const char* key, MakerNote& note) {
  const auto x = context.tags.real(key), y = context.tags.real("Exif.MinoltaCsNew.SpotFocusPointY");
  if (!x || !y || context.tags.integer("Exif.MinoltaCsNew.FocusArea") != 1 || !note.focus_areas.empty()) return;
  if (*x <= 0 || *y <= 0 || *x >= context.size.width_px || *y >= context.size.height_px) return;
  note.focus_areas.push_back({*x / context.size.width_px, *y / context.size.height_px, 0, 0});
}

// 0 is any kind of autofocus.
constexpr take::Code<FocusMode> kFocusModes[] = {{1, FocusMode::manual}};
constexpr take::Code<bool> kStabiliser[] = {{1, false}, {5, true}};

constexpr NoteRow kRows[] = {
    {"Exif.MinoltaCsNew.FocusDistance", take_focus_distance},
    {"Exif.MinoltaCsNew.SpotFocusPointX", take_spot},
    {"Exif.MinoltaCsNew.FocusMode", take::focus_mode<kFocusModes>},
    {"Exif.Minolta.ImageStabilization", take::stabiliser<kStabiliser>},
};

bool is_in_place(const NoteContext& context) {
  return offsets_lie_in_note(context, 0);
}

constexpr Maker kMakers[] = {{"MINOLTA", kRows, is_in_place}, {"KONICA", kRows, is_in_place}};

}  // namespace

std::span<const Maker> minolta_notes() {
  return kMakers;
}

}  // namespace focusfall
