// One photograph on its way through the program: read -> resolve -> predict -> measure -> compare.
// Output, store, page and sidecar are functions of this record alone.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "analysis/compare/verdict.h"
#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"
#include "metadata/capture.h"

namespace focusfall {

enum class Stage { find, read, resolve, decode, predict, measure, compare };
const char* stage_name(Stage stage);

// Why a field of the record is empty or should be read with care. `code` is stable; all codes stand in issue_codes.h.
struct Issue {
  Stage stage = Stage::read;
  std::string code;
  std::string message;   // one sentence: what was seen, what is needed
};

struct FrameRecord {
  std::string path;                           // as given, raw bytes
  std::optional<std::string> raw_path;        // of a RAW+JPEG pair: the raw file, whose mosaic gave clipping and tone
  std::optional<std::string> measured_from;   // of a raw file: "embedded preview" or "half-size development"
  std::optional<Capture> capture;             // 1 read: what the camera recorded, each value with its source
  std::optional<OpticalSetup> setup;          // 2 resolve: file, command line and settings brought together
  std::optional<FocusArea> aim_origin;        //   and where the aim came from
  std::optional<Prediction> prediction;       // 3 predict
  std::optional<Measurement> measurement;     // 4 measure (pixels are a local, never stored)
  std::optional<Verdict> verdict;             // 5 compare
  std::vector<Issue> issues;                  // why a field above is empty
  bool done = false;                          // false: the frame could not be done (exit code 1)
};

}  // namespace focusfall
