#include "metadata/maker_notes/maker_note.h"

#include <algorithm>
#include <array>
#include <cctype>

namespace focusfall {
namespace {

constexpr std::array kAllMakers = {apple_notes,   canon_notes,   casio_notes,   fujifilm_notes,
                                   minolta_notes, nikon_notes,   olympus_notes, panasonic_notes,
                                   pentax_notes,  samsung_notes, sony_notes};

std::string capitals(std::string text) {
  std::ranges::transform(text, text.begin(), [](unsigned char c) { return static_cast<char>(std::toupper(c)); });
  return text;
}

}  // namespace

bool offsets_lie_in_note(const NoteContext& context, std::size_t directory_at) {
  const auto note = context.tags.bytes("Exif.Photo.MakerNote");
  const auto note_at = context.tags.integer("Exif.MakerNote.Offset");
  if (note.empty() || !note_at) return true;
  const bool big_endian = context.tags.maker_note_is_big_endian();
  const auto two = [&](std::size_t at) { return std::int64_t{two_bytes(note, at, big_endian).value_or(0)}; };
  const auto four = [&](std::size_t at) {
    return big_endian ? two(at) << 16 | two(at + 2) : two(at + 2) << 16 | two(at);
  };
  // Bytes of one value by its type (TIFF 6.0): byte, text, short, long, rational, …, double.
  constexpr std::array<std::int64_t, 13> kTypeBytes = {0, 1, 1, 2, 4, 8, 1, 1, 2, 4, 8, 4, 8};
  constexpr std::size_t kEntryBytes = 12;
  const auto end = *note_at + static_cast<std::int64_t>(note.size());
  int inside = 0, outside = 0;
  for (std::int64_t i = 0; i < two(directory_at); ++i) {
    const std::size_t entry = directory_at + 2 + kEntryBytes * static_cast<std::size_t>(i);
    if (entry + kEntryBytes > note.size()) break;
    const std::int64_t type = two(entry + 2);
    if (type < 1 || type >= static_cast<std::int64_t>(kTypeBytes.size())) continue;
    const std::int64_t bytes = four(entry + 4) * kTypeBytes[static_cast<std::size_t>(type)];
    if (bytes <= 4) continue;
    const std::int64_t at = four(entry + 8);
    ++(at >= *note_at && at + bytes <= end ? inside : outside);
  }
  return outside <= inside;
}

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
