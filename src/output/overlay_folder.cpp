#include "src/output/overlay_folder.h"

#include <fmt/format.h>
#include <sys/stat.h>

#include <filesystem>
#include <stdexcept>
#include <system_error>

#include "src/output/overlay.h"
#include "src/output/owned_file.h"
#include "src/output/sheet.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

std::string stem_of(const std::string& path) {
  const std::string name = path.substr(path.find_last_of('/') + 1);
  const auto point = name.find_last_of('.');
  return point == std::string::npos || point == 0 ? name : name.substr(0, point);
}

bool stands_upright(const FrameRecord& record) {
  const int orientation = record.capture->orientation ? record.capture->orientation->value : 1;
  const bool tall = record.capture->height_px.value_or(0) > record.capture->width_px.value_or(0);
  return orientation >= 5 ? !tall : tall;
}

}  // namespace

OverlayFolder::OverlayFolder(std::string folder, const std::vector<std::string>& inputs) : folder_(std::move(folder)) {
  std::error_code error;
  std::filesystem::create_directories(folder_, error);
  if (!std::filesystem::is_directory(folder_)) {
    throw std::runtime_error(
        fmt::format("{} is no folder and cannot be made one{}", folder_, error ? " (" + error.message() + ")" : ""));
  }
  for (const std::string& input : inputs) {
    struct stat status{};
    if (::stat(input.c_str(), &status) == 0) inputs_.emplace(status.st_dev, status.st_ino);
  }
}

std::string OverlayFolder::next_name(const std::string& path) {
  const std::string stem = stem_of(path);
  std::string name = stem + ".overlay.png";
  for (int number = 2; !used_.insert(name).second; ++number) name = fmt::format("{}-{}.overlay.png", stem, number);
  return name;
}

tl::expected<void, std::string> OverlayFolder::write(const FrameRecord& record) {
  const std::string target = folder_ + "/" + next_name(record.path);
  const auto failed = [](const std::string& path, const std::string& why) {
    return tl::make_unexpected(visible_text(path) + ": " + why);
  };
  struct stat status{};
  if (::stat(target.c_str(), &status) == 0 && inputs_.contains({status.st_dev, status.st_ino})) {
    return failed(target, "is one of the photographs of this run; it is kept");
  }
  if (const auto read = read_file(record.path, file_); !read) return failed(record.path, read.error().message);
  const int orientation = record.capture->orientation ? record.capture->orientation->value : 1;
  const auto picture = read_overlay_picture(file_.bytes(), orientation, overlay_picture_room(stands_upright(record)),
                                            workspace_);
  if (!picture) return failed(record.path, picture.error().message);
  const OwnedFile file{.path = target,
                       .first_bytes = kMarkBytes,
                       .is_ours = [](std::string_view bytes) { return is_marked_png(bytes, kOverlayMark); }};
  if (const auto written = write_owned_file(file, overlay_png(record, *picture)); !written) {
    return failed(target, written.error());
  }
  return {};
}

}  // namespace focusfall
