// What `report` and `review` show: records of frames with their pictures, from photographs or from records.
#pragma once

#include <string>
#include <vector>

#include "src/commands/common_options.h"
#include "src/output/page.h"

namespace focusfall {

struct PageInputOptions {
  std::vector<std::string> inputs;       // photographs, folders, lists; JSON Lines of `check`
  UserValues values;
  SettingsChoice settings;
  int workers = 0;                       // 0: one a core
  bool pictures = true;
};

struct PageInput {
  std::vector<PageFrame> frames;         // in the order of the input
  std::size_t not_done = 0;              // frames, folders and records that could not be done
};

// FILE..., --workers, the values of `check` and the settings.
void add_page_input_options(CLI::App& app, PageInputOptions& options);

// Measures what is a photograph, reads what is a file of records, and makes the small pictures. Says on standard error
// what could not be done. Throws WrongUse where nothing is left to show.
PageInput load_page_input(const PageInputOptions& options);

// What a shoot is called: the last part of the only path given, else of the folder that holds the first frame.
std::string shoot_title(const std::vector<std::string>& inputs);

}  // namespace focusfall
