// A line on standard error that says how far a run is. Only on a terminal: elsewhere it stays silent.
#pragma once

#include <chrono>
#include <cstddef>
#include <string>
#include <string_view>

namespace focusfall {

// "  12 of 340 frames   8.3 frames/s   about 40 s left", at most `columns` wide. Rate and time are left out until a
// second has passed.
std::string progress_text(std::size_t done, std::size_t total, double elapsed_s, int columns);

class Progress {
 public:
  // `shown` false: every call does nothing.
  Progress(std::size_t total, bool shown);
  ~Progress();
  Progress(const Progress&) = delete;
  Progress& operator=(const Progress&) = delete;

  void advance();

  // Removes the line, so that data or a message can be written; it comes back with the next advance().
  void clear();

 private:
  using Clock = std::chrono::steady_clock;
  std::size_t total_;
  std::size_t done_ = 0;
  bool shown_;
  bool drawn_ = false;
  Clock::time_point start_ = Clock::now();
  Clock::time_point last_drawn_{};
};

// Writes one line of message to standard error, as given and a newline.
void say(std::string_view message);

}  // namespace focusfall
