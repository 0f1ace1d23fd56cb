#include "src/output/progress.h"

#include <fmt/format.h>
#include <unistd.h>

#include <algorithm>
#include <cmath>

#include "src/output/data_stream.h"

namespace focusfall {
namespace {

// A message that cannot be delivered is lost; there is nowhere to say so.
void write_error(std::string_view text) {
  while (!text.empty()) {
    const ssize_t written = ::write(STDERR_FILENO, text.data(), text.size());
    if (written <= 0) return;
    text.remove_prefix(static_cast<std::size_t>(written));
  }
}

std::string duration_text(double seconds) {
  const long whole = std::lround(seconds);
  if (whole < 60) return fmt::format("{} s", std::max(whole, 1L));
  if (whole < 3600) return fmt::format("{} min {:02} s", whole / 60, whole % 60);
  return fmt::format("{} h {:02} min", whole / 3600, whole / 60 % 60);
}

}  // namespace

std::string progress_text(std::size_t done, std::size_t total, double elapsed_s, int columns) {
  std::string text = fmt::format("{} of {} frames", done, total);
  if (done > 0 && elapsed_s >= 1) {
    const double per_s = static_cast<double>(done) / elapsed_s;
    text += fmt::format("   {:.{}f} frames/s", per_s, per_s < 10 ? 1 : 0);
    if (done < total) text += fmt::format("   about {} left", duration_text(static_cast<double>(total - done) / per_s));
  }
  if (text.size() > static_cast<std::size_t>(std::max(columns, 0))) text.resize(static_cast<std::size_t>(columns));
  return text;
}

Progress::Progress(std::size_t total, bool shown) : total_(total), shown_(shown && total > 1) {}

Progress::~Progress() { clear(); }

void Progress::advance() {
  ++done_;
  if (!shown_) return;
  constexpr auto kRedraw = std::chrono::milliseconds(100);   // judgement: smooth enough, costs nothing
  const auto now = Clock::now();
  if (drawn_ && now - last_drawn_ < kRedraw && done_ < total_) return;
  last_drawn_ = now;
  const double elapsed_s = std::chrono::duration<double>(now - start_).count();
  write_error("\r\x1b[K" + progress_text(done_, total_, elapsed_s, terminal_columns(STDERR_FILENO) - 1));
  drawn_ = true;
}

void Progress::clear() {
  if (!drawn_) return;
  write_error("\r\x1b[K");
  drawn_ = false;
}

void say(std::string_view message) { write_error(std::string(message) + "\n"); }

}  // namespace focusfall
