#include "tests/metadata/note_bytes.h"

namespace focusfall {

void append_two(Bytes& bytes, std::size_t value) {
  bytes.push_back(static_cast<std::uint8_t>(value & 0xFF));
  bytes.push_back(static_cast<std::uint8_t>(value >> 8 & 0xFF));
}

void append_four(Bytes& bytes, std::size_t value) {
  append_two(bytes, value & 0xFFFF);
  append_two(bytes, value >> 16 & 0xFFFF);
}

NoteEntry shorts(std::uint16_t tag, std::initializer_list<int> values) {
  NoteEntry entry{tag, 3, static_cast<std::uint32_t>(values.size()), {}};
  for (const int value : values) append_two(entry.data, static_cast<std::size_t>(value));
  return entry;
}

NoteEntry longs(std::uint16_t tag, std::initializer_list<std::uint32_t> values) {
  NoteEntry entry{tag, 4, static_cast<std::uint32_t>(values.size()), {}};
  for (const std::uint32_t value : values) append_four(entry.data, value);
  return entry;
}

NoteEntry rationals(std::uint16_t tag, std::uint16_t type, std::initializer_list<std::uint32_t> values) {
  NoteEntry entry{tag, type, static_cast<std::uint32_t>(values.size() / 2), {}};
  for (const std::uint32_t value : values) append_four(entry.data, value);
  return entry;
}

NoteEntry text(std::uint16_t tag, const std::string& value) {
  return {tag, 2, static_cast<std::uint32_t>(value.size() + 1), [&] {
            Bytes bytes(value.begin(), value.end());
            bytes.push_back(0);
            return bytes;
          }()};
}

void append_directory(Bytes& bytes, const std::vector<NoteEntry>& entries) {
  std::size_t data_at = bytes.size() + 2 + 12 * entries.size() + 4;
  Bytes data;
  append_two(bytes, entries.size());
  for (const NoteEntry& entry : entries) {
    append_two(bytes, entry.tag);
    append_two(bytes, entry.type);
    append_four(bytes, entry.count);
    if (entry.data.size() <= 4) {
      bytes.insert(bytes.end(), entry.data.begin(), entry.data.end());
      bytes.insert(bytes.end(), 4 - entry.data.size(), 0);
    } else {
      append_four(bytes, data_at + data.size());
      data.insert(data.end(), entry.data.begin(), entry.data.end());
      if (data.size() % 2 != 0) data.push_back(0);
    }
  }
  append_four(bytes, 0);
  bytes.insert(bytes.end(), data.begin(), data.end());
}

namespace {

Bytes note_of_directories(Bytes note, const std::vector<SubDirectory>& parts) {
  std::size_t part_at = note.size() + 2 + 12 * parts.size() + 4;
  Bytes all(part_at, 0);   // place for what comes before the parts, so that their offsets are right
  std::vector<NoteEntry> pointers;
  for (const SubDirectory& part : parts) {
    NoteEntry pointer{part.tag, 13, 1, {}};
    append_four(pointer.data, all.size());
    pointers.push_back(pointer);
    append_directory(all, part.entries);
  }
  append_directory(note, pointers);
  note.insert(note.end(), all.begin() + static_cast<std::ptrdiff_t>(part_at), all.end());
  return note;
}

}  // namespace

Bytes olympus_note(const std::vector<SubDirectory>& parts) {
  return note_of_directories({'O', 'L', 'Y', 'M', 'P', 'U', 'S', 0, 'I', 'I', 3, 0}, parts);
}

Bytes om_system_note(const std::vector<SubDirectory>& parts) {
  return note_of_directories({'O', 'M', ' ', 'S', 'Y', 'S', 'T', 'E', 'M', 0, 0, 0, 'I', 'I', 4, 0}, parts);
}

}  // namespace focusfall
