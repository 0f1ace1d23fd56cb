#include "src/decode/decoder.h"

#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <cstring>

#include "src/decode/codec.h"
#include "src/decode/jpeg.h"

namespace focusfall {
namespace {

// Asked in this order; the first that recognises the file has it. Many raw files are TIFFs too.
constexpr std::array kCodecs = {&kJpegCodec, &kPngCodec, &kHeifCodec, &kRawCodec, &kTiffCodec};

std::string expected_kinds() {
  std::string kinds;
  for (const Codec* codec : kCodecs) {
    if (!kinds.empty()) kinds += codec == kCodecs.back() ? " or " : ", ";
    kinds += codec->kind;
  }
  return kinds;
}

// What an unknown file begins with, printable.
std::string first_bytes(std::span<const std::byte> file) {
  std::string text;
  for (const std::byte byte : file.first(std::min<std::size_t>(file.size(), 4))) {
    text += fmt::format("{}{:02X}", text.empty() ? "" : " ", std::to_integer<unsigned>(byte));
  }
  return text;
}

Decoded<const Codec*> codec_for(std::span<const std::byte> file) {
  if (file.empty()) {
    return tl::unexpected(DecodeError{"file-empty", fmt::format("the file is empty; expected {}", expected_kinds())});
  }
  const auto found = std::find_if(kCodecs.begin(), kCodecs.end(), [&](const Codec* codec) { return codec->recognises(file); });
  if (found == kCodecs.end()) {
    return tl::unexpected(DecodeError{"not-a-picture", fmt::format("the content (beginning {}) is no picture that is "
                                                                   "read here; expected {}",
                                                                   first_bytes(file), expected_kinds())});
  }
  return *found;
}

}  // namespace

DecodeWorkspace::DecodeWorkspace() = default;
DecodeWorkspace::~DecodeWorkspace() = default;
DecodeWorkspace::DecodeWorkspace(DecodeWorkspace&&) noexcept = default;
DecodeWorkspace& DecodeWorkspace::operator=(DecodeWorkspace&&) noexcept = default;

JpegDecoder& DecodeWorkspace::jpeg() {
  if (!jpeg_) jpeg_ = std::make_unique<JpegDecoder>();
  return *jpeg_;
}

bool has_bytes(std::span<const std::byte> file, std::size_t offset, std::string_view bytes) {
  return offset <= file.size() && bytes.size() <= file.size() - offset &&
         std::memcmp(file.data() + offset, bytes.data(), bytes.size()) == 0;
}

std::optional<DecodeError> size_error(std::string_view kind, std::int64_t width_px, std::int64_t height_px) {
  if (width_px <= 0 || height_px <= 0) {
    return DecodeError{"picture-empty",
                       fmt::format("the {} declares {} x {} pixels; expected a picture", kind, width_px, height_px)};
  }
  if (width_px > kMaxPicturePixels / height_px) {
    return DecodeError{"picture-too-large", fmt::format("the {} declares {} x {} pixels; expected at most {} megapixels",
                                                        kind, width_px, height_px, kMaxPicturePixels / 1'000'000)};
  }
  return std::nullopt;
}

Decoded<PictureFormat> decode_picture(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace) {
  return codec_for(file).and_then([&](const Codec* codec) { return codec->decode(file, sink, workspace); });
}

Decoded<PictureFormat> decode_picture(std::span<const std::byte> file, StripSink& sink) {
  DecodeWorkspace workspace;
  return decode_picture(file, sink, workspace);
}

Decoded<PictureFormat> picture_format(std::span<const std::byte> file, DecodeWorkspace& workspace) {
  return codec_for(file).and_then([&](const Codec* codec) { return codec->format(file, workspace); });
}

Decoded<PictureFormat> picture_format(std::span<const std::byte> file) {
  DecodeWorkspace workspace;
  return picture_format(file, workspace);
}

}  // namespace focusfall
