// What must hold for every frame, whatever the estimators read: asked of the sample shoot.
#include "src/pipeline/frame_worker.h"

#include <gmock/gmock.h>

#include <algorithm>
#include <filesystem>

namespace focusfall {
namespace {

std::vector<FrameRecord> sample_records() {
  std::vector<std::string> paths;
  for (const auto& entry : std::filesystem::directory_iterator(FOCUSFALL_SAMPLES)) {
    if (entry.path().extension() == ".jpg") paths.push_back(entry.path().native());
  }
  std::ranges::sort(paths);
  FrameWorker worker({}, {});
  std::vector<FrameRecord> records;
  for (const std::string& path : paths) records.push_back(worker.process(path));
  return records;
}

TEST(EveryFrame, HasASharpestPartThatIsNoSofterThanItsAim) {
  int compared = 0;
  for (const FrameRecord& record : sample_records()) {
    ASSERT_TRUE(record.measurement) << record.path;
    const Measurement& m = *record.measurement;
    if (!m.aim_blur.estimate) continue;
    ASSERT_TRUE(m.best && m.best->reading.estimate) << record.path;
    EXPECT_LE(m.best->reading.estimate->squared_disc_high_px2, m.aim_blur.estimate->squared_disc_high_px2) << record.path;
    ++compared;
  }
  EXPECT_GT(compared, 30);
}

TEST(EveryFrame, HasBoundsAroundItsValues) {
  for (const FrameRecord& record : sample_records()) {
    const auto holds = [&record](const std::optional<Interval>& interval, const char* what) {
      if (!interval) return;
      EXPECT_LE(interval->low, interval->value) << record.path << " " << what;
      EXPECT_GE(interval->high, interval->value) << record.path << " " << what;
    };
    ASSERT_TRUE(record.verdict) << record.path;
    holds(record.verdict->defocus_um, "defocus_um");
    holds(record.verdict->defocus_limits, "defocus_limits");
    holds(record.verdict->focus_offset_m, "focus_offset_m");
    if (record.measurement->plane) holds(record.measurement->plane->at_contact_px, "at_contact_px");
    EXPECT_FALSE(record.verdict->summary.empty()) << record.path;
  }
}

TEST(FrameWorker, GivesTheSameRecordWhateverItMeasuredBefore) {
  const std::string first = FOCUSFALL_SAMPLES "/stage-01-on.jpg", other = FOCUSFALL_SAMPLES "/regatta-15-upright.jpg";
  FrameWorker fresh({}, {}), used({}, {});
  static_cast<void>(used.process(other));
  const FrameRecord a = fresh.process(first), b = used.process(first);
  ASSERT_TRUE(a.measurement->aim_blur.estimate && b.measurement->aim_blur.estimate);
  EXPECT_EQ(a.measurement->aim_blur.estimate->squared_disc_px2, b.measurement->aim_blur.estimate->squared_disc_px2);
  EXPECT_EQ(a.verdict->summary, b.verdict->summary);
}

}  // namespace
}  // namespace focusfall
