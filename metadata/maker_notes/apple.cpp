#include <algorithm>
#include <string_view>

#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// The note is an IFD of its own: "Apple iOS", and from byte 14 entries in big-endian order whose offsets count from the
// start of the note.
constexpr std::string_view kSignature = "Apple iOS";
constexpr std::size_t kEntries = 14;

class BigEndianNote {
 public:
  explicit BigEndianNote(const std::vector<std::uint8_t>& bytes) : bytes_(bytes) {}

  std::optional<std::uint32_t> two(std::size_t offset) const {
    const auto word = two_bytes(bytes_, offset, true);
    return word ? std::optional<std::uint32_t>(*word) : std::nullopt;
  }
  std::optional<std::uint32_t> four(std::size_t offset) const {
    const auto high = two(offset), low = two(offset + 2);
    if (!high || !low) return std::nullopt;
    return *high << 16 | *low;
  }

  // Where the data of a tag of this type and count stand.
  std::optional<std::size_t> data_of(std::uint32_t tag, std::uint32_t type, std::uint32_t count) const {
    const std::uint32_t entries = two(kEntries).value_or(0);
    for (std::uint32_t i = 0; i < entries; ++i) {
      const std::size_t entry = kEntries + 2 + std::size_t{12} * i;
      if (!two(entry)) return std::nullopt;
      if (two(entry) == tag && two(entry + 2) == type && four(entry + 4) == count) return four(entry + 8);
    }
    return std::nullopt;
  }

  std::optional<double> signed_rational(std::size_t offset) const {
    const auto numerator = four(offset), denominator = four(offset + 4);
    if (!numerator || !denominator || *denominator == 0) return std::nullopt;
    return static_cast<double>(static_cast<std::int32_t>(*numerator)) /
           static_cast<double>(static_cast<std::int32_t>(*denominator));
  }

 private:
  const std::vector<std::uint8_t>& bytes_;
};

// Tag 0x000c: the two ends of the range that is in focus, m, in either order.
void take_focus_range(const NoteContext& context, const char* key, MakerNote& note) {
  const auto bytes = context.tags.bytes(key);
  if (note.focus_distance || bytes.size() < kSignature.size()) return;
  if (!std::equal(kSignature.begin(), kSignature.end(), bytes.begin())) return;
  const BigEndianNote entries(bytes);
  constexpr std::uint32_t kFocusRange = 0x000c, kSignedRational = 10;
  const auto data = entries.data_of(kFocusRange, kSignedRational, 2);
  if (!data) return;
  const auto a = entries.signed_rational(*data), b = entries.signed_rational(*data + 8);
  if (a && b && *a > 0 && *b > 0) note.focus_distance = distance_between(*a, *b);
}

constexpr NoteRow kRows[] = {{"Exif.Photo.MakerNote", take_focus_range}};
constexpr Maker kMakers[] = {{"APPLE", kRows}};

}  // namespace

std::span<const Maker> apple_notes() {
  return kMakers;
}

}  // namespace focusfall
