// A folder of overlays: one PNG a frame, named after its file.
#pragma once

#include <set>
#include <string>
#include <tl/expected.hpp>
#include <utility>
#include <vector>

#include "src/decode/decoder.h"
#include "src/pipeline/frame_record.h"
#include "src/pipeline/read_file.h"

namespace focusfall {

class OverlayFolder {
 public:
  // Makes the folder where it is not there yet. `inputs` are the files that must never be written to. Throws
  // std::runtime_error where there can be no such folder.
  OverlayFolder(std::string folder, const std::vector<std::string>& inputs);

  // "boat.jpg" becomes "boat.overlay.png", a second boat of the same run "boat-2.overlay.png". Overlays of earlier runs
  // are replaced, anything else is kept and is an error: one sentence that names the path.
  tl::expected<void, std::string> write(const FrameRecord& record);

 private:
  std::string next_name(const std::string& path);

  std::string folder_;
  std::set<std::pair<unsigned long, unsigned long>> inputs_;   // device and inode
  std::set<std::string> used_;
  FileBuffer file_;
  DecodeWorkspace workspace_;
};

}  // namespace focusfall
