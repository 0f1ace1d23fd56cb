#include "metadata/capture.h"

namespace focusfall {

const char* source_name(Source source) {
  switch (source) {
    case Source::exif: return "exif";
    case Source::maker_note: return "maker note";
    case Source::xmp: return "xmp";
    case Source::raw: return "raw";
    case Source::settings: return "settings";
    case Source::user: return "user";
    case Source::derived: return "derived";
    case Source::assumed: return "assumed";
  }
  return "assumed";
}

}  // namespace focusfall
