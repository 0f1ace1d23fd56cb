// The one lock around Exiv2's XMP parser.
#pragma once

#include <mutex>

namespace focusfall {

// Exiv2's XMP parser keeps tables that all threads share, also with the lock that XmpParser::initialize takes: some
// readings in a thousand lost all XMP without an error. Whoever opens an image and reads its metadata, or calls
// XmpParser, holds this.
std::mutex& exiv2_mutex();

}  // namespace focusfall
