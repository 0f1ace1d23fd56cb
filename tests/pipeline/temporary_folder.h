// A folder that a test fills and that goes away with it.
#pragma once

#include <filesystem>
#include <string>
#include <string_view>

namespace focusfall {

class TemporaryFolder {
 public:
  TemporaryFolder();
  ~TemporaryFolder();
  TemporaryFolder(const TemporaryFolder&) = delete;
  TemporaryFolder& operator=(const TemporaryFolder&) = delete;

  std::string path(std::string_view name) const { return (folder_ / name).native(); }
  // Makes the folders on the way; returns the path.
  std::string write(std::string_view name, std::string_view content) const;

 private:
  std::filesystem::path folder_;
};

}  // namespace focusfall
