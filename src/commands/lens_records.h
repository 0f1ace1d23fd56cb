// Frame records out of what stands on the command line: photographs are measured, JSON Lines of `check` are read.
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "src/commands/common_options.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

struct RecordRequest {
  std::vector<std::string> inputs;
  UserValues values;
  SettingsChoice settings;
  int workers = 0;               // 0: one a core
};

struct GatheredRecords {
  std::vector<FrameRecord> records;   // photographs and stored records in the order of the inputs
  std::size_t read_back = 0;          // of them from JSON Lines
  bool complete = true;               // false: a frame or a line could not be done, and standard error says which
  bool interrupted = false;
};

// Throws WrongUse where the inputs or the settings make no sense.
GatheredRecords gather_records(const RecordRequest& request);

}  // namespace focusfall
