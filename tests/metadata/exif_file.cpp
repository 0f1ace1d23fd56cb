#include "tests/metadata/exif_file.h"

#include <algorithm>
#include <stdexcept>

namespace focusfall {
namespace {

void append_segment(std::vector<std::byte>& jpeg, std::uint8_t marker, const std::string& payload) {
  const std::size_t length = payload.size() + 2;
  if (length > 0xFFFF) throw std::length_error("a JPEG segment holds at most 65533 bytes");
  for (const std::size_t byte : {std::size_t{0xFF}, std::size_t{marker}, length >> 8, length & 0xFF}) {
    jpeg.push_back(static_cast<std::byte>(byte));
  }
  for (const char c : payload) jpeg.push_back(static_cast<std::byte>(c));
}

}  // namespace

ExifFile& ExifFile::set(const std::string& key, const std::string& text) {
  exif[key] = text;
  return *this;
}

ExifFile& ExifFile::set(const std::string& key, Exiv2::TypeId type, const std::string& text) {
  auto value = Exiv2::Value::create(type);
  if (value->read(text) != 0) throw std::invalid_argument("not a value of this type: " + text);
  exif[key].setValue(value.get());
  return *this;
}

ExifFile& ExifFile::set_bytes(const std::string& key, const std::vector<std::uint8_t>& bytes) {
  Exiv2::DataValue value(bytes.data(), static_cast<long>(bytes.size()));
  exif[key].setValue(&value);
  return *this;
}

std::vector<std::byte> jpeg_around(const std::vector<std::uint8_t>& tiff, const std::string& xmp) {
  std::vector<std::byte> jpeg = {std::byte{0xFF}, std::byte{0xD8}};
  if (!tiff.empty()) {
    append_segment(jpeg, 0xE1, std::string("Exif\0\0", 6) + std::string(tiff.begin(), tiff.end()));
  }
  if (!xmp.empty()) append_segment(jpeg, 0xE1, std::string("http://ns.adobe.com/xap/1.0/\0", 29) + xmp);
  append_segment(jpeg, 0xC0, std::string("\x08\0\x01\0\x01\x01\x01\x11\0", 9));
  append_segment(jpeg, 0xDA, std::string("\x01\x01\0\0\x3F\0", 6));
  for (const int byte : {0x00, 0xFF, 0xD9}) jpeg.push_back(static_cast<std::byte>(byte));
  return jpeg;
}

std::vector<std::byte> ExifFile::jpeg(Exiv2::ByteOrder order) const {
  Exiv2::Blob blob;
  Exiv2::ExifParser::encode(blob, order, exif);
  return jpeg_around({blob.begin(), blob.end()}, xmp);
}

CaptureReading ExifFile::read(Exiv2::ByteOrder order) const {
  return read_capture(jpeg(order), decoded);
}

bool has_remark(const CaptureReading& reading, const std::string& code) {
  return std::ranges::any_of(reading.remarks, [&](const CaptureRemark& remark) { return remark.code == code; });
}

namespace {
// Exiv2 wants its XMP parser set up once, before threads start.
const bool initialised = (initialise_capture_reading(), true);
}  // namespace

}  // namespace focusfall
