// A file in, a record out: the one seam behind which a frame is read, decoded, measured and compared.
#pragma once

#include <memory>
#include <span>
#include <string>

#include "src/pipeline/frame_record.h"
#include "src/pipeline/options.h"
#include "src/pipeline/read_file.h"
#include "src/pipeline/settings.h"

namespace focusfall {

// Owns every buffer that a frame needs and keeps them for the next. Not for two threads at once: one worker a thread,
// with OpenCV told not to start threads of its own (FramePool does both).
class FrameWorker {
 public:
  FrameWorker(UserValues user, Settings settings);
  ~FrameWorker();
  FrameWorker(FrameWorker&&) noexcept;
  FrameWorker& operator=(FrameWorker&&) noexcept;

  // Never throws for the sake of a frame: what a stage cannot do becomes an Issue, and `done` stays false where the
  // picture could not be measured.
  [[nodiscard]] FrameRecord process(const std::string& path);

  // The same for bytes that someone has read ahead.
  [[nodiscard]] FrameRecord process(const std::string& path, std::span<const std::byte> file);

 private:
  struct State;
  std::unique_ptr<State> state_;
};

// The record of a file that could not be read.
FrameRecord unread_frame(const std::string& path, const ReadError& error);

}  // namespace focusfall
