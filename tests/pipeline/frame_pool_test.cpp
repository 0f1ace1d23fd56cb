#include "src/pipeline/frame_pool.h"

#include <fmt/format.h>
#include <gmock/gmock.h>

#include <algorithm>
#include <atomic>
#include <chrono>
#include <stdexcept>
#include <thread>

#include "tests/pipeline/temporary_folder.h"

namespace focusfall {
namespace {

// Names that are not there are done at once: what is tested is the order and the end.
std::vector<std::string> missing_paths(std::size_t count) {
  std::vector<std::string> paths;
  for (std::size_t i = 0; i < count; ++i) paths.push_back(fmt::format("/nonexistent/{}", i));
  return paths;
}

std::string sample(const std::string& name) { return std::string(FOCUSFALL_SAMPLES "/") + name; }

TEST(FramePool, DeliversEveryPathInTheOrderOfTheInput) {
  std::vector<std::string> paths = missing_paths(500);
  // Slow frames between quick ones.
  paths[0] = sample("regatta-04-on.jpg");
  paths[250] = sample("stage-01-on.jpg");
  for (const int workers : {1, 2, 7}) {
    std::vector<std::string> delivered;
    const PoolOutcome outcome = run_frames(paths, {}, {}, {.workers = workers}, [&](FrameRecord&& record) {
      delivered.push_back(record.path);
      return true;
    });
    EXPECT_EQ(delivered, paths) << workers;
    EXPECT_EQ(outcome.delivered, paths.size());
    EXPECT_FALSE(outcome.stopped);
  }
}

TEST(FramePool, OfNothingDeliversNothing) {
  const PoolOutcome outcome = run_frames(std::vector<std::string>{}, {}, {}, {}, [](FrameRecord&&) { return true; });
  EXPECT_EQ(outcome.delivered, 0u);
  EXPECT_FALSE(outcome.stopped);
}

TEST(FramePool, StopsWhenTheReceiverHasEnough) {
  std::size_t delivered = 0;
  const PoolOutcome outcome =
      run_frames(missing_paths(1000), {}, {}, {.workers = 3}, [&](FrameRecord&&) { return ++delivered < 10; });
  EXPECT_EQ(delivered, 10u);
  EXPECT_TRUE(outcome.stopped);
}

TEST(FramePool, StopsWhenCancelledAndDeliversWhatWasBegun) {
  std::atomic<bool> cancel{false};
  std::vector<std::string> delivered;
  const auto paths = missing_paths(100'000);
  const PoolOutcome outcome =
      run_frames(paths, {}, {}, {.workers = 2, .cancel = &cancel}, [&](FrameRecord&& record) {
        delivered.push_back(record.path);
        if (delivered.size() == 5) cancel = true;
        return true;
      });
  EXPECT_TRUE(outcome.stopped);
  EXPECT_EQ(outcome.delivered, delivered.size());
  EXPECT_GE(delivered.size(), 5u);
  EXPECT_LT(delivered.size(), paths.size());
  // Without a gap, from the first on.
  EXPECT_TRUE(std::equal(delivered.begin(), delivered.end(), paths.begin()));
}

TEST(FramePool, PassesOnWhatTheReceiverThrows) {
  const auto full_disk = [](FrameRecord&&) -> bool { throw std::runtime_error("no space left"); };
  EXPECT_THROW(run_frames(missing_paths(1000), {}, {}, {.workers = 3}, full_disk), std::runtime_error);
}

TEST(FramePool, HoldsFewFilesAtATime) {
  // The reader asks for a path only when a buffer is free: while the first record is held back, at most
  // kMostAhead = 64 paths more are asked for.
  std::atomic<std::size_t> asked = 0;
  std::size_t asked_at_first = 0;
  const NextPath next = [&]() -> std::optional<std::string> {
    if (asked == 1000) return std::nullopt;
    return fmt::format("/nonexistent/{}", asked++);
  };
  static_cast<void>(run_frames(next, {}, {}, {.workers = 2}, [&](FrameRecord&& record) {
    if (record.path == "/nonexistent/0") {
      std::this_thread::sleep_for(std::chrono::milliseconds(200));
      asked_at_first = asked;
    }
    return true;
  }));
  EXPECT_EQ(asked.load(), 1000u);
  EXPECT_LE(asked_at_first, 66u);
}

TEST(FramePool, GivesAFrameWithoutAPictureAnIssue) {
  const TemporaryFolder folder;
  const std::vector<std::string> paths{folder.write("words.jpg", "words"), folder.write("empty.jpg", "")};
  std::vector<std::string> codes;
  static_cast<void>(run_frames(paths, {}, {}, {}, [&](FrameRecord&& record) {
    EXPECT_FALSE(record.done);
    codes.push_back(record.issues.at(0).code);
    return true;
  }));
  EXPECT_THAT(codes, testing::ElementsAre("not-a-picture", "file-empty"));
}

}  // namespace
}  // namespace focusfall
