#include "tests/pipeline/temporary_folder.h"

#include <cstdlib>
#include <fstream>
#include <stdexcept>

namespace focusfall {

TemporaryFolder::TemporaryFolder() {
  std::string name = (std::filesystem::temp_directory_path() / "focusfall-test-XXXXXX").native();
  if (::mkdtemp(name.data()) == nullptr) throw std::runtime_error("no temporary folder can be made");
  folder_ = name;
}

TemporaryFolder::~TemporaryFolder() {
  std::error_code ignored;
  std::filesystem::remove_all(folder_, ignored);
}

std::string TemporaryFolder::write(std::string_view name, std::string_view content) const {
  const std::filesystem::path target = folder_ / name;
  std::filesystem::create_directories(target.parent_path());
  std::ofstream(target, std::ios::binary) << content;
  return target.native();
}

}  // namespace focusfall
