// Whether a file is a camera raw, from its first bytes and, for those built on TIFF, from its directories.
#include <cstdint>
#include <string_view>
#include <vector>

#include "src/decode/codec.h"
#include "src/decode/mosaic.h"

namespace focusfall {
namespace {

using namespace std::string_view_literals;

constexpr int kMostDirectories = 32;
constexpr std::uint32_t kMostEntries = 512;
// Tags of TIFF 6.0 and of the DNG specification 1.6.
constexpr std::uint32_t kPhotometric = 262, kSubDirectories = 330, kDngVersion = 50706;
constexpr std::uint32_t kColourFilterArray = 32803, kLinearRaw = 34892;
// Bytes per value of the types 1..13 of TIFF 6.0.
constexpr std::uint32_t kTypeBytes[] = {0, 1, 1, 2, 4, 8, 1, 1, 2, 4, 8, 4, 8, 4};

class TiffDirectories {
 public:
  explicit TiffDirectories(std::span<const std::byte> file) : file_(file), little_(has_bytes(file, 0, "II")) {}

  bool hold_a_mosaic() {
    pending_.push_back(number(4, 4));
    for (int seen = 0; seen < kMostDirectories && !pending_.empty(); ++seen) {
      const std::uint32_t offset = pending_.back();
      pending_.pop_back();
      if (look_at(offset)) return true;
    }
    return false;
  }

 private:
  std::uint32_t number(std::uint64_t offset, std::uint32_t bytes) const {
    if (offset + bytes > file_.size()) return 0;
    std::uint32_t value = 0;
    for (std::uint32_t i = 0; i < bytes; ++i) {
      const std::uint64_t at = offset + (little_ ? bytes - 1 - i : i);
      value = value << 8 | std::to_integer<std::uint32_t>(file_[at]);
    }
    return value;
  }

  bool look_at(std::uint32_t directory) {
    if (directory == 0) return false;
    const std::uint32_t entries = number(directory, 2);
    if (entries > kMostEntries) return false;
    for (std::uint32_t i = 0; i < entries; ++i) {
      const std::uint64_t entry = std::uint64_t{directory} + 2 + 12 * std::uint64_t{i};
      const std::uint32_t tag = number(entry, 2), type = number(entry + 2, 2), count = number(entry + 4, 4);
      if (tag == kDngVersion) return true;
      if (type >= std::size(kTypeBytes)) continue;
      const std::uint32_t bytes = kTypeBytes[type];
      if (tag == kPhotometric) {
        const std::uint32_t value = number(entry + 8, bytes == 2 ? 2 : 4);
        if (value == kColourFilterArray || value == kLinearRaw) return true;
      }
      if (tag == kSubDirectories && bytes == 4) {
        const std::uint64_t values = count == 1 ? entry + 8 : number(entry + 8, 4);
        for (std::uint32_t k = 0; k < count && k < kMostDirectories; ++k) pending_.push_back(number(values + 4 * std::uint64_t{k}, 4));
      }
    }
    pending_.push_back(number(std::uint64_t{directory} + 2 + 12 * std::uint64_t{entries}, 4));
    return false;
  }

  std::span<const std::byte> file_;
  bool little_;
  std::vector<std::uint32_t> pending_;
};

}  // namespace

bool is_camera_raw(std::span<const std::byte> file) {
  // Formats of their own: CIFF, RAF, ORF, RW2, MRW, X3F, CR3.
  if (has_bytes(file, 6, "HEAPCCDR") || has_bytes(file, 0, "FUJIFILMCCD-RAW") || has_bytes(file, 0, "IIRO") ||
      has_bytes(file, 0, "IIRS") || has_bytes(file, 0, "MMOR") || has_bytes(file, 0, "IIU\0"sv) ||
      has_bytes(file, 0, "\0MRM"sv) || has_bytes(file, 0, "FOVb") || has_bytes(file, 4, "ftypcrx ")) {
    return true;
  }
  const bool tiff = has_bytes(file, 0, "II*\0"sv) || has_bytes(file, 0, "MM\0*"sv);
  if (!tiff) return false;
  return has_bytes(file, 8, "CR\x02"sv) || TiffDirectories(file).hold_a_mosaic();
}

}  // namespace focusfall
