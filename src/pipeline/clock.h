// Times as ISO 8601 text, as the capture data carries them.
#pragma once

#include <optional>
#include <string>

namespace focusfall {

// "2024-05-01T18:03:07.25+02:00" moved by `seconds`; fraction digits and zone are kept as they stand, and a fraction
// of the offset is dropped below the digits that the time has. Absent where the text is no such time.
std::optional<std::string> moved_time(const std::string& iso_time, double seconds);

// Seconds since 1970 of such a time, its zone taken off where it has one and else taken as written: two times of one
// camera compare. Absent where the text is no such time.
std::optional<double> seconds_of_time(const std::string& iso_time);

}  // namespace focusfall
