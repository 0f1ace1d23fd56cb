#include "metadata/xmp_tags.h"

#include <charconv>
#include <cmath>
#include <exiv2/exiv2.hpp>

#include "metadata/exif_tags.h"

namespace focusfall {
namespace {

std::optional<double> decimal(std::string_view text) {
  if (text.starts_with('+')) text.remove_prefix(1);
  double value = 0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc() || end != text.data() + text.size() || !std::isfinite(value)) return std::nullopt;
  return value;
}

}  // namespace

XmpTags::XmpTags(const Exiv2::XmpData& data) {
  // A structure is a property without a text of its own, and is kept: it says that its members are to be looked for.
  for (const Exiv2::Xmpdatum& datum : data) texts_.emplace(datum.key(), datum.toString());
}

std::optional<std::string> XmpTags::text(std::string_view key) const {
  const auto found = texts_.find(std::string(key));
  if (found == texts_.end()) return std::nullopt;
  std::string text = trimmed(found->second);
  return text.empty() ? std::nullopt : std::optional(std::move(text));
}

std::optional<double> XmpTags::real(std::string_view key) const {
  const auto found = text(key);
  return found ? number_in_text(*found) : std::nullopt;
}

std::optional<double> number_in_text(std::string_view text) {
  const auto slash = text.find('/');
  if (slash == std::string_view::npos) return decimal(text);
  const auto numerator = decimal(text.substr(0, slash)), denominator = decimal(text.substr(slash + 1));
  if (!numerator || !denominator || *denominator == 0) return std::nullopt;
  return *numerator / *denominator;
}

}  // namespace focusfall
