#include "src/pipeline/frame_record.h"

namespace focusfall {

const char* stage_name(Stage stage) {
  switch (stage) {
    case Stage::find: return "find";
    case Stage::read: return "read";
    case Stage::resolve: return "resolve";
    case Stage::decode: return "decode";
    case Stage::predict: return "predict";
    case Stage::measure: return "measure";
    case Stage::compare: return "compare";
  }
  return "read";
}

}  // namespace focusfall
