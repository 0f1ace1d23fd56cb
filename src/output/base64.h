// Base64 after RFC 4648, section 4, for names that are not valid UTF-8.
#pragma once

#include <optional>
#include <string>
#include <string_view>

namespace focusfall {

std::string base64(std::string_view bytes);

// Absent for a text that is no base64 with padding.
std::optional<std::string> bytes_of_base64(std::string_view text);

}  // namespace focusfall
