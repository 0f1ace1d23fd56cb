#include "src/output/base64.h"

#include <cstdint>

namespace focusfall {
namespace {

constexpr std::string_view kDigits = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";

}  // namespace

std::string base64(std::string_view bytes) {
  std::string text;
  for (std::size_t i = 0; i < bytes.size(); i += 3) {
    std::uint32_t group = 0;
    for (std::size_t k = 0; k < 3; ++k) {
      group = group << 8 | (i + k < bytes.size() ? static_cast<unsigned char>(bytes[i + k]) : 0u);
    }
    for (std::size_t k = 0; k < 4; ++k) {
      text += i + k <= bytes.size() ? kDigits[group >> (18 - 6 * k) & 63] : '=';
    }
  }
  return text;
}

std::optional<std::string> bytes_of_base64(std::string_view text) {
  if (text.size() % 4 != 0) return std::nullopt;
  std::string bytes;
  for (std::size_t i = 0; i < text.size(); i += 4) {
    std::uint32_t group = 0;
    std::size_t padding = 0;
    for (std::size_t k = 0; k < 4; ++k) {
      const auto digit = kDigits.find(text[i + k]);
      if (text[i + k] == '=' && i + 4 == text.size() && k >= 2) {
        ++padding;
      } else if (digit == std::string_view::npos || padding > 0) {
        return std::nullopt;
      }
      group = group << 6 | (digit == std::string_view::npos ? 0u : static_cast<std::uint32_t>(digit));
    }
    for (std::size_t k = 0; k + padding < 3; ++k) bytes += static_cast<char>(group >> (16 - 8 * k) & 255);
  }
  return bytes;
}

}  // namespace focusfall
