#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// 18 lets the body choose, and it does not say what it chose.
constexpr take::Code<FocusMode> kFocusModes[] = {
    {3, FocusMode::manual}, {16, FocusMode::single}, {17, FocusMode::continuous}};

// The second byte of the structure.
constexpr take::Code<bool> kStabiliser[] = {{0, false}, {1, true}, {4, false}, {6, true}, {7, true}};

constexpr NoteRow kRows[] = {
    {"Exif.Pentax.Focus", take::focus_mode<kFocusModes>},
    {"Exif.PentaxDng.Focus", take::focus_mode<kFocusModes>},
    {"Exif.Pentax.ShakeReduction", take::stabiliser<kStabiliser, 1>},
    {"Exif.PentaxDng.ShakeReduction", take::stabiliser<kStabiliser, 1>},
    {"Exif.Pentax.LensType", take::lens_by_number},
    {"Exif.PentaxDng.LensType", take::lens_by_number},
    {"Exif.Pentax.SerialNumber", take::text<&MakerNote::body_serial>},
    {"Exif.PentaxDng.SerialNumber", take::text<&MakerNote::body_serial>},
};

// Notes that begin with "AOC" have their directory at byte 6 and count from the start of the TIFF header; the later
// ones count from their own start and can be moved.
bool is_in_place(const NoteContext& context) {
  const auto note = context.tags.bytes("Exif.Photo.MakerNote");
  const bool counts_from_header = note.size() > 6 && note[0] == 'A' && note[1] == 'O' && note[2] == 'C';
  return !counts_from_header || offsets_lie_in_note(context, 6);
}

// Cameras of the company's former name, Asahi, use the same tags for other codes and are not read.
constexpr Maker kMakers[] = {{"PENTAX", kRows, is_in_place}, {"RICOH", kRows, is_in_place}};

}  // namespace

std::span<const Maker> pentax_notes() {
  return kMakers;
}

}  // namespace focusfall
