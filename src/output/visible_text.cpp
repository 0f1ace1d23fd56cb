#include "src/output/visible_text.h"

#include <fmt/format.h>
#include <wchar.h>

#include <cstddef>
#include <cstdint>

namespace focusfall {
namespace {

// One character of UTF-8 text, or one byte that is none.
struct Character {
  char32_t code = 0;
  std::size_t bytes = 1;
  bool valid = false;
};

// Unicode 15, table 3-7: well-formed sequences; overlong forms and surrogates are not.
Character first_character(std::string_view text) {
  const auto byte = [&text](std::size_t i) { return static_cast<unsigned char>(text[i]); };
  const unsigned lead = byte(0);
  if (lead < 0x80) return {.code = lead, .bytes = 1, .valid = true};
  const std::size_t length = lead >= 0xC2 && lead <= 0xDF ? 2 : lead >= 0xE0 && lead <= 0xEF ? 3
                             : lead >= 0xF0 && lead <= 0xF4 ? 4 : 0;
  if (length == 0 || text.size() < length) return {};
  char32_t code = lead & (0xFFu >> (length + 1));
  for (std::size_t i = 1; i < length; ++i) {
    if ((byte(i) & 0xC0u) != 0x80u) return {};
    code = code << 6 | (byte(i) & 0x3Fu);
  }
  constexpr char32_t kLeast[] = {0, 0, 0x80, 0x800, 0x10000};
  if (code < kLeast[length] || code > 0x10FFFF || (code >= 0xD800 && code <= 0xDFFF)) return {};
  return {.code = code, .bytes = length, .valid = true};
}

// Marks that reorder or hide text: soft hyphen, zero-width and directional marks, line and paragraph separators,
// byte-order mark, interlinear and tag characters (Unicode 15, general category Cf, Zl, Zp).
bool is_hidden(char32_t code) {
  return code == 0xAD || code == 0x61C || code == 0x180E || (code >= 0x200B && code <= 0x200F) ||
         (code >= 0x2028 && code <= 0x202E) || (code >= 0x2060 && code <= 0x206F) || code == 0xFEFF ||
         (code >= 0xFFF9 && code <= 0xFFFB) || (code >= 0xE0000 && code <= 0xE0FFF);
}

std::string visible_character(const Character& character, std::string_view bytes) {
  if (!character.valid) return fmt::format("\\x{:02x}", static_cast<unsigned char>(bytes[0]));
  const char32_t code = character.code;
  if (code == '\n') return "\\n";
  if (code == '\t') return "\\t";
  if (code == '\r') return "\\r";
  if (code < 0x20 || code == 0x7F) return fmt::format("\\x{:02x}", static_cast<std::uint32_t>(code));
  if ((code >= 0x80 && code <= 0x9F) || is_hidden(code)) {
    return fmt::format("\\u{{{:x}}}", static_cast<std::uint32_t>(code));
  }
  return std::string(bytes.substr(0, character.bytes));
}

// wcwidth() knows the width in the C.UTF-8 locale that main() sets; elsewhere every character counts one.
int columns_of(char32_t code) {
  if (code < 0x80) return 1;
  const int width = wcwidth(static_cast<wchar_t>(code));
  return width < 0 ? 1 : width;
}

}  // namespace

std::string visible_text(std::string_view text) {
  std::string result;
  while (!text.empty()) {
    const Character character = first_character(text);
    result += visible_character(character, text);
    text.remove_prefix(character.bytes);
  }
  return result;
}

int text_columns(std::string_view text) {
  int columns = 0;
  while (!text.empty()) {
    const Character character = first_character(text);
    columns += character.valid ? columns_of(character.code) : 1;
    text.remove_prefix(character.bytes);
  }
  return columns;
}

std::string shortened(std::string_view text, int columns) {
  constexpr std::string_view kDots = "...";
  int excess = text_columns(text) - columns;
  if (excess <= 0) return std::string(text);
  excess += static_cast<int>(kDots.size());
  while (excess > 0 && !text.empty()) {
    const Character character = first_character(text);
    excess -= character.valid ? columns_of(character.code) : 1;
    text.remove_prefix(character.bytes);
  }
  return std::string(kDots).append(text);
}

std::string padded(std::string_view text, int columns) {
  std::string result(text);
  const int missing = columns - text_columns(text);
  if (missing > 0) result.append(static_cast<std::size_t>(missing), ' ');
  return result;
}

std::string wrapped(std::string_view text, int columns, int indent) {
  std::string result;
  int column = 0;
  bool first_of_line = true;
  while (!text.empty()) {
    const auto blank = text.find(' ');
    const std::string_view word = text.substr(0, blank);
    text.remove_prefix(blank == std::string_view::npos ? text.size() : blank + 1);
    if (word.empty()) continue;
    const int width = text_columns(word);
    if (!first_of_line && column + 1 + width > columns) {
      result += '\n';
      result.append(static_cast<std::size_t>(indent), ' ');
      column = indent;
      first_of_line = true;
    }
    if (!first_of_line) {
      result += ' ';
      ++column;
    }
    result += word;
    column += width;
    first_of_line = false;
  }
  return result;
}

}  // namespace focusfall
