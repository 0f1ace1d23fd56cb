#include "src/output/owned_file.h"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdlib>
#include <cstring>
#include <optional>

namespace focusfall {
namespace {

class Descriptor {
 public:
  explicit Descriptor(int number) : number_(number) {}
  ~Descriptor() {
    if (number_ >= 0) ::close(number_);
  }
  Descriptor(const Descriptor&) = delete;
  Descriptor& operator=(const Descriptor&) = delete;
  int number() const { return number_; }

 private:
  int number_;
};

std::string reason() { return std::strerror(errno); }

// Why the name must not be taken; nothing where it is free, or ours.
std::optional<std::string> objection(const OwnedFile& file) {
  const Descriptor existing(::open(file.path.c_str(), O_RDONLY | O_NOFOLLOW | O_NONBLOCK | O_CLOEXEC));
  if (existing.number() < 0) {
    if (errno == ENOENT) return std::nullopt;
    return fmt::format("stands there already and cannot be looked into ({}); it is kept", reason());
  }
  struct stat status{};
  std::string first(file.first_bytes, '\0');
  const bool regular = ::fstat(existing.number(), &status) == 0 && S_ISREG(status.st_mode);
  const ssize_t got = regular ? ::pread(existing.number(), first.data(), first.size(), 0) : 0;
  first.resize(static_cast<std::size_t>(got > 0 ? got : 0));
  if (regular && file.is_ours(first)) return std::nullopt;
  return "stands there already and was not written by focusfall; it is kept";
}

bool write_all(int descriptor, std::string_view content) {
  while (!content.empty()) {
    const ssize_t written = ::write(descriptor, content.data(), content.size());
    if (written < 0 && errno == EINTR) continue;
    if (written < 0) return false;
    content.remove_prefix(static_cast<std::size_t>(written));
  }
  return true;
}

}  // namespace

tl::expected<void, std::string> write_owned_file(const OwnedFile& file, std::string_view content) {
  if (auto why_not = objection(file)) return tl::make_unexpected(std::move(*why_not));
  std::string temporary = file.path + ".XXXXXX";
  const Descriptor target(::mkostemp(temporary.data(), O_CLOEXEC));
  if (target.number() < 0) return tl::make_unexpected(fmt::format("cannot be written ({})", reason()));
  const mode_t mask = ::umask(0);
  ::umask(mask);
  const bool written = write_all(target.number(), content) && ::fchmod(target.number(), 0666 & ~mask) == 0;
  if (!written || ::rename(temporary.c_str(), file.path.c_str()) != 0) {
    const std::string why = reason();
    ::unlink(temporary.c_str());
    return tl::make_unexpected(fmt::format("cannot be written ({})", why));
  }
  return {};
}

}  // namespace focusfall
