// What XMP says about the capture: regions that other programs marked, and values that fill what Exif leaves open.
#pragma once

#include "metadata/capture.h"
#include "metadata/read_capture.h"
#include "metadata/remarks.h"
#include "metadata/xmp_tags.h"

namespace focusfall {

// Fills fields that are still empty, and adds regions to the focus areas.
void read_standard_xmp(const XmpTags& tags, DecodedSize decoded, Capture& capture, Remarks& remarks);

}  // namespace focusfall
