// Standard output as the place for data: written at once, so that a reader sees each record when it is done.
#pragma once

#include <stdexcept>
#include <string_view>

namespace focusfall {

// Standard output cannot take more for another reason than that its reader has gone, such as a full disk.
struct OutputError : std::runtime_error {
  using std::runtime_error::runtime_error;
};

class DataStream {
 public:
  explicit DataStream(int descriptor) : descriptor_(descriptor) {}

  // False once the reader has closed its end: nothing more need be computed. Throws OutputError on any other failure.
  bool write(std::string_view text);

  bool closed() const { return closed_; }

 private:
  int descriptor_;
  bool closed_ = false;
};

// Columns of the terminal on `descriptor`: the COLUMNS variable, else what the terminal says, else 80.
int terminal_columns(int descriptor);

bool is_terminal(int descriptor);

// A terminal that knows bold type (TERM is set and not "dumb"), and a person who did not ask for plain text (NO_COLOR).
bool bold_is_wanted(int descriptor);

}  // namespace focusfall
