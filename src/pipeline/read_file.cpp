#include "src/pipeline/read_file.h"

#include <fcntl.h>
#include <fmt/core.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
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

// O_NOATIME is allowed to the owner alone; who may only read updates the access time as any reader does.
int open_for_reading(const std::string& path) {
  constexpr int flags = O_RDONLY | O_NONBLOCK | O_CLOEXEC | O_NOCTTY;
  const int number = ::open(path.c_str(), flags | O_NOATIME);
  return number < 0 && errno == EPERM ? ::open(path.c_str(), flags) : number;
}

std::string system_reason(int number) { return std::strerror(number); }

const char* kind_of_file(mode_t mode) {
  if (S_ISDIR(mode)) return "a folder";
  if (S_ISFIFO(mode)) return "a FIFO";
  if (S_ISSOCK(mode)) return "a socket";
  return "a device";
}

ReadError open_error(const std::string& path) {
  const int reason = errno;
  if (path.find('\0') != std::string::npos) return {"file-missing", "the name holds a NUL byte; expected a file name"};
  if (reason == ENOENT || reason == ENOTDIR) return {"file-missing", "there is no such file; expected a picture"};
  if (reason == ENXIO) return {"not-a-file", "this is a socket or a device; expected a regular file"};
  return {"file-unreadable", fmt::format("cannot be opened ({}); expected a readable file", system_reason(reason))};
}

}  // namespace

tl::expected<void, ReadError> read_file(const std::string& path, FileBuffer& buffer) {
  buffer.size_ = 0;
  const Descriptor file(path.find('\0') == std::string::npos ? open_for_reading(path) : -1);
  if (file.number() < 0) return tl::unexpected(open_error(path));

  struct stat status {};
  if (::fstat(file.number(), &status) != 0) {
    return tl::unexpected(ReadError{"file-unreadable", fmt::format("cannot be examined ({})", system_reason(errno))});
  }
  if (!S_ISREG(status.st_mode)) {
    return tl::unexpected(ReadError{"not-a-file", fmt::format("this is {}; expected a regular file", kind_of_file(status.st_mode))});
  }
  const auto size = static_cast<std::size_t>(std::max<off_t>(status.st_size, 0));
  if (size > kMaxFileBytes) {
    return tl::unexpected(ReadError{"file-too-large", fmt::format("the file holds {} bytes; expected at most {}", size, kMaxFileBytes)});
  }
  if (buffer.data_.size() < size) {
    buffer.data_ = {};   // first give back, then take: never both at once
    buffer.data_.resize(size);
  }

  while (buffer.size_ < size) {
    const ssize_t got = ::read(file.number(), buffer.data_.data() + buffer.size_, size - buffer.size_);
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) {
      const int reason = errno;
      buffer.size_ = 0;
      return tl::unexpected(ReadError{"file-unreadable", fmt::format("reading failed ({})", system_reason(reason))});
    }
    if (got == 0) break;
    buffer.size_ += static_cast<std::size_t>(got);
  }
  return {};
}

}  // namespace focusfall
