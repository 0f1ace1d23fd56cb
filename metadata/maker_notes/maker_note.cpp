#include "metadata/maker_notes/maker_note.h"

#include <algorithm>
#include <array>
#include <cctype>

namespace focusfall {
namespace {

constexpr std::array kAllMakers = {apple_notes,   canon_notes,     casio_notes,  fujifilm_notes,
                                   minolta_notes, nikon_notes,     olympus_notes, panasonic_notes,
                                   pentax_notes,  samsung_notes,   sony_notes};

std::string capitals(std::string text) {
  std::ranges::transform(text, text.begin(), [](unsigned char c) { return static_cast<char>(std::toupper(c)); });
  return text;
}

}  // namespace

NoteResult read_maker_note(const std::string& make, const NoteContext& context) {
  NoteResult result;
  const std::string capital_make = capitals(make);
  for (const auto& makers : kAllMakers) {
    for (const Maker& maker : makers()) {
      if (!capital_make.starts_with(maker.make)) continue;
      if (maker.usable != nullptr && !maker.usable(context)) {
        result.unusable = true;
        continue;
      }
      for (const NoteRow& row : maker.rows) {
        if (context.tags.has(row.key)) row.take(context, row.key, result.note);
      }
    }
  }
  return result;
}

}  // namespace focusfall
