#include "src/pipeline/inputs.h"

#include <fmt/format.h>
#include <gmock/gmock.h>
#include <sys/stat.h>

#include <filesystem>
#include <sstream>

#include "tests/pipeline/temporary_folder.h"

namespace focusfall {
namespace {

using testing::ElementsAre;
using namespace std::string_literals;

constexpr std::string_view kJpegStart = "\xFF\xD8\xFF\xE0";

Inputs found(const std::vector<std::string>& arguments, const std::string& standard_input = "") {
  std::istringstream input(standard_input);
  auto inputs = find_inputs(arguments, input);
  EXPECT_TRUE(inputs) << inputs.error().message;
  return inputs ? *inputs : Inputs{};
}

TEST(Inputs, KeepTheOrderGivenAndWhatIsNotThere) {
  const TemporaryFolder folder;
  const std::string b = folder.write("b.jpg", kJpegStart), a = folder.write("a.jpg", kJpegStart);
  EXPECT_THAT(found({b, folder.path("none.jpg"), a, "http://example.org/x.jpg"}).paths,
              ElementsAre(b, folder.path("none.jpg"), a, "http://example.org/x.jpg"));
}

TEST(Inputs, WalkFoldersInByteOrderAndCountTheRest) {
  const TemporaryFolder folder;
  const std::string deep = folder.write("b/c.jpg", kJpegStart), upper = folder.write("Z.jpg", kJpegStart),
                    lower = folder.write("a.jpg", kJpegStart);
  folder.write("notes.txt", "words");
  folder.write(".hidden.jpg", kJpegStart);
  folder.write(".hidden/d.jpg", kJpegStart);
  ASSERT_EQ(::mkfifo(folder.path("pipe.jpg").c_str(), 0600), 0);
  std::filesystem::create_directory_symlink("..", folder.path("b/up"));
  const Inputs inputs = found({folder.path("")});
  ASSERT_EQ(inputs.paths.size(), 3u);
  EXPECT_TRUE(inputs.paths[0].ends_with("Z.jpg"));   // capitals before small letters
  EXPECT_TRUE(inputs.paths[1].ends_with("a.jpg"));
  EXPECT_TRUE(inputs.paths[2].ends_with("b/c.jpg"));
  EXPECT_EQ(inputs.other_files, 2u);     // the notes and the pipe
  EXPECT_EQ(inputs.hidden, 2u);
  EXPECT_EQ(inputs.folder_links, 1u);
  EXPECT_TRUE(inputs.problems.empty());
}

TEST(Inputs, MeetAFileOnce) {
  const TemporaryFolder folder;
  const std::string a = folder.write("a.jpg", kJpegStart);
  std::filesystem::create_hard_link(a, folder.path("b.jpg"));
  std::filesystem::create_symlink(a, folder.path("c.jpg"));
  const Inputs inputs = found({a, folder.path("b.jpg"), folder.path("c.jpg"), a});
  EXPECT_THAT(inputs.paths, ElementsAre(a));
  EXPECT_EQ(inputs.repeats, 3u);
}

TEST(Inputs, ReadListsOfLinesAndOfNul) {
  const TemporaryFolder folder;
  const std::string lines = folder.write("lines", "x.jpg\n\ny z.jpg\r\n\"q\".jpg"), nul = folder.write("nul", "x\ny.jpg\0z.jpg\0"s);
  EXPECT_THAT(found({fmt::format("@{}", lines)}).paths, ElementsAre("x.jpg", "y z.jpg\r", "\"q\".jpg"));
  EXPECT_THAT(found({fmt::format("@{}", nul)}).paths, ElementsAre("x\ny.jpg", "z.jpg"));
  EXPECT_THAT(found({"@-", "last.jpg"}, "first.jpg\n").paths, ElementsAre("first.jpg", "last.jpg"));
  EXPECT_THAT(found({"./@x.jpg"}).paths, ElementsAre("./@x.jpg"));
}

TEST(Inputs, RefuseAListThatCannotBeRead) {
  const TemporaryFolder folder;
  std::istringstream input;
  const auto missing = find_inputs({fmt::format("@{}", folder.path("none"))}, input);
  ASSERT_FALSE(missing);
  EXPECT_THAT(missing.error().message, testing::HasSubstr("./@"));
  EXPECT_FALSE(find_inputs({fmt::format("@{}", folder.path(""))}, input));
}

TEST(StartsLikePhotograph, GoesByTheFirstBytes) {
  for (const std::string& start : {"\xFF\xD8\xFF\xE1"s, "\x89PNG\r\n\x1A\n"s, "II*\0"s, "MM\0*"s, "\0\0\0\x18" "ftypheic"s}) {
    EXPECT_TRUE(starts_like_photograph(start));
  }
  for (const std::string& start : {""s, "\xFF\xD8"s, "GIF89a"s, "%PDF-1.7"s, "\0\0\0\x18" "ftypisom"s, "II"s}) {
    EXPECT_FALSE(starts_like_photograph(start));
  }
}

}  // namespace
}  // namespace focusfall
