#include "src/pipeline/frame_pool.h"

#include <sched.h>

#include <condition_variable>
#include <deque>
#include <exception>
#include <map>
#include <memory>
#include <mutex>
#include <opencv2/core/utility.hpp>
#include <thread>
#include <utility>
#include <vector>

#include "src/pipeline/frame_worker.h"
#include "src/pipeline/read_file.h"

namespace focusfall {
namespace {

// One file on its way: its bytes, or why there are none.
struct Loaded {
  std::size_t number = 0;
  std::string path;
  std::unique_ptr<FileBuffer> buffer;
  std::optional<ReadError> error;
};

int usable_cores() {
  cpu_set_t set;
  CPU_ZERO(&set);
  if (sched_getaffinity(0, sizeof set, &set) == 0 && CPU_COUNT(&set) > 0) return CPU_COUNT(&set);
  return static_cast<int>(std::max(1U, std::thread::hardware_concurrency()));
}

class Run {
 public:
  Run(const NextPath& next, const UserValues& user, const Settings& settings, const PoolOptions& options)
      : next_(next), user_(user), settings_(settings), options_(options),
        workers_(options.workers > 0 ? options.workers : usable_cores()),
        most_held_(static_cast<std::size_t>(workers_) + 2) {
    for (std::size_t i = 0; i < most_held_; ++i) free_.push_back(std::make_unique<FileBuffer>());
  }

  PoolOutcome run(const DeliverRecord& deliver) {
    cv::setNumThreads(1);   // one frame a core is all the parallelism there is
    std::vector<std::thread> threads;
    threads.emplace_back([this] { read_ahead(); });
    for (int i = 0; i < workers_; ++i) threads.emplace_back([this] { work(); });
    PoolOutcome outcome;
    std::exception_ptr failure;   // of the receiver: told once every thread has ended
    try {
      outcome = hand_out(deliver);
    } catch (...) {
      failure = std::current_exception();
      abandon();
    }
    for (std::thread& thread : threads) thread.join();
    if (failure) std::rethrow_exception(failure);
    return outcome;
  }

 private:
  void abandon() {
    std::lock_guard lock(mutex_);
    stop_ = true;
    queue_.clear();
    changed_.notify_all();
  }

  bool cancelled() const { return stop_ || (options_.cancel && options_.cancel->load()); }

  void read_ahead() {
    while (true) {
      std::unique_ptr<FileBuffer> buffer;
      {
        std::unique_lock lock(mutex_);
        // A finished record waits for its turn too: a slow first frame must not let thousands of records pile up.
        changed_.wait_for(lock, kLook, [&] { return cancelled() || (!free_.empty() && begun_ - delivered_ < kMostAhead); });
        if (cancelled()) break;
        if (free_.empty() || begun_ - delivered_ >= kMostAhead) continue;
        buffer = std::move(free_.back());
        free_.pop_back();
      }
      auto path = next_();
      if (!path || cancelled()) break;
      Loaded loaded{begun_, std::move(*path), std::move(buffer), std::nullopt};
      if (auto read = read_file(loaded.path, *loaded.buffer); !read) loaded.error = read.error();
      std::lock_guard lock(mutex_);
      ++begun_;
      queue_.push_back(std::move(loaded));
      changed_.notify_all();
    }
    std::lock_guard lock(mutex_);
    reading_done_ = true;
    changed_.notify_all();
  }

  void work() {
    FrameWorker worker(user_, settings_);
    while (true) {
      Loaded loaded;
      {
        std::unique_lock lock(mutex_);
        changed_.wait(lock, [&] { return !queue_.empty() || reading_done_; });
        if (queue_.empty()) return;
        loaded = std::move(queue_.front());
        queue_.pop_front();
      }
      FrameRecord record = loaded.error ? unread_frame(loaded.path, *loaded.error)
                                        : worker.process(loaded.path, loaded.buffer->bytes());
      std::lock_guard lock(mutex_);
      free_.push_back(std::move(loaded.buffer));
      finished_.emplace(loaded.number, std::move(record));
      changed_.notify_all();
    }
  }

  PoolOutcome hand_out(const DeliverRecord& deliver) {
    PoolOutcome outcome;
    std::unique_lock lock(mutex_);
    while (true) {
      changed_.wait(lock, [&] { return finished_.contains(delivered_) || (reading_done_ && delivered_ == begun_); });
      if (!finished_.contains(delivered_)) break;
      FrameRecord record = std::move(finished_.extract(delivered_).mapped());
      lock.unlock();
      const bool go_on = deliver(std::move(record));
      lock.lock();
      ++delivered_;
      ++outcome.delivered;
      if (!go_on) {
        stop_ = true;
        queue_.clear();
        changed_.notify_all();
        outcome.stopped = true;
        // Whoever still works finishes its frame; nothing more is delivered.
        changed_.wait(lock, [&] { return reading_done_; });
        return outcome;
      }
      changed_.notify_all();
    }
    outcome.stopped = cancelled();
    return outcome;
  }

  static constexpr std::chrono::milliseconds kLook{100};   // how often a waiting reader looks whether it was cancelled
  static constexpr std::size_t kMostAhead = 64;            // records that may wait for an earlier one

  const NextPath& next_;
  const UserValues& user_;
  const Settings& settings_;
  const PoolOptions& options_;
  const int workers_;
  const std::size_t most_held_;

  std::mutex mutex_;
  std::condition_variable changed_;
  std::vector<std::unique_ptr<FileBuffer>> free_;
  std::deque<Loaded> queue_;
  std::map<std::size_t, FrameRecord> finished_;
  std::size_t begun_ = 0, delivered_ = 0;
  bool reading_done_ = false;
  std::atomic<bool> stop_{false};
};

}  // namespace

PoolOutcome run_frames(const NextPath& next, const UserValues& user, const Settings& settings,
                       const PoolOptions& options, const DeliverRecord& deliver) {
  return Run(next, user, settings, options).run(deliver);
}

PoolOutcome run_frames(std::span<const std::string> paths, const UserValues& user, const Settings& settings,
                       const PoolOptions& options, const DeliverRecord& deliver) {
  std::size_t next = 0;
  return run_frames([&]() -> std::optional<std::string> {
    if (next == paths.size()) return std::nullopt;
    return paths[next++];
  }, user, settings, options, deliver);
}

}  // namespace focusfall
