#include "src/output/data_stream.h"

#include <fmt/format.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include <cerrno>
#include <charconv>
#include <cstdlib>
#include <cstring>
#include <string>

namespace focusfall {

bool DataStream::write(std::string_view text) {
  while (!text.empty() && !closed_) {
    const ssize_t written = ::write(descriptor_, text.data(), text.size());
    if (written >= 0) {
      text.remove_prefix(static_cast<std::size_t>(written));
    } else if (errno == EPIPE) {
      closed_ = true;   // SIGPIPE is ignored by main()
    } else if (errno != EINTR) {
      throw OutputError(fmt::format("standard output cannot be written: {}", std::strerror(errno)));
    }
  }
  return !closed_;
}

int terminal_columns(int descriptor) {
  constexpr int kDefault = 80, kLeast = 40, kMost = 1000;
  const auto sensible = [](int columns) { return columns >= kLeast && columns <= kMost; };
  if (const char* variable = std::getenv("COLUMNS"); variable != nullptr) {
    int columns = 0;
    const auto [end, error] = std::from_chars(variable, variable + std::strlen(variable), columns);
    if (error == std::errc() && *end == '\0' && sensible(columns)) return columns;
  }
  winsize size{};
  if (ioctl(descriptor, TIOCGWINSZ, &size) == 0 && sensible(size.ws_col)) return size.ws_col;
  return kDefault;
}

bool is_terminal(int descriptor) { return isatty(descriptor) == 1; }

bool bold_is_wanted(int descriptor) {
  const char* kind = std::getenv("TERM");
  return is_terminal(descriptor) && kind != nullptr && std::strcmp(kind, "dumb") != 0 &&
         std::getenv("NO_COLOR") == nullptr;
}

}  // namespace focusfall
