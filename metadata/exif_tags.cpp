#include "metadata/exif_tags.h"

#include <algorithm>
#include <cmath>
#include <exiv2/exiv2.hpp>
#include <map>

namespace focusfall {
namespace {

template <class T>
const std::vector<T>* components(const Exiv2::Value& value) {
  const auto* typed = dynamic_cast<const Exiv2::ValueType<T>*>(&value);
  return typed == nullptr ? nullptr : &typed->value_;
}

template <class T>
std::optional<std::int64_t> integer_component(const Exiv2::Value& value, std::size_t index) {
  const auto* all = components<T>(value);
  if (all == nullptr || index >= all->size()) return std::nullopt;
  return static_cast<std::int64_t>((*all)[index]);
}

template <class T>
std::optional<double> floating_component(const Exiv2::Value& value, std::size_t index) {
  const auto* all = components<T>(value);
  if (all == nullptr || index >= all->size()) return std::nullopt;
  const auto number = static_cast<double>((*all)[index]);
  return std::isfinite(number) ? std::optional(number) : std::nullopt;
}

template <class T>
std::optional<Ratio> ratio_component(const Exiv2::Value& value, std::size_t index) {
  const auto* all = components<T>(value);
  if (all == nullptr || index >= all->size()) return std::nullopt;
  return Ratio{static_cast<std::int64_t>((*all)[index].first), static_cast<std::int64_t>((*all)[index].second)};
}

std::vector<std::uint8_t> copied_bytes(const Exiv2::Value& value, Exiv2::ByteOrder order = Exiv2::littleEndian) {
  const auto size = static_cast<std::size_t>(value.size());
  std::vector<std::uint8_t> bytes(size);
  if (size > 0) bytes.resize(static_cast<std::size_t>(value.copy(bytes.data(), order)));
  return bytes;
}

bool holds_bytes(const Exiv2::Value& value) {
  return value.typeId() == Exiv2::undefined || value.typeId() == Exiv2::unsignedByte ||
         value.typeId() == Exiv2::signedByte;
}

std::optional<std::int64_t> byte_component(const Exiv2::Value& value, std::size_t index) {
  if (!holds_bytes(value) || index >= static_cast<std::size_t>(value.count())) return std::nullopt;
  return value.toLong(static_cast<long>(index));
}

}  // namespace

std::optional<std::uint16_t> two_bytes(const std::vector<std::uint8_t>& bytes, std::size_t offset, bool big_endian) {
  if (offset + 2 > bytes.size()) return std::nullopt;
  const unsigned first = bytes[offset], second = bytes[offset + 1];
  return static_cast<std::uint16_t>(big_endian ? first << 8 | second : second << 8 | first);
}

std::string trimmed(std::string_view text) {
  constexpr std::string_view kAround(" \t\r\n\0", 5);
  const auto first = text.find_first_not_of(kAround);
  if (first == std::string_view::npos) return {};
  return std::string(text.substr(first, text.find_last_not_of(kAround) - first + 1));
}

ExifTags::ExifTags(const Exiv2::ExifData& data) : data_(data) {
  for (const Exiv2::Exifdatum& datum : data) first_.emplace(datum.key(), &datum);
}

const Exiv2::Value* ExifTags::find(std::string_view key) const {
  const auto found = first_.find(std::string(key));
  if (found == first_.end() || found->second->count() == 0) return nullptr;
  return &found->second->value();
}

std::size_t ExifTags::count(std::string_view key) const {
  const Exiv2::Value* value = find(key);
  return value == nullptr ? 0 : static_cast<std::size_t>(value->count());
}

bool ExifTags::has_group(std::string_view start) const {
  return std::any_of(data_.begin(), data_.end(),
                     [&](const Exiv2::Exifdatum& datum) { return datum.groupName().starts_with(start); });
}

std::optional<std::int64_t> ExifTags::integer(std::string_view key, std::size_t component) const {
  const Exiv2::Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  if (auto number = byte_component(*value, component)) return number;
  if (auto number = integer_component<std::uint16_t>(*value, component)) return number;
  if (auto number = integer_component<std::uint32_t>(*value, component)) return number;
  if (auto number = integer_component<std::int16_t>(*value, component)) return number;
  return integer_component<std::int32_t>(*value, component);
}

std::optional<Ratio> ExifTags::ratio(std::string_view key, std::size_t component) const {
  const Exiv2::Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  if (auto ratio = ratio_component<Exiv2::URational>(*value, component)) return ratio;
  return ratio_component<Exiv2::Rational>(*value, component);
}

std::optional<double> ExifTags::real(std::string_view key, std::size_t component) const {
  if (const auto fraction = ratio(key, component)) {
    if (fraction->denominator == 0) return std::nullopt;
    return static_cast<double>(fraction->numerator) / static_cast<double>(fraction->denominator);
  }
  if (const auto number = integer(key, component)) return static_cast<double>(*number);
  const Exiv2::Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  if (auto number = floating_component<float>(*value, component)) return number;
  return floating_component<double>(*value, component);
}

std::optional<std::string> ExifTags::text(std::string_view key) const {
  const Exiv2::Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  std::string found;
  if (holds_bytes(*value)) {
    const auto raw = copied_bytes(*value);
    found.assign(raw.begin(), raw.end());
  } else if (const auto* string = dynamic_cast<const Exiv2::StringValueBase*>(value)) {
    found = string->value_;
  } else {
    return std::nullopt;
  }
  if (const auto end = found.find('\0'); end != std::string::npos) found.resize(end);
  found = trimmed(found);
  return found.empty() ? std::nullopt : std::optional(found);
}

std::optional<std::string> ExifTags::printed(std::string_view key) const {
  const auto found = first_.find(std::string(key));
  if (found == first_.end() || found->second->count() == 0) return std::nullopt;
  // The printers of Exiv2 read components without looking whether they are there, and throw.
  try {
    std::string text = trimmed(found->second->print(&data_));
    return text.empty() ? std::nullopt : std::optional(std::move(text));
  } catch (const std::exception&) {
    return std::nullopt;
  }
}

std::vector<std::uint8_t> ExifTags::structure(std::string_view group, std::size_t unit_bytes) const {
  const auto order = maker_note_is_big_endian() ? Exiv2::bigEndian : Exiv2::littleEndian;
  std::map<std::size_t, std::vector<std::uint8_t>> parts;
  for (const Exiv2::Exifdatum& datum : data_) {
    if (datum.groupName() == group && datum.count() > 0) {
      parts.emplace(datum.tag() * unit_bytes, copied_bytes(datum.value(), order));
    }
  }
  std::vector<std::uint8_t> whole;
  for (const auto& [offset, bytes] : parts) {
    if (offset > whole.size()) break;
    if (offset < whole.size()) continue;
    whole.insert(whole.end(), bytes.begin(), bytes.end());
  }
  return whole;
}

bool ExifTags::maker_note_is_big_endian() const {
  return text("Exif.MakerNote.ByteOrder") == "MM";
}

std::vector<std::uint8_t> ExifTags::bytes(std::string_view key) const {
  const Exiv2::Value* value = find(key);
  return value == nullptr ? std::vector<std::uint8_t>{} : copied_bytes(*value);
}

}  // namespace focusfall
