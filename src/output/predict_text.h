// The model of one shot as a table for a person.
#pragma once

#include <string>
#include <vector>

#include "analysis/optics/predict.h"
#include "src/pipeline/frame_record.h"

namespace focusfall {

struct PredictReport {
  FrameRecord record;                      // capture, set-up and prediction
  std::vector<BlurAtDistance> at;          // --at
  std::vector<std::string> solved;         // what was asked for and what holds it, one sentence each
  std::vector<std::string> assumptions;    // what was not said and taken for granted, one sentence each
};

std::string predict_text(const PredictReport& report, int columns);

}  // namespace focusfall
