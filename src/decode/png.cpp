// PNG through libpng: grey or RGB of 8 or 16 bits, row by row where the file is not interlaced.
#include <fmt/core.h>
#include <png.h>

#include <algorithm>
#include <bit>
#include <cstring>
#include <utility>

#include "src/decode/codec.h"
#include "src/decode/icc.h"

namespace focusfall {
namespace {

constexpr int kStripRows = 16;
// Deflate cannot shrink data by more than this factor (zlib's technical notes: 1032 to 1).
constexpr std::int64_t kDeflateMost = 1032;
// Signature, length, "IHDR", then width and height (PNG specification, sections 5.2 and 11.2.1).
constexpr std::size_t kWidthOffset = 16;
constexpr std::size_t kHeaderEnd = 26;

// What libpng calls back into. Plain data: longjmp crosses nothing that has a destructor.
struct PngState {
  png_structp png = nullptr;
  png_infop info = nullptr;
  const png_byte* data = nullptr;
  std::size_t size = 0;
  std::size_t position = 0;
  bool input_ended = false;
  int remarks = 0;
  char message[128] = {};

  ~PngState() { png_destroy_read_struct(&png, &info, nullptr); }
};

void read_bytes(png_structp png, png_bytep target, std::size_t count) {
  auto& state = *static_cast<PngState*>(png_get_io_ptr(png));
  if (count > state.size - state.position) {
    state.input_ended = true;
    png_error(png, "the data end");
  }
  std::memcpy(target, state.data + state.position, count);
  state.position += count;
}

[[noreturn]] void fail(png_structp png, png_const_charp message) {
  auto& state = *static_cast<PngState*>(png_get_error_ptr(png));
  std::strncpy(state.message, message, sizeof state.message - 1);
  png_longjmp(png, 1);
}

void remark(png_structp png, png_const_charp) { ++static_cast<PngState*>(png_get_error_ptr(png))->remarks; }

// Runs calls of libpng; false where it gave up. `step` must own nothing.
template <class Step>
bool guarded(PngState& state, Step step) {
  if (setjmp(png_jmpbuf(state.png)) != 0) return false;
  step();
  return true;
}

std::int64_t big_endian(std::span<const std::byte> file, std::size_t offset) {
  std::int64_t value = 0;
  for (std::size_t i = 0; i < 4; ++i) value = value * 256 + std::to_integer<int>(file[offset + i]);
  return value;
}

DecodeError header_error(const PngState& state) {
  if (state.input_ended) return {"picture-truncated", "the PNG ends inside its header; expected a whole file"};
  return {"picture-damaged", fmt::format("the PNG cannot be decoded ({}); expected an undamaged file", state.message)};
}

DecodeError row_error(const PngState& state, int row, int rows) {
  if (state.input_ended) {
    return {"picture-truncated", fmt::format("the PNG data end at row {} of {}; expected a whole file", row, rows)};
  }
  return {"picture-damaged", fmt::format("the PNG data are damaged from row {} of {} on ({}); expected an undamaged "
                                         "file", row, rows, state.message)};
}

// Looks at the first chunk alone: nothing is allocated for a size that is refused.
std::optional<DecodeError> refusal(std::span<const std::byte> file) {
  if (file.size() < kHeaderEnd) {
    return DecodeError{"picture-truncated", "the PNG ends inside its header; expected a whole file"};
  }
  const std::int64_t width = big_endian(file, kWidthOffset), height = big_endian(file, kWidthOffset + 4);
  if (auto refused = size_error("PNG", width, height)) return refused;
  const std::int64_t depth = std::to_integer<int>(file[kWidthOffset + 8]);
  if (static_cast<std::int64_t>(file.size()) * kDeflateMost < height * ((width * depth + 7) / 8)) {
    return DecodeError{"picture-truncated",
        fmt::format("the PNG declares {} x {} pixels and is {} bytes long, too short to hold them; expected a whole "
                    "file", width, height, file.size())};
  }
  return std::nullopt;
}

// Everything becomes grey or RGB of 8 or 16 bits in the machine's own byte order.
void set_transforms(PngState& state) {
  const auto type = png_get_color_type(state.png, state.info);
  const auto depth = png_get_bit_depth(state.png, state.info);
  if (type == PNG_COLOR_TYPE_PALETTE) png_set_palette_to_rgb(state.png);
  if (type == PNG_COLOR_TYPE_GRAY && depth < 8) png_set_expand_gray_1_2_4_to_8(state.png);
  if ((type & PNG_COLOR_MASK_ALPHA) != 0) png_set_strip_alpha(state.png);
  if (depth == 16 && std::endian::native == std::endian::little) png_set_swap(state.png);
  png_set_interlace_handling(state.png);
  png_read_update_info(state.png, state.info);
}

void read_colour(const PngState& state, PictureFormat& format) {
  png_charp name = nullptr;
  png_bytep profile = nullptr;
  png_uint_32 length = 0;
  int method = 0, intent = 0;
  double gamma = 0;
  if (png_get_iCCP(state.png, state.info, &name, &method, &profile, &length) != 0) {
    apply_profile({reinterpret_cast<const std::byte*>(profile), length}, format);
  } else if (png_get_sRGB(state.png, state.info, &intent) == 0 && png_get_gAMA(state.png, state.info, &gamma) != 0 &&
             gamma > 0.1 && gamma < 10) {
    format.linear_of_code = power_curve(1 / gamma, format.bits == 16 ? 65536 : 256);
    format.notes.push_back({"gamma-stated", fmt::format("the PNG states a gamma of {:.4g}: its codes were linearised "
                                                        "with the power {:.4g}", gamma, 1 / gamma)});
  }
}

Decoded<PictureFormat> open(std::span<const std::byte> file, PngState& state) {
  if (auto refused = refusal(file)) return tl::unexpected(*std::move(refused));
  state.data = reinterpret_cast<const png_byte*>(file.data());
  state.size = file.size();
  state.png = png_create_read_struct(PNG_LIBPNG_VER_STRING, &state, fail, remark);
  if (state.png == nullptr) throw std::bad_alloc();
  bool alpha = false;
  const bool read = guarded(state, [&] {
    state.info = png_create_info_struct(state.png);
    png_set_user_limits(state.png, PNG_UINT_31_MAX, PNG_UINT_31_MAX);   // size_error has the say
    png_set_read_fn(state.png, &state, read_bytes);
    png_read_info(state.png, state.info);
    alpha = (png_get_color_type(state.png, state.info) & PNG_COLOR_MASK_ALPHA) != 0 ||
            png_get_valid(state.png, state.info, PNG_INFO_tRNS) != 0;
    set_transforms(state);
  });
  if (!read) return tl::unexpected(header_error(state));

  PictureFormat format{.width_px = static_cast<int>(png_get_image_width(state.png, state.info)),
                       .height_px = static_cast<int>(png_get_image_height(state.png, state.info)),
                       .bits = png_get_bit_depth(state.png, state.info),
                       .channels = png_get_channels(state.png, state.info),
                       .kind = "PNG",
                       .remarks = state.remarks};
  read_colour(state, format);
  if (alpha) format.notes.push_back({"alpha-dropped", "the PNG holds transparency, which was left out"});
  return format;
}

Decoded<PictureFormat> png_format(std::span<const std::byte> file, DecodeWorkspace&) {
  PngState state;
  return open(file, state);
}

Decoded<PictureFormat> decode_png(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace) {
  PngState state;
  auto format = open(file, state);
  if (!format) return format;
  const int height = format->height_px;
  const bool interlaced = png_get_interlace_type(state.png, state.info) != PNG_INTERLACE_NONE;
  const int band = interlaced ? height : std::min(kStripRows, height);
  cv::Mat& rows = workspace.strip;
  rows.create(band, format->width_px, CV_MAKETYPE(format->bits == 16 ? CV_16U : CV_8U, format->channels));
  sink.start(*format);

  // An interlaced picture is complete with its last pass only.
  if (interlaced) {
    const int passes = 7;
    const bool read = guarded(state, [&] {
      for (int pass = 0; pass < passes; ++pass) {
        for (int row = 0; row < height; ++row) png_read_row(state.png, rows.ptr(row), nullptr);
      }
    });
    if (!read) return tl::unexpected(row_error(state, 0, height));
  }
  for (int first = 0; first < height; first += kStripRows) {
    const int count = std::min(kStripRows, height - first);
    volatile int done = 0;   // read after a longjmp
    const bool read = interlaced || guarded(state, [&] {
      while (done < count) {
        png_read_row(state.png, rows.ptr(done), nullptr);
        done = done + 1;
      }
    });
    const int first_kept = interlaced ? first : 0;
    const int kept = interlaced ? count : done;
    if (kept > 0) sink.take(RgbStrip{first, rows.rowRange(first_kept, first_kept + kept)});
    if (!read) return tl::unexpected(row_error(state, first + kept, height));
  }
  format->remarks = state.remarks;
  return format;
}

bool is_png(std::span<const std::byte> file) { return has_bytes(file, 0, "\x89PNG\r\n\x1A\n"); }

}  // namespace

const Codec kPngCodec = {"PNG", is_png, png_format, decode_png};

}  // namespace focusfall
