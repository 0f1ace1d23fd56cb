#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// Low four bits of the focus settings.
constexpr take::Code<FocusMode> kFocusSettings[] = {
    {0, FocusMode::manual}, {1, FocusMode::single}, {2, FocusMode::continuous}};

void take_focus_settings(const NoteContext& context, const char* key, MakerNote& note) {
  const auto settings = context.tags.integer(key);
  if (!note.focus_mode && settings) note.focus_mode = meaning(kFocusSettings, *settings & 0xF);
}

// 0 is any kind of autofocus and says no more.
constexpr take::Code<FocusMode> kFocusModes[] = {{1, FocusMode::manual}};

// A point in recorded pixels.
void take_focus_pixel(const NoteContext& context, const char* key, MakerNote& note) {
  const auto x = context.tags.real(key, 0), y = context.tags.real(key, 1);
  if (!x || !y || !note.focus_areas.empty() || context.size.width_px <= 0 || context.size.height_px <= 0) return;
  const double across = *x / context.size.width_px, down = *y / context.size.height_px;
  if (across > 0 && across <= 1 && down > 0 && down <= 1) note.focus_areas.push_back({across, down, 0, 0});
}

// Three numbers: the kind of stabiliser, 0 none; the mode, 0 off; what the third is for is not known.
void take_stabiliser(const NoteContext& context, const char* key, MakerNote& note) {
  const auto kind = context.tags.integer(key, 0), mode = context.tags.integer(key, 1);
  if (!note.stabiliser_on && kind && mode) note.stabiliser_on = *kind != 0 && *mode != 0;
}

constexpr NoteRow kRows[] = {
    {"Exif.Fujifilm.0x1023", take_focus_pixel},
    {"Exif.Fujifilm.0x102d", take_focus_settings},
    {"Exif.Fujifilm.FocusMode", take::focus_mode<kFocusModes>},
    {"Exif.Fujifilm.0x1422", take_stabiliser},
    {"Exif.Fujifilm.SequenceNumber", take::sequence<>},
    {"Exif.Fujifilm.SerialNumber", take::text<&MakerNote::body_serial>},
};

constexpr Maker kMakers[] = {{"FUJIFILM", kRows}};

}  // namespace

std::span<const Maker> fujifilm_notes() {
  return kMakers;
}

}  // namespace focusfall
