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

constexpr Maker kMakers[] = {{"PENTAX", kRows}, {"ASAHI", kRows}, {"RICOH", kRows}};

}  // namespace

std::span<const Maker> pentax_notes() { return kMakers; }

}  // namespace focusfall
