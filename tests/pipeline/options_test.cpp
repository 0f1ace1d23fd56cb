// Quantities as people write them. Lengths: the international foot and inch (1959) are .3048 m and .0254 m exactly;
// the international nautical mile is 1852 m, the mile 1609.344 m.
#include "src/pipeline/options.h"

#include <fmt/format.h>
#include <gmock/gmock.h>

#include <cmath>
#include <numbers>

namespace focusfall {
namespace {

TEST(Quantities, AreReadWithTheirUnits) {
  EXPECT_DOUBLE_EQ(*parse_focal_length_mm("400mm"), 400);
  EXPECT_DOUBLE_EQ(*parse_focal_length_mm("400"), 400);
  EXPECT_DOUBLE_EQ(*parse_focal_length_mm("0.4 m"), 400);
  EXPECT_DOUBLE_EQ(*parse_distance_m("12.5m"), 12.5);
  EXPECT_NEAR(*parse_distance_m("30ft"), 30 * 0.3048, 1e-12);
  EXPECT_TRUE(std::isinf(*parse_distance_m("inf")));
  EXPECT_DOUBLE_EQ(*parse_f_number("f/2.8"), 2.8);
  EXPECT_DOUBLE_EQ(*parse_f_number("F2.8"), 2.8);
  EXPECT_DOUBLE_EQ(*parse_time_s("1/2000"), 1.0 / 2000);
  EXPECT_DOUBLE_EQ(*parse_time_s("1/2000s"), 1.0 / 2000);
  EXPECT_DOUBLE_EQ(*parse_time_s("20ms"), 0.02);
  EXPECT_DOUBLE_EQ(*parse_iso_speed("ISO800"), 800);
  EXPECT_DOUBLE_EQ(*parse_pixel_pitch_um("4.3um"), 4.3);
  EXPECT_DOUBLE_EQ(*parse_pixel_pitch_um("4.3\xC2\xB5m"), 4.3);   // micro sign
  EXPECT_DOUBLE_EQ(*parse_pixel_pitch_um("4.3\xCE\xBCm"), 4.3);   // Greek mu
  EXPECT_DOUBLE_EQ(parse_sensor_mm("36x24mm")->height_mm, 24);
  EXPECT_DOUBLE_EQ(parse_sensor_mm("36\xC3\x97" "24")->width_mm, 36);
  EXPECT_NEAR(*parse_speed_m_s("36km/h"), 10, 1e-12);
  EXPECT_NEAR(*parse_speed_m_s("10kn"), 18520.0 / 3600, 1e-12);
  EXPECT_NEAR(*parse_speed_m_s("10mph"), 16093.44 / 3600, 1e-12);
  EXPECT_NEAR(*parse_angular_rate_rad_s("180deg/s"), std::numbers::pi, 1e-12);
}

TEST(Quantities, ThatCannotBeAreRefusedWithWhatWasSeen) {
  for (const char* text : {"", "mm", "400xx", "-400mm", "0", "1e400mm", "inf", "nan", "400 mm mm"}) {
    const auto length = parse_focal_length_mm(text);
    ASSERT_FALSE(length) << text;
    EXPECT_THAT(length.error(), testing::HasSubstr(fmt::format("'{}'", text)));
  }
  EXPECT_FALSE(parse_f_number("0.5"));
  EXPECT_FALSE(parse_time_s("1/0"));
  EXPECT_FALSE(parse_time_s("1/"));
  EXPECT_FALSE(parse_sensor_mm("36"));
  EXPECT_FALSE(parse_distance_m("nan"));
}

TEST(PictureLength, IsAFractionAShareOrPixels) {
  EXPECT_DOUBLE_EQ(parse_picture_length("0.25")->value, 0.25);
  EXPECT_DOUBLE_EQ(parse_picture_length("25%")->value, 0.25);
  EXPECT_TRUE(parse_picture_length("640px")->in_pixels);
  EXPECT_FALSE(parse_picture_length("1.5"));       // more than the picture; pixels need their unit
  EXPECT_FALSE(parse_picture_length("-0.1"));
}

TEST(Aim, NeedsFourLengths) {
  const auto aim = parse_aim("0.1,20%,300px,0.4");
  ASSERT_TRUE(aim);
  EXPECT_DOUBLE_EQ(aim->y.value, 0.2);
  EXPECT_TRUE(aim->width.in_pixels);
  for (const char* text : {"0.1,0.2,0.3", "0.1,0.2,0.3,0.4,0.5", ",,,", "a,b,c,d"}) EXPECT_FALSE(parse_aim(text)) << text;
}

TEST(AcceptableBlur, KeepsTheLastThatWasSaid) {
  UserValues values;
  ASSERT_TRUE(set_acceptable_blur(values, "0.02mm"));
  EXPECT_DOUBLE_EQ(*values.acceptable_blur_um, 20);
  ASSERT_TRUE(set_acceptable_blur(values, "3px"));
  EXPECT_DOUBLE_EQ(*values.acceptable_blur_px, 3);
  EXPECT_FALSE(values.acceptable_blur_um);
  EXPECT_FALSE(set_acceptable_blur(values, "3"));    // of what?
}

TEST(ValueOptions, AllHaveHelpWithADefault) {
  for (const ValueOption& option : value_options()) {
    EXPECT_THAT(std::string(option.help), testing::HasSubstr("Default: ")) << option.name;
    EXPECT_FALSE(option.placeholder.empty()) << option.name;
  }
}

}  // namespace
}  // namespace focusfall
