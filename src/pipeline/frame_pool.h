// Many frames: one reader ahead of the workers, one frame per core, results in the order of the input.
#pragma once

#include <atomic>
#include <cstddef>
#include <functional>
#include <optional>
#include <span>
#include <string>

#include "src/pipeline/frame_record.h"
#include "src/pipeline/options.h"
#include "src/pipeline/settings.h"

namespace focusfall {

struct PoolOptions {
  int workers = 0;                              // threads that measure; 0: as many as this process may use cores
  const std::atomic<bool>* cancel = nullptr;    // set from a signal handler: frames begun are finished and delivered,
                                                // no other is begun
};

// Gives the next path, or std::nullopt at the end. Called from the reader's thread alone; it may wait.
using NextPath = std::function<std::optional<std::string>()>;

// Takes one record; false stops the run as `cancel` does. Called from the thread that called run_frames. What it throws
// ends the run and comes out of run_frames.
using DeliverRecord = std::function<bool(FrameRecord&&)>;

struct PoolOutcome {
  std::size_t delivered = 0;
  bool stopped = false;      // by `cancel` or by the receiver, before the last path
};

// Memory does not grow with the number of frames: at most workers + 2 files are held at a time.
PoolOutcome run_frames(const NextPath& next, const UserValues& user, const Settings& settings,
                       const PoolOptions& options, const DeliverRecord& deliver);
PoolOutcome run_frames(std::span<const std::string> paths, const UserValues& user, const Settings& settings,
                       const PoolOptions& options, const DeliverRecord& deliver);

}  // namespace focusfall
