// From what stands on the command line to the list of frames: files, folders, and lists of paths.
#pragma once

#include <cstddef>
#include <istream>
#include <string>
#include <tl/expected.hpp>
#include <vector>

namespace focusfall {

struct Inputs {
  std::vector<std::string> paths;        // in the order given; the content of a folder in byte order
  std::size_t other_files = 0;           // in folders: no photograph by content, or no regular file
  std::size_t hidden = 0;                // in folders: entries whose name starts with a point, not looked into
  std::size_t folder_links = 0;          // in folders: links to folders, not followed
  std::size_t repeats = 0;               // files reached twice (same device and inode)
  std::vector<std::string> problems;     // folders that could not be read, one sentence each: exit code 1
};

// A list that cannot be read: the run is wrong as a whole (exit code 2).
struct InputError {
  std::string message;
};

// `arguments` as typed. A folder is walked through; "@FILE" and "@-" name lists of paths; "./@x" is a file. What does
// not exist stays in the list, so that it gets a record that says so. Nothing is opened but folders, lists, and the
// first bytes of regular files in folders; a name such as "http://x" is a name.
tl::expected<Inputs, InputError> find_inputs(const std::vector<std::string>& arguments, std::istream& standard_input);

// The paths of a list: separated by NUL if a NUL occurs, else one a line. Empty entries are passed over; no quoting.
std::vector<std::string> paths_of_list(const std::string& text);

// Whether a file that starts with these bytes (64 are enough) is a photograph that a camera or an editor writes: JPEG,
// TIFF and raw formats built on it, PNG, HEIF, and the raw formats with a signature of their own.
bool starts_like_photograph(const std::string& first_bytes);

}  // namespace focusfall
