// Files that the program writes: never over an original, never over what someone else wrote.
#pragma once

#include <cstddef>
#include <functional>
#include <string>
#include <string_view>
#include <tl/expected.hpp>

namespace focusfall {

// Whether a file that starts with these bytes was written by us for the same purpose.
using IsOurs = std::function<bool(std::string_view first_bytes)>;

struct OwnedFile {
  std::string path;
  std::size_t first_bytes = 256;   // so many are shown to `is_ours`
  IsOurs is_ours;
};

// Writes a new file beside the target and moves it there, so that nobody sees half a file. Where something stands under
// that name already, it is replaced only if it is a regular file of ours. The error is one sentence without the path.
tl::expected<void, std::string> write_owned_file(const OwnedFile& file, std::string_view content);

}  // namespace focusfall
