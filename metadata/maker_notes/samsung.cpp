#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

constexpr NoteRow kRows[] = {{"Exif.Samsung2.LensType", take::lens_by_number}};
constexpr Maker kMakers[] = {{"SAMSUNG", kRows}};

}  // namespace

std::span<const Maker> samsung_notes() {
  return kMakers;
}

}  // namespace focusfall
