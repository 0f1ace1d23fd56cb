#include "src/output/owned_file.h"

#include <gmock/gmock.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <iterator>

namespace focusfall {
namespace {

namespace fs = std::filesystem;

class OwnedFileTest : public testing::Test {
 protected:
  OwnedFileTest() : folder_(fs::path(testing::TempDir()) / ("owned_file_" + std::to_string(::getpid()))) {
    fs::remove_all(folder_);
    fs::create_directories(folder_);
  }
  ~OwnedFileTest() override { fs::remove_all(folder_); }

  OwnedFile file(const std::string& name) const {
    return {.path = (folder_ / name).string(),
            .is_ours = [](std::string_view first) { return first.starts_with("ours"); }};
  }
  void put(const std::string& name, const std::string& content) const { std::ofstream(folder_ / name) << content; }
  std::string content(const std::string& name) const {
    std::ifstream in(folder_ / name, std::ios::binary);
    return {std::istreambuf_iterator<char>(in), {}};
  }
  std::size_t entries() const {
    return static_cast<std::size_t>(std::distance(fs::directory_iterator(folder_), fs::directory_iterator()));
  }

  fs::path folder_;
};

TEST_F(OwnedFileTest, WritesANewFile) {
  ASSERT_TRUE(write_owned_file(file("a"), "ours, new"));
  EXPECT_EQ(content("a"), "ours, new");
  EXPECT_EQ(entries(), 1u);
}

TEST_F(OwnedFileTest, ReplacesItsOwn) {
  put("a", "ours, old");
  ASSERT_TRUE(write_owned_file(file("a"), "ours, new"));
  EXPECT_EQ(content("a"), "ours, new");
}

TEST_F(OwnedFileTest, KeepsWhatSomeoneElseWrote) {
  put("a", "a photograph");
  const auto written = write_owned_file(file("a"), "ours");
  ASSERT_FALSE(written);
  EXPECT_THAT(written.error(), testing::HasSubstr("not written by focusfall"));
  EXPECT_EQ(content("a"), "a photograph");
  EXPECT_EQ(entries(), 1u);
}

TEST_F(OwnedFileTest, DoesNotFollowALinkToAnOriginal) {
  put("original", "ours as well, but elsewhere");
  fs::create_symlink(folder_ / "original", folder_ / "link");
  EXPECT_FALSE(write_owned_file(file("link"), "ours, new"));
  EXPECT_EQ(content("original"), "ours as well, but elsewhere");
}

TEST_F(OwnedFileTest, KeepsAFolderUnderThatName) {
  fs::create_directory(folder_ / "a");
  EXPECT_FALSE(write_owned_file(file("a"), "ours"));
  EXPECT_TRUE(fs::is_directory(folder_ / "a"));
}

TEST_F(OwnedFileTest, SaysWhereItCannotWrite) {
  const auto written = write_owned_file(file("no such folder/a"), "ours");
  ASSERT_FALSE(written);
  EXPECT_THAT(written.error(), testing::HasSubstr("No such file or directory"));
}

}  // namespace
}  // namespace focusfall
