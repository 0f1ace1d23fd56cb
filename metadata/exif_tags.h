// Exif tags by key, read so that the traps of the format and of Exiv2 are met in one place.
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

namespace Exiv2 {
class ExifData;
class Exifdatum;
class Value;
}  // namespace Exiv2

namespace focusfall {

// A fraction as it is written, before anything is divided: the special values of the makers live in its two parts.
struct Ratio {
  std::int64_t numerator = 0;
  std::int64_t denominator = 0;
};

// A view of the tags of one file, which must outlive it. Keys are those of Exiv2 ("Exif.Photo.FNumber"). Every reader
// gives std::nullopt (or nothing) for a key that is not there, a component past the end, a value of another kind, and
// a number that is not finite. Of tags that stand twice in a file the first counts.
class ExifTags {
 public:
  explicit ExifTags(const Exiv2::ExifData& data);

  bool has(std::string_view key) const { return find(key) != nullptr; }
  std::size_t count(std::string_view key) const;

  // Whether there is a tag of a group whose name starts so ("Canon" for Canon, CanonCs, CanonFi, ...).
  bool has_group(std::string_view start) const;

  // Integers of any width, signed or not, and the bytes of undefined data.
  std::optional<std::int64_t> integer(std::string_view key, std::size_t component = 0) const;

  // Signed and unsigned rationals, each with its own sign.
  std::optional<Ratio> ratio(std::string_view key, std::size_t component = 0) const;

  // Integers, floating point numbers, and rationals divided; n/0 is absent.
  std::optional<double> real(std::string_view key, std::size_t component = 0) const;

  // Text without the spaces and NUL bytes around it; absent where nothing is left. Text that a maker keeps in
  // undefined bytes is read up to the first NUL.
  std::optional<std::string> text(std::string_view key) const;

  // The value as Exiv2 would print it for people ("AF-S", "300.0 mm"); for names of lenses above all.
  std::optional<std::string> printed(std::string_view key) const;

  // The bytes of a value; wider numbers in little-endian order.
  std::vector<std::uint8_t> bytes(std::string_view key) const;

  // Makers keep structures of mixed types that Exiv2 takes apart, sometimes by the layout of another body. `structure`
  // puts the bytes of a group ("NikonAf2") together again, each tag at the offset of its number times `unit_bytes`, in
  // the byte order of the maker note. Nothing is made up: the structure ends before the first gap.
  std::vector<std::uint8_t> structure(std::string_view group, std::size_t unit_bytes = 1) const;

  // "II" or "MM" of the maker note, Exiv2's own statement.
  bool maker_note_is_big_endian() const;

 private:
  const Exiv2::Value* find(std::string_view key) const;

  const Exiv2::ExifData& data_;
  std::unordered_map<std::string, const Exiv2::Exifdatum*> first_;
};

// The number that two bytes at `offset` hold; absent past the end.
std::optional<std::uint16_t> two_bytes(const std::vector<std::uint8_t>& bytes, std::size_t offset, bool big_endian);

// `text` without the spaces, line ends and NUL bytes around it.
std::string trimmed(std::string_view text);

}  // namespace focusfall
