// The tags that the Exif standard defines (CIPA DC-008, Exif 2.32), whoever made the camera.
#pragma once

#include "metadata/capture.h"
#include "metadata/exif_tags.h"
#include "metadata/read_capture.h"
#include "metadata/remarks.h"

namespace focusfall {

// Fills what the standard tags hold; what they do not hold stays as it is. Focus areas are added.
void read_standard_exif(const ExifTags& tags, DecodedSize decoded, Capture& capture, Remarks& remarks);

// "2026:06:20 14:03:07", digits of a fraction and "+02:00" as "2026-06-20T14:03:07.25+02:00". Fraction and zone may be
// empty; a fraction or zone that is none is left out. Absent where the text is no time of a photograph of this age.
std::optional<std::string> iso_time(const std::string& exif_time, const std::string& fraction, const std::string& zone);

// Size of the picture as the camera recorded it, long side and short side as stored; absent where it does not say.
std::optional<DecodedSize> recorded_size(const ExifTags& tags);

// "18-55 mm f/3.5-5.6" from LensSpecification, where nothing tells the name of the lens: shortest and longest focal
// length, f-number at each, 0/0 where not known (Exif 2.32).
std::optional<std::string> lens_by_specification(const ExifTags& tags);

}  // namespace focusfall
