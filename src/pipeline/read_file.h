// Reads an original once, whole, without changing it or its times.
#pragma once

#include <cstddef>
#include <span>
#include <string>
#include <tl/expected.hpp>
#include <vector>

namespace focusfall {

// Largest file that is read, bytes: above any single photograph of today (judgement).
inline constexpr std::size_t kMaxFileBytes = std::size_t{2} << 30;

struct ReadError {
  std::string code;      // file-missing, file-unreadable, not-a-file, file-too-large
  std::string message;   // without the path
};

// The bytes of one file in memory that is kept for the next. Grows to the largest file it met, never by doubling.
class FileBuffer {
 public:
  std::span<const std::byte> bytes() const { return {data_.data(), size_}; }

 private:
  friend tl::expected<void, ReadError> read_file(const std::string& path, FileBuffer& buffer);
  std::vector<std::byte> data_;
  std::size_t size_ = 0;
};

// Opens without waiting and without updating the access time where the system allows it; regular files only, decided
// on the open descriptor, so that a FIFO, a device or a folder put in the way is never read. An empty file is empty,
// not an error. A file that shrinks while it is read is delivered as short as it was found.
tl::expected<void, ReadError> read_file(const std::string& path, FileBuffer& buffer);

}  // namespace focusfall
