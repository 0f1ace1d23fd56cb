#include "src/pipeline/inputs.h"

#include <fmt/format.h>
#include <sys/stat.h>

#include <algorithm>
#include <array>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <set>
#include <string_view>
#include <system_error>
#include <utility>

namespace focusfall {
namespace {

namespace fs = std::filesystem;

constexpr std::size_t kSignatureBytes = 64;

struct Signature {
  std::size_t offset;
  std::string_view bytes;
};

using std::string_view_literals::operator""sv;

// Signatures as the formats define them; raw formats after the tables of LibRaw 0.20 (from memory).
constexpr Signature kSignatures[] = {
    {0, "\xFF\xD8\xFF"sv},            // JPEG
    {0, "\x89PNG\r\n\x1A\n"sv},       // PNG
    {0, "II*\0"sv},                   // TIFF and most raw formats
    {0, "MM\0*"sv},
    {0, "II+\0"sv},                   // BigTIFF
    {0, "MM\0+"sv},
    {0, "IIU\0"sv},                   // Panasonic raw
    {0, "IIRO"sv},                    // Olympus raw
    {0, "IIRS"sv},
    {0, "MMOR"sv},
    {6, "HEAPCCDR"sv},                // Canon CRW
    {0, "FUJIFILMCCD-RAW"sv},
    {0, "FOVb"sv},                    // Sigma X3F
    {0, "\0MRM"sv},                   // Minolta
    {4, "ftypcrx "sv},                // Canon CR3
    {4, "ftypheic"sv},                // HEIF
    {4, "ftypheix"sv},
    {4, "ftyphevc"sv},
    {4, "ftypheim"sv},
    {4, "ftypheis"sv},
    {4, "ftypmif1"sv},
    {4, "ftypmsf1"sv},
    {4, "ftypavif"sv},
};

// Collects paths and remembers which files it has met.
class Finder {
 public:
  void add_argument(const std::string& path) {
    std::error_code error;
    if (fs::is_directory(path, error)) {
      add_folder(path);
    } else {
      add_file(path);
    }
  }

  Inputs take() { return std::move(inputs_); }

 private:
  void add_file(const std::string& path) {
    struct stat status{};
    if (stat(path.c_str(), &status) == 0 && !met_.emplace(status.st_dev, status.st_ino).second) {
      ++inputs_.repeats;
      return;
    }
    inputs_.paths.push_back(path);
  }

  // Everything below `top`, sorted by the bytes of the path.
  void add_folder(const std::string& top) {
    std::vector<std::string> found;
    std::vector<fs::path> folders{top};
    while (!folders.empty()) {
      const fs::path folder = std::move(folders.back());
      folders.pop_back();
      list_folder(folder, folders, found);
    }
    std::ranges::sort(found);
    for (const std::string& path : found) add_file(path);
  }

  void list_folder(const fs::path& folder, std::vector<fs::path>& folders, std::vector<std::string>& found) {
    std::error_code error;
    fs::directory_iterator entry(folder, error);
    for (; !error && entry != fs::directory_iterator(); entry.increment(error)) {
      std::error_code ignored;
      const fs::path& path = entry->path();
      if (path.filename().native().starts_with('.')) {
        ++inputs_.hidden;
      } else if (entry->is_directory(ignored)) {
        if (entry->is_symlink(ignored)) {
          ++inputs_.folder_links;
        } else {
          folders.push_back(path);
        }
      } else if (entry->is_regular_file(ignored) && is_photograph(path)) {
        found.push_back(path.native());
      } else {
        ++inputs_.other_files;
      }
    }
    if (error) {
      inputs_.problems.push_back(
          fmt::format("{}: the folder cannot be read: {}", folder.native(), error.message()));
    }
  }

  // A file that cannot be opened stays in: its record says why.
  static bool is_photograph(const fs::path& path) {
    std::ifstream file(path, std::ios::binary);
    if (!file) return true;
    std::array<char, kSignatureBytes> bytes{};
    file.read(bytes.data(), bytes.size());
    return starts_like_photograph(std::string(bytes.data(), static_cast<std::size_t>(file.gcount())));
  }

  Inputs inputs_;
  std::set<std::pair<dev_t, ino_t>> met_;
};

tl::expected<std::string, InputError> list_text(const std::string& name, std::istream& standard_input) {
  if (name == "-") return std::string(std::istreambuf_iterator<char>(standard_input), {});
  std::error_code error;
  if (!fs::exists(name, error)) {
    return tl::make_unexpected(InputError{
        fmt::format("@{0}: there is no list of that name (a file called \"@{0}\" is written ./@{0})", name)});
  }
  std::ifstream file(name, std::ios::binary);
  if (fs::is_directory(name, error) || !file) {
    return tl::make_unexpected(InputError{fmt::format("@{}: the list cannot be read", name)});
  }
  return std::string(std::istreambuf_iterator<char>(file), {});
}

}  // namespace

bool starts_like_photograph(const std::string& first_bytes) {
  return std::ranges::any_of(kSignatures, [&first_bytes](const Signature& signature) {
    return std::string_view(first_bytes).substr(std::min(signature.offset, first_bytes.size()))
        .starts_with(signature.bytes);
  });
}

std::vector<std::string> paths_of_list(const std::string& text) {
  const char separator = text.find('\0') != std::string::npos ? '\0' : '\n';
  std::vector<std::string> paths;
  for (std::size_t start = 0; start < text.size();) {
    const std::size_t end = std::min(text.find(separator, start), text.size());
    if (end > start) paths.push_back(text.substr(start, end - start));
    start = end + 1;
  }
  return paths;
}

tl::expected<Inputs, InputError> find_inputs(const std::vector<std::string>& arguments, std::istream& standard_input) {
  Finder finder;
  for (const std::string& argument : arguments) {
    if (!argument.starts_with('@')) {
      finder.add_argument(argument);
      continue;
    }
    const auto text = list_text(argument.substr(1), standard_input);
    if (!text) return tl::make_unexpected(text.error());
    for (const std::string& path : paths_of_list(*text)) finder.add_argument(path);
  }
  return finder.take();
}

}  // namespace focusfall
