#include "src/pipeline/read_file.h"

#include <fcntl.h>
#include <gmock/gmock.h>
#include <sys/stat.h>


#include <filesystem>

#include "tests/pipeline/temporary_folder.h"

namespace focusfall {
namespace {

std::string text(const FileBuffer& buffer) {
  return {reinterpret_cast<const char*>(buffer.bytes().data()), buffer.bytes().size()};
}

std::string code(const std::string& path) {
  FileBuffer buffer;
  const auto read = read_file(path, buffer);
  return read ? "read" : read.error().code;
}

TEST(ReadFile, GivesTheBytesAndReusesTheBuffer) {
  const TemporaryFolder folder;
  const std::string long_content(100'000, 'x');
  const std::string long_file = folder.write("long", long_content), short_file = folder.write("short", "ab");
  FileBuffer buffer;
  ASSERT_TRUE(read_file(long_file, buffer));
  EXPECT_EQ(text(buffer), long_content);
  const auto* place = buffer.bytes().data();
  ASSERT_TRUE(read_file(short_file, buffer));
  EXPECT_EQ(text(buffer), "ab");
  EXPECT_EQ(buffer.bytes().data(), place);
}

TEST(ReadFile, TakesAnEmptyFileForEmpty) {
  const TemporaryFolder folder;
  FileBuffer buffer;
  ASSERT_TRUE(read_file(folder.write("empty", ""), buffer));
  EXPECT_TRUE(buffer.bytes().empty());
}

TEST(ReadFile, ReadsRegularFilesOnly) {
  const TemporaryFolder folder;
  ASSERT_EQ(::mkfifo(folder.path("pipe").c_str(), 0600), 0);
  EXPECT_EQ(code(folder.path("pipe")), "not-a-file");    // and does not wait for a writer
  EXPECT_EQ(code(folder.path("")), "not-a-file");
  EXPECT_EQ(code("/dev/zero"), "not-a-file");
}

TEST(ReadFile, SaysWhatIsNotThere) {
  const TemporaryFolder folder;
  folder.write("file", "x");
  EXPECT_EQ(code(folder.path("none")), "file-missing");
  EXPECT_EQ(code(folder.path("file/below")), "file-missing");
  EXPECT_EQ(code(std::string("/dev/null\0.jpg", 14)), "file-missing");   // never cut at the NUL
  EXPECT_EQ(code("http://example.org/a.jpg"), "file-missing");
}

TEST(ReadFile, SaysThatALinkLeadsInACircle) {
  const TemporaryFolder folder;
  std::filesystem::create_symlink("circle", folder.path("circle"));
  EXPECT_EQ(code(folder.path("circle")), "file-unreadable");
}

TEST(ReadFile, LeavesTimesAlone) {
  const TemporaryFolder folder;
  const std::string path = folder.write("file", "content");
  const timespec times[] = {{1'000'000'000, 1}, {1'100'000'000, 2}};
  ASSERT_EQ(::utimensat(AT_FDCWD, path.c_str(), times, 0), 0);
  FileBuffer buffer;
  ASSERT_TRUE(read_file(path, buffer));
  struct stat status{};
  ASSERT_EQ(::stat(path.c_str(), &status), 0);
  EXPECT_EQ(status.st_mtim.tv_sec, 1'100'000'000);
  EXPECT_EQ(status.st_mtim.tv_nsec, 2);
}

}  // namespace
}  // namespace focusfall
