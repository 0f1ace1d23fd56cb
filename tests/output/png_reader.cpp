#include "tests/output/png_reader.h"

#include <png.h>

#include <cstring>
#include <stdexcept>
#include <vector>

namespace focusfall {
namespace {

struct Source {
  const std::string* bytes;
  std::size_t at = 0;
};

void take(png_structp png, png_bytep target, png_size_t length) {
  auto* source = static_cast<Source*>(png_get_io_ptr(png));
  if (source->at + length > source->bytes->size()) png_error(png, "too short");
  std::memcpy(target, source->bytes->data() + source->at, length);
  source->at += length;
}

void fail(png_structp /*png*/, png_const_charp message) { throw std::runtime_error(message); }

}  // namespace

ReadPng read_png(const std::string& bytes) {
  // Warnings are errors here: a wrong CRC of a text chunk is only a warning to libpng.
  png_structp png = png_create_read_struct(PNG_LIBPNG_VER_STRING, nullptr, fail, fail);
  png_infop info = png_create_info_struct(png);
  Source source{&bytes};
  png_set_read_fn(png, &source, take);
  png_read_png(png, info, PNG_TRANSFORM_EXPAND | PNG_TRANSFORM_STRIP_ALPHA | PNG_TRANSFORM_STRIP_16, nullptr);
  const auto width = static_cast<int>(png_get_image_width(png, info));
  const auto height = static_cast<int>(png_get_image_height(png, info));
  const int channels = png_get_channels(png, info);
  ReadPng result;
  result.grey.create(height, width, CV_8UC1);
  const auto rows = png_get_rows(png, info);
  for (int y = 0; y < height; ++y) {
    for (int x = 0; x < width; ++x) {
      const png_bytep pixel = rows[y] + x * channels;
      result.grey.at<unsigned char>(y, x) = pixel[0];
      for (int i = 1; i < channels; ++i) result.is_grey &= pixel[i] == pixel[0];
    }
  }
  png_textp texts = nullptr;
  const int count = png_get_text(png, info, &texts, nullptr);
  for (int i = 0; i < count; ++i) result.texts[texts[i].key] = std::string(texts[i].text, texts[i].text_length);
  png_destroy_read_struct(&png, &info, nullptr);
  return result;
}

}  // namespace focusfall
