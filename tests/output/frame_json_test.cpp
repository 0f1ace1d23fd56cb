#include "src/output/frame_json.h"

#include <gmock/gmock.h>

#include <cmath>
#include <limits>

#include "tests/output/sample_record.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

std::string line_of(const FrameRecord& record) { return json_line(frame_json(record)); }

FrameRecord read_back(const std::string& line) {
  auto record = frame_record_from_json(Json::parse(line));
  EXPECT_TRUE(record) << (record ? "" : record.error());
  return record ? *record : FrameRecord{};
}

TEST(FrameJson, ReadBackAndWrittenAgainIsTheSameLine) {
  const std::string line = line_of(sample_record());
  EXPECT_EQ(line_of(read_back(line)), line);
}

TEST(FrameJson, CarriesEveryPartOfTheRecord) {
  const FrameRecord record = read_back(line_of(sample_record()));
  ASSERT_TRUE(record.capture && record.prediction && record.measurement && record.verdict);
  EXPECT_EQ(record.path, "shoot/boat 27.jpg");
  EXPECT_EQ(record.capture->lens->source, Source::maker_note);
  EXPECT_DOUBLE_EQ(record.capture->focus_distance->value.high_m, 31.1);
  EXPECT_TRUE(record.capture->focus_distance->value.stale);
  EXPECT_EQ(record.capture->exposure_mode->value, ExposureMode::manual);
  EXPECT_DOUBLE_EQ(*record.prediction->working_f_number, 2.838);
  EXPECT_DOUBLE_EQ(record.measurement->aim_blur.estimate->squared_disc_px2, 64);
  EXPECT_EQ(record.measurement->plane->contact, Contact::foot);
  EXPECT_EQ(record.measurement->clipping->measured_on, ClippedOn::mosaic);
  EXPECT_THAT(record.verdict->causes, testing::ElementsAre(Cause::defocus, Cause::subject_motion));
  EXPECT_DOUBLE_EQ(record.verdict->focus_offset_m->high, 0.1);
  ASSERT_EQ(record.issues.size(), 1u);
  EXPECT_EQ(record.issues[0].code, "metadata-value-absurd");
}

TEST(FrameJson, KeepsAPathThatIsNoUtf8) {
  FrameRecord record = sample_record();
  record.path = "\xff\xfe\n.jpg";
  const std::string line = line_of(record);
  EXPECT_THAT(line, testing::HasSubstr("\xEF\xBF\xBD"));   // U+FFFD in `path`
  EXPECT_EQ(read_back(line).path, record.path);            // whole in `path_bytes`
}

TEST(FrameJson, SpellsInfinityWithAFlag) {
  FrameRecord record = sample_record();
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  record.capture->focus_distance->value = {.value_m = kInfinity, .low_m = 90, .high_m = kInfinity};
  record.prediction->far_limit_m.reset();
  record.prediction->far_limit_infinite = true;
  const std::string line = line_of(record);
  const Json json = Json::parse(line);
  EXPECT_TRUE(json["capture"]["focus_distance_m"]["value"].is_null());
  EXPECT_EQ(json["capture"]["focus_distance_m"]["at_infinity"], true);
  const FrameRecord back = read_back(line);
  EXPECT_TRUE(std::isinf(back.capture->focus_distance->value.value_m));
  EXPECT_TRUE(std::isinf(back.capture->focus_distance->value.high_m));
  EXPECT_TRUE(back.prediction->far_limit_infinite);
}

TEST(FrameJson, OfAnEmptyRecordIsNullEverywhere) {
  FrameRecord record;
  record.path = "a.jpg";
  const Json json = Json::parse(line_of(record));
  for (const char* key : {"capture", "prediction", "aim", "measurement", "verdict"}) EXPECT_TRUE(json[key].is_null()) << key;
  EXPECT_TRUE(json["issues"].empty());
}

TEST(FrameJson, CarriesLevelsAndHighlightsOnlyWhereAskedFor) {
  FrameRecord record = sample_record();
  record.measurement->levels = LevelGrid{.rows = 1, .columns = 2, .tile_px = 64, .mean_linear = {0.25f, 0.5f},
                                         .contrast = {0.125f, 0}, .clipped = {0, 1}};
  record.measurement->highlights = Highlights{std::vector<float>(kHighlightSteps, 0.5f), {}};
  EXPECT_FALSE(frame_json(record)["measurement"].contains("levels"));
  const auto back = frame_record_from_json(frame_json(record, {.levels = true}));
  ASSERT_TRUE(back);
  EXPECT_EQ(back->measurement->levels->mean_linear, record.measurement->levels->mean_linear);
  EXPECT_EQ(back->measurement->levels->contrast, record.measurement->levels->contrast);
  EXPECT_EQ(back->measurement->levels->clipped, record.measurement->levels->clipped);
  EXPECT_EQ(back->measurement->highlights->frame_share_above, record.measurement->highlights->frame_share_above);
  EXPECT_TRUE(back->measurement->highlights->aim_share_above.empty());
  Json short_of_one = frame_json(record, {.levels = true});
  short_of_one["measurement"]["levels"]["columns"] = 3;
  EXPECT_FALSE(frame_record_from_json(short_of_one));
}

TEST(FrameJson, NamesTheKeyThatDoesNotFit) {
  Json json = frame_json(sample_record());
  json["verdict"]["focus"] = "sharp";
  const auto record = frame_record_from_json(json);
  ASSERT_FALSE(record);
  EXPECT_THAT(record.error(), testing::HasSubstr("focus"));
}

}  // namespace
}  // namespace focusfall
