// XMP properties by key: all of them are text.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <unordered_map>

namespace Exiv2 {
class XmpData;
}

namespace focusfall {

// A copy of the properties of one file. Keys are those of Exiv2 ("Xmp.aux.Lens",
// "Xmp.mwg-rs.Regions/mwg-rs:RegionList[1]/mwg-rs:Type").
class XmpTags {
 public:
  explicit XmpTags(const Exiv2::XmpData& data);

  bool empty() const { return texts_.empty(); }
  bool has(std::string_view key) const { return texts_.contains(std::string(key)); }

  // Without the spaces around it; absent where nothing is left.
  std::optional<std::string> text(std::string_view key) const;

  // A decimal number or a fraction "28/10"; absent for n/0, for what is no number to its end, and for what is not
  // finite.
  std::optional<double> real(std::string_view key) const;

 private:
  std::unordered_map<std::string, std::string> texts_;
};

// The reader of `real`, for texts from elsewhere. Independent of the locale.
std::optional<double> number_in_text(std::string_view text);

}  // namespace focusfall
