#include "src/pipeline/clock.h"

#include <gmock/gmock.h>

namespace focusfall {
namespace {

TEST(MovedTime, KeepsFractionAndZone) {
  EXPECT_EQ(moved_time("2024-05-01T18:03:07.25+02:00", 60), "2024-05-01T18:04:07.25+02:00");
  EXPECT_EQ(moved_time("2024-05-01T18:03:07", -7), "2024-05-01T18:03:00");
  EXPECT_EQ(moved_time("2024-05-01T18:03:07Z", 0.0), "2024-05-01T18:03:07Z");
}

TEST(MovedTime, CarriesOverDaysMonthsAndLeapYears) {
  EXPECT_EQ(moved_time("2024-02-28T23:59:59", 1), "2024-02-29T00:00:00");
  EXPECT_EQ(moved_time("2023-02-28T23:59:59", 1), "2023-03-01T00:00:00");
  EXPECT_EQ(moved_time("2024-12-31T23:59:59.9", 0.2), "2025-01-01T00:00:00.1");
  EXPECT_EQ(moved_time("2025-01-01T00:00:00.0", -0.1), "2024-12-31T23:59:59.9");
  EXPECT_EQ(moved_time("1970-01-01T00:00:00", -1), "1969-12-31T23:59:59");
}

TEST(MovedTime, ForthAndBackIsTheSame) {
  for (const double seconds : {0.01, 1.0, 3661.5, 86400.0 * 400, -86400.0 * 20000}) {
    const auto there = moved_time("2026-06-14T11:26:40.00", seconds);
    ASSERT_TRUE(there);
    EXPECT_EQ(moved_time(*there, -seconds), "2026-06-14T11:26:40.00") << seconds;
  }
}

TEST(MovedTime, DropsWhatTheTimeHasNoDigitsFor) {
  EXPECT_EQ(moved_time("2024-05-01T18:03:07", 0.4), "2024-05-01T18:03:07");
}

TEST(MovedTime, IsAbsentForWhatIsNoTime) {
  for (const char* text : {"", "yesterday", "2024-13-01T00:00:00", "2024-02-30T00:00:00", "2024-05-01T24:00:00",
                           "2024-05-01 18:03:07"}) {
    EXPECT_EQ(moved_time(text, 1), std::nullopt) << text;
  }
}

}  // namespace
}  // namespace focusfall
