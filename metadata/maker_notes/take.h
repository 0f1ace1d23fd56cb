// The ways in which a row of a maker's table takes its value.
#pragma once

#include <algorithm>
#include <optional>
#include <string>

#include "metadata/maker_notes/maker_note.h"

namespace focusfall::take {

// A text as it stands: &MakerNote::lens and the like.
template <auto field>
void text(const NoteContext& context, const char* key, MakerNote& note) {
  if (!(note.*field)) note.*field = context.tags.text(key);
}

// The printed name of a lens number, where Exiv2 knows it: such a name holds a focal length.
inline void lens_by_number(const NoteContext& context, const char* key, MakerNote& note) {
  if (note.lens) return;
  const auto name = context.tags.printed(key);
  if (name && name->find("mm") != std::string::npos) note.lens = *name;
}

// A counter or a place in a burst. `none` is what says that there is no such thing, beside 0.
template <std::size_t component = 0, std::int64_t none = 0>
void sequence(const NoteContext& context, const char* key, MakerNote& note) {
  if (note.sequence) return;
  const auto number = context.tags.integer(key, component);
  if (number && *number > 0 && *number != none) note.sequence = static_cast<long>(*number);
}

// Codes of a maker and their meaning; a code that is not in the list says nothing.
template <class T>
struct Code {
  std::int64_t code;
  T meaning;
};

template <class T, std::size_t n>
std::optional<T> meaning(const Code<T> (&codes)[n], std::optional<std::int64_t> seen) {
  for (const Code<T>& code : codes) {
    if (seen == code.code) return code.meaning;
  }
  return std::nullopt;
}

template <const auto& codes, std::size_t component = 0>
void focus_mode(const NoteContext& context, const char* key, MakerNote& note) {
  if (!note.focus_mode) note.focus_mode = meaning(codes, context.tags.integer(key, component));
}

template <const auto& codes, std::size_t component = 0>
void stabiliser(const NoteContext& context, const char* key, MakerNote& note) {
  if (!note.stabiliser_on) note.stabiliser_on = meaning(codes, context.tags.integer(key, component));
}

}  // namespace focusfall::take
