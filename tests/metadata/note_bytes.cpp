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

constexpr std::uint16_t kDirectoryType = 13;

// The pointers are the last entries, so that `entries` must have smaller tags; all of them fit into four bytes.
Bytes with_directories(Bytes start, std::vector<NoteEntry> entries, const std::vector<SubDirectory>& parts,
                       std::uint16_t type) {
  const std::size_t part_at = start.size() + 2 + 12 * (entries.size() + parts.size()) + 4;
  Bytes all(part_at, 0);  // place for what comes before the parts, so that their offsets are right
  for (const SubDirectory& part : parts) {
    NoteEntry pointer{part.tag, type, 1, {}};
    append_four(pointer.data, all.size());
    entries.push_back(pointer);
    append_directory(all, part.entries);
  }
  append_directory(start, entries);
  start.insert(start.end(), all.begin() + static_cast<std::ptrdiff_t>(part_at), all.end());
  return start;
}

}  // namespace

Bytes olympus_note(const std::vector<SubDirectory>& parts) {
  return with_directories({'O', 'L', 'Y', 'M', 'P', 'U', 'S', 0, 'I', 'I', 3, 0}, {}, parts, kDirectoryType);
}

Bytes om_system_note(const std::vector<SubDirectory>& parts) {
  return with_directories({'O', 'M', ' ', 'S', 'Y', 'S', 'T', 'E', 'M', 0, 0, 0, 'I', 'I', 4, 0}, {}, parts,
                          kDirectoryType);
}

Bytes tiff_file(const std::vector<NoteEntry>& entries, const std::vector<SubDirectory>& parts) {
  constexpr std::uint16_t kLong = 4;
  return with_directories({'I', 'I', 42, 0, 8, 0, 0, 0}, entries, parts, kLong);
}

}  // namespace focusfall
