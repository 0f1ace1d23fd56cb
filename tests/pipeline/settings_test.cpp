#include "src/pipeline/settings.h"

#include <gmock/gmock.h>

#include <cstdlib>

#include "tests/pipeline/temporary_folder.h"

namespace focusfall {
namespace {

using testing::HasSubstr;

class SettingsTest : public testing::Test {
 protected:
  tl::expected<Settings, SettingsError> read(std::string_view text) const {
    return read_settings(folder_.write("settings.toml", text));
  }
  std::string error(std::string_view text) const {
    const auto settings = read(text);
    return settings ? "no error" : settings.error().message;
  }
  TemporaryFolder folder_;
};

TEST_F(SettingsTest, ReadDefaultsBodiesAndLenses) {
  const auto settings = read(R"(
[defaults]
acceptable_blur = "3px"
trust_centre = true

[[body]]
serial = "0042"
pixel_pitch = "4.3um"
baseline_px2 = [-5, -3, -1]
clock_offset_s = -2.5
override = true

[[body]]
model = "Invented One"
sensor = "36x24mm"
baseline_px2 = 4

[[lens]]
model = "Invented 400 mm f/2.8"
teleconverter = 1.4
)");
  ASSERT_TRUE(settings) << settings.error().message;
  EXPECT_DOUBLE_EQ(*settings->defaults.acceptable_blur_px, 3);
  EXPECT_TRUE(settings->defaults.trust_centre);
  ASSERT_EQ(settings->bodies.size(), 2u);
  EXPECT_EQ(settings->bodies[0].serial, "0042");
  EXPECT_DOUBLE_EQ(*settings->bodies[0].values.pixel_pitch_um, 4.3);
  EXPECT_DOUBLE_EQ(settings->bodies[0].baseline_px2->low, -5);
  EXPECT_DOUBLE_EQ(settings->bodies[0].baseline_px2->value, -3);
  EXPECT_DOUBLE_EQ(*settings->bodies[0].clock_offset_s, -2.5);
  EXPECT_TRUE(settings->bodies[0].override_file);
  EXPECT_DOUBLE_EQ(settings->bodies[1].baseline_px2->high, 4);
  EXPECT_FALSE(settings->bodies[1].override_file);
  EXPECT_DOUBLE_EQ(*settings->lenses[0].values.teleconverter, 1.4);
}

TEST_F(SettingsTest, NameTheLineOfWhatIsWrong) {
  EXPECT_THAT(error("[defaults]\n\nf_numbr = 2\n"), HasSubstr(":3: unknown key f_numbr in [defaults]"));
  EXPECT_THAT(error("[camera]\n"), HasSubstr(":1: unknown key camera"));
  EXPECT_THAT(error("[defaults]\nf_number = \"f/0.1\"\n"), HasSubstr(":2: f_number: "));
  EXPECT_THAT(error("[defaults]\nf-number = 2\n"), HasSubstr(":2: unknown key f-number"));   // the spelling of options
  EXPECT_THAT(error("x = = 1\n"), HasSubstr(":1: "));
  EXPECT_THAT(error("[[body]]\nbaseline_px2 = [3, 2, 1]\nmodel = \"M\"\n"), HasSubstr(":2: baseline_px2"));
  EXPECT_THAT(error("[[lens]]\nfocal_length = 400\n"), HasSubstr("serial or a model"));
  EXPECT_THAT(error("[[lens]]\nmodel = \"M\"\naim = \"0,0,1,1\"\n"), HasSubstr(":3: unknown key aim in [[lens]]"));
  EXPECT_THAT(error("body = 3\n"), HasSubstr("[[body]]"));
}

TEST_F(SettingsTest, MustBeAFileThatIsThere) {
  EXPECT_FALSE(read_settings(folder_.path("none.toml")));
  EXPECT_FALSE(read_settings(folder_.path("")));
}

TEST_F(SettingsTest, ComeFromThePlaceThatTheXdgSpecificationNames) {
  folder_.write("focusfall/settings.toml", "[defaults]\niso = 800\n");
  ::setenv("XDG_CONFIG_HOME", folder_.path("").c_str(), 1);
  const auto settings = read_default_settings();
  ::setenv("XDG_CONFIG_HOME", "relative", 1);   // to be ignored
  ::unsetenv("HOME");
  const std::string without = default_settings_path();
  ::unsetenv("XDG_CONFIG_HOME");
  ASSERT_TRUE(settings) << settings.error().message;
  EXPECT_DOUBLE_EQ(*settings->defaults.iso_speed, 800);
  EXPECT_EQ(without, "");
}

}  // namespace
}  // namespace focusfall
