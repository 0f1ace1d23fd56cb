// Maker notes written byte by byte, for makers whose notes Exiv2 reads but does not write anew.
#pragma once

#include <cstddef>
#include <cstdint>
#include <initializer_list>
#include <string>
#include <vector>

namespace focusfall {

using Bytes = std::vector<std::uint8_t>;

void append_two(Bytes& bytes, std::size_t value);

void append_four(Bytes& bytes, std::size_t value);

// One entry of an image file directory (TIFF 6.0): `data` are its values, little-endian.
struct NoteEntry {
  std::uint16_t tag = 0;
  std::uint16_t type = 0;
  std::uint32_t count = 0;
  Bytes data;
};

NoteEntry shorts(std::uint16_t tag, std::initializer_list<int> values);

NoteEntry longs(std::uint16_t tag, std::initializer_list<std::uint32_t> values);

// Numerators and denominators in turn; type 5 unsigned, 10 signed.
NoteEntry rationals(std::uint16_t tag, std::uint16_t type, std::initializer_list<std::uint32_t> values);

NoteEntry text(std::uint16_t tag, const std::string& value);

// Appends the directory and its data. Offsets count from the start of `bytes`. Entries in ascending order of tags.
void append_directory(Bytes& bytes, const std::vector<NoteEntry>& entries);

// A directory whose entries are directories, tag by tag: a signature with the byte order and the version ("OLYMPUS",
// since 2020 "OM SYSTEM"), then everything by offsets from the start of the note.
struct SubDirectory {
  std::uint16_t tag = 0;
  std::vector<NoteEntry> entries;
};

Bytes olympus_note(const std::vector<SubDirectory>& parts);
// A whole TIFF file: its first directory holds `entries`, and each of `parts` as a directory.
Bytes tiff_file(const std::vector<NoteEntry>& entries, const std::vector<SubDirectory>& parts);
Bytes om_system_note(const std::vector<SubDirectory>& parts);

}  // namespace focusfall
