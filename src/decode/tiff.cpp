// TIFF through libtiff: grey, palette and RGB of 8 or 16 bits, strips and tiles, planes together or apart.
#include <fmt/core.h>
#include <tiffio.h>

#include <algorithm>
#include <cstdarg>
#include <cstdio>
#include <cstring>
#include <memory>
#include <utility>

#include "src/decode/codec.h"
#include "src/decode/icc.h"

namespace focusfall {
namespace {

constexpr int kStripRows = 16;
// One strip or tile may not take more memory than the largest picture of three 16-bit channels.
constexpr tmsize_t kMostBlockBytes = tmsize_t{kMaxPicturePixels} * 6;
// No coding that libtiff reads shrinks data by more: deflate 1032 to 1, LZW and the others less; squared for files
// whose strips share bytes is not allowed for.
constexpr std::int64_t kMostShrinking = 1100;

// The file as libtiff reads it, and what it complained about.
struct TiffSource {
  std::span<const std::byte> file;
  toff_t position = 0;
  bool input_ended = false;
  int remarks = 0;
  std::string message;
};

TiffSource& source_of(thandle_t handle) { return *static_cast<TiffSource*>(handle); }

tmsize_t read_bytes(thandle_t handle, void* target, tmsize_t count) {
  TiffSource& source = source_of(handle);
  const auto size = static_cast<toff_t>(source.file.size());
  const toff_t left = source.position < size ? size - source.position : 0;
  const toff_t got = std::min<toff_t>(left, static_cast<toff_t>(count));
  if (got < static_cast<toff_t>(count)) source.input_ended = true;
  if (got > 0) std::memcpy(target, source.file.data() + source.position, got);
  source.position += got;
  return static_cast<tmsize_t>(got);
}

tmsize_t refuse_write(thandle_t, void*, tmsize_t) { return 0; }

toff_t seek(thandle_t handle, toff_t offset, int whence) {
  TiffSource& source = source_of(handle);
  if (whence == SEEK_CUR) offset += source.position;
  if (whence == SEEK_END) offset += source.file.size();
  if (offset > source.file.size()) source.input_ended = true;
  return source.position = offset;
}

int keep_open(thandle_t) { return 0; }
toff_t size_of(thandle_t handle) { return source_of(handle).file.size(); }

// The first complaint is the cause; those after it follow from it.
int on_error(TIFF*, void* user, const char*, const char* format, va_list arguments) {
  auto& source = *static_cast<TiffSource*>(user);
  if (!source.message.empty()) return 1;
  char text[256];
  std::vsnprintf(text, sizeof text, format, arguments);
  source.message = text;
  return 1;
}

int on_warning(TIFF*, void* user, const char*, const char*, va_list) {
  ++static_cast<TiffSource*>(user)->remarks;
  return 1;
}

struct CloseTiff {
  void operator()(TIFF* tiff) const { TIFFClose(tiff); }
};
using Tiff = std::unique_ptr<TIFF, CloseTiff>;

struct Layout {
  std::uint32_t width = 0, height = 0;
  std::uint16_t bits = 1, samples = 1, photometric = 0, planes = PLANARCONFIG_CONTIG, sample_format = SAMPLEFORMAT_UINT;
  std::uint16_t compression = COMPRESSION_NONE;
  bool tiled = false;
  int colours() const { return photometric <= PHOTOMETRIC_MINISBLACK || photometric == PHOTOMETRIC_PALETTE ? 1 : 3; }
  int type(int channels) const { return CV_MAKETYPE(bits == 16 ? CV_16U : CV_8U, channels); }
};

struct Opened {
  Tiff tiff;
  Layout layout;
  PictureFormat format;
};

Tiff open_directory(TiffSource& source) {
  const std::unique_ptr<TIFFOpenOptions, decltype(&TIFFOpenOptionsFree)> options(TIFFOpenOptionsAlloc(), &TIFFOpenOptionsFree);
  TIFFOpenOptionsSetMaxSingleMemAlloc(options.get(), kMostBlockBytes);
  TIFFOpenOptionsSetErrorHandlerExtR(options.get(), on_error, &source);
  TIFFOpenOptionsSetWarningHandlerExtR(options.get(), on_warning, &source);
  // m: no memory mapping; the strips are not chopped, so that their number is that of the file.
  return Tiff(TIFFClientOpenExt("TIFF", "rmc", &source, read_bytes, refuse_write, seek, keep_open, size_of, nullptr,
                                nullptr, options.get()));
}

Layout layout_of(TIFF* tiff) {
  Layout layout;
  TIFFGetField(tiff, TIFFTAG_IMAGEWIDTH, &layout.width);
  TIFFGetField(tiff, TIFFTAG_IMAGELENGTH, &layout.height);
  TIFFGetFieldDefaulted(tiff, TIFFTAG_BITSPERSAMPLE, &layout.bits);
  TIFFGetFieldDefaulted(tiff, TIFFTAG_SAMPLESPERPIXEL, &layout.samples);
  TIFFGetFieldDefaulted(tiff, TIFFTAG_PLANARCONFIG, &layout.planes);
  TIFFGetFieldDefaulted(tiff, TIFFTAG_SAMPLEFORMAT, &layout.sample_format);
  TIFFGetFieldDefaulted(tiff, TIFFTAG_COMPRESSION, &layout.compression);
  if (TIFFGetField(tiff, TIFFTAG_PHOTOMETRIC, &layout.photometric) != 1) {
    layout.photometric = layout.samples >= 3 ? PHOTOMETRIC_RGB : PHOTOMETRIC_MINISBLACK;
  }
  layout.tiled = TIFFIsTiled(tiff) != 0;
  return layout;
}

DecodeError unsupported(const std::string& seen) {
  return {"picture-unsupported", fmt::format("a TIFF {}; expected grey, palette or RGB of 8 or 16 bits a channel", seen)};
}

std::optional<DecodeError> variety_error(TIFF* tiff, Layout& layout) {
  if (layout.sample_format == SAMPLEFORMAT_IEEEFP || layout.sample_format == SAMPLEFORMAT_COMPLEXIEEEFP) {
    return unsupported(fmt::format("of {}-bit floating point numbers", layout.bits));
  }
  if (layout.sample_format != SAMPLEFORMAT_UINT && layout.sample_format != SAMPLEFORMAT_VOID) {
    return unsupported("of signed or complex numbers");
  }
  if (layout.photometric == PHOTOMETRIC_SEPARATED) return unsupported("of printing inks (CMYK)");
  if (layout.photometric == PHOTOMETRIC_YCBCR && layout.compression == COMPRESSION_JPEG && layout.samples == 3) {
    TIFFSetField(tiff, TIFFTAG_JPEGCOLORMODE, JPEGCOLORMODE_RGB);
    layout.photometric = PHOTOMETRIC_RGB;
  }
  if (layout.photometric > PHOTOMETRIC_PALETTE) return unsupported(fmt::format("of colour model {}", layout.photometric));
  if (layout.bits != 8 && layout.bits != 16) return unsupported(fmt::format("of {} bits a channel", layout.bits));
  if (layout.photometric == PHOTOMETRIC_PALETTE && layout.bits != 8) return unsupported("with a palette of 65536 colours");
  if (layout.samples < layout.colours() || layout.samples > layout.colours() + 4) {
    return unsupported(fmt::format("of {} channels", layout.samples));
  }
  if (TIFFIsCODECConfigured(layout.compression) == 0) {
    return unsupported(fmt::format("of compression {}", layout.compression));
  }
  return std::nullopt;
}

// The blocks as declared have to be small enough for the file that holds them; only then is memory taken.
std::optional<DecodeError> block_error(TIFF* tiff, const Layout& layout, const TiffSource& source) {
  const auto needed = static_cast<std::int64_t>(layout.width) * layout.height * layout.samples * (layout.bits / 8);
  if (static_cast<std::int64_t>(source.file.size()) * kMostShrinking < needed) {
    return DecodeError{"picture-truncated",
        fmt::format("the TIFF declares {} x {} pixels and is {} bytes long, too short to hold them; expected a whole "
                    "file", layout.width, layout.height, source.file.size())};
  }
  const tmsize_t block = layout.tiled ? TIFFTileSize(tiff) : TIFFStripSize(tiff);
  if (block <= 0 || block > kMostBlockBytes) {
    return DecodeError{"picture-damaged", fmt::format("the TIFF declares blocks of {} bytes; expected between 1 and {}",
                                                      block, kMostBlockBytes)};
  }
  return std::nullopt;
}

bool holds_another_picture(TIFF* tiff) {
  if (TIFFLastDirectory(tiff) != 0 || TIFFReadDirectory(tiff) == 0) return false;
  std::uint32_t kind = 0;
  TIFFGetFieldDefaulted(tiff, TIFFTAG_SUBFILETYPE, &kind);
  return (kind & (FILETYPE_REDUCEDIMAGE | FILETYPE_MASK)) == 0;
}

void add_notes(TIFF* tiff, const Layout& layout, PictureFormat& format) {
  std::uint32_t length = 0;
  void* profile = nullptr;
  if (TIFFGetField(tiff, TIFFTAG_ICCPROFILE, &length, &profile) == 1) {
    apply_profile({static_cast<const std::byte*>(profile), length}, format);
  }
  std::uint16_t extra = 0;
  std::uint16_t* kinds = nullptr;
  TIFFGetFieldDefaulted(tiff, TIFFTAG_EXTRASAMPLES, &extra, &kinds);
  if (layout.samples > layout.colours()) {
    format.notes.push_back({"alpha-dropped", fmt::format("the TIFF holds {} channels beside its colours, which were "
                                                         "left out", layout.samples - layout.colours())});
  }
}

Decoded<Opened> open(TiffSource& source) {
  Opened opened{open_directory(source), {}, {}};
  TIFF* tiff = opened.tiff.get();
  if (tiff == nullptr) {
    if (source.input_ended) return tl::unexpected(DecodeError{"picture-truncated", "the TIFF ends before its directory; expected a whole file"});
    if (source.message.find("size is zero") != std::string::npos) {   // libtiff looks before layout_of() can
      return tl::unexpected(DecodeError{"picture-empty", "the TIFF declares no pixels; expected a picture"});
    }
    return tl::unexpected(DecodeError{"picture-damaged", fmt::format("the TIFF cannot be decoded ({}); expected an undamaged file", source.message)});
  }
  Layout& layout = opened.layout = layout_of(tiff);
  if (auto error = size_error("TIFF", layout.width, layout.height)) return tl::unexpected(*std::move(error));
  if (auto error = variety_error(tiff, layout)) return tl::unexpected(*std::move(error));
  if (auto error = block_error(tiff, layout, source)) return tl::unexpected(*std::move(error));
  const bool palette = layout.photometric == PHOTOMETRIC_PALETTE;
  opened.format = {.width_px = static_cast<int>(layout.width),
                   .height_px = static_cast<int>(layout.height),
                   .bits = layout.bits,
                   .channels = palette ? 3 : layout.colours(),
                   .kind = "TIFF",
                   .remarks = source.remarks};
  add_notes(tiff, layout, opened.format);
  if (holds_another_picture(tiff)) {
    opened.format.notes.push_back({"more-pictures", "the TIFF holds several pictures: the first was read"});
  }
  if (TIFFSetDirectory(tiff, 0) == 0) {
    return tl::unexpected(DecodeError{"picture-damaged", "the first directory of the TIFF cannot be read again"});
  }
  if (layout.photometric == PHOTOMETRIC_RGB && layout.compression == COMPRESSION_JPEG) {
    TIFFSetField(tiff, TIFFTAG_JPEGCOLORMODE, JPEGCOLORMODE_RGB);
  }
  source.message.clear();
  source.input_ended = false;
  return opened;
}

// Reads bands of whole block rows and turns them into strips.
class TiffReader {
 public:
  TiffReader(Opened& opened, TiffSource& source, StripSink& sink, DecodeWorkspace& workspace)
      : tiff_(opened.tiff.get()), layout_(opened.layout), format_(opened.format), source_(source), sink_(sink),
        pixels_(workspace.strip) {
    apart_ = layout_.planes == PLANARCONFIG_SEPARATE && layout_.samples > 1;
    if (layout_.photometric == PHOTOMETRIC_PALETTE) read_palette();
  }

  std::optional<DecodeError> run() {
    const int height = format_.height_px;
    std::uint32_t rows = kStripRows;
    // Lines come one after the other out of strips; tiles and separate planes take a row of blocks.
    if (layout_.tiled) TIFFGetField(tiff_, TIFFTAG_TILELENGTH, &rows);
    if (!layout_.tiled && apart_) TIFFGetFieldDefaulted(tiff_, TIFFTAG_ROWSPERSTRIP, &rows);
    const int band_rows = static_cast<int>(std::min<std::uint32_t>(std::max(rows, 1U), layout_.height));
    const int samples = layout_.samples;
    band_.create(band_rows, format_.width_px, layout_.type(samples));
    for (int first = 0; first < height; first += band_rows) {
      const int count = std::min(band_rows, height - first);
      const int done = layout_.tiled ? read_tiles(first, count) : apart_ ? read_planes(first, count) : read_lines(first, count);
      for (int row = 0; row < done; row += kStripRows) deliver(first + row, row, std::min(kStripRows, done - row));
      if (done < count) return row_error(first + done);
    }
    return std::nullopt;
  }

 private:
  DecodeError row_error(int row) const {
    if (source_.input_ended) {
      return {"picture-truncated", fmt::format("the TIFF data end at row {} of {}; expected a whole file", row, format_.height_px)};
    }
    return {"picture-damaged", fmt::format("the TIFF data are damaged from row {} of {} on ({}); expected an undamaged file",
                                           row, format_.height_px, source_.message)};
  }

  void read_palette() {
    std::uint16_t* maps[3] = {};
    if (TIFFGetField(tiff_, TIFFTAG_COLORMAP, &maps[0], &maps[1], &maps[2]) != 1) return;
    // Old writers stored 8-bit values in the 16-bit map (libtiff's own tools check for it in this way).
    bool wide = false;
    for (const auto* map : maps) wide = wide || std::any_of(map, map + 256, [](auto value) { return value > 255; });
    for (int i = 0; i < 256; ++i) {
      for (int c = 0; c < 3; ++c) palette_[i][c] = static_cast<std::uint8_t>(wide ? maps[c][i] >> 8 : maps[c][i]);
    }
  }

  int read_lines(int first, int count) {
    for (int row = 0; row < count; ++row) {
      if (TIFFReadScanline(tiff_, band_.ptr(row), static_cast<std::uint32_t>(first + row), 0) != 1) return row;
    }
    return count;
  }

  // Separate planes: the strip of every channel that covers these rows.
  int read_planes(int first, int count) {
    block_.create(band_.rows, format_.width_px, layout_.type(1));
    const auto bytes = static_cast<tmsize_t>(block_.elemSize() * static_cast<std::size_t>(count) * layout_.width);
    for (int sample = 0; sample < layout_.samples; ++sample) {
      const auto strip = TIFFComputeStrip(tiff_, static_cast<std::uint32_t>(first), static_cast<std::uint16_t>(sample));
      if (TIFFReadEncodedStrip(tiff_, strip, block_.data, bytes) != bytes) return 0;
      cv::insertChannel(block_.rowRange(0, count), band_.rowRange(0, count), sample);
    }
    return count;
  }

  int read_tiles(int first, int count) {
    std::uint32_t width = 0, rows = 0;
    TIFFGetField(tiff_, TIFFTAG_TILEWIDTH, &width);
    TIFFGetField(tiff_, TIFFTAG_TILELENGTH, &rows);
    block_.create(static_cast<int>(rows), static_cast<int>(width), layout_.type(apart_ ? 1 : layout_.samples));
    const tmsize_t bytes = TIFFTileSize(tiff_);
    if (static_cast<std::size_t>(bytes) != block_.total() * block_.elemSize()) return 0;
    for (int sample = 0; sample < (apart_ ? layout_.samples : 1); ++sample) {
      for (int x = 0; x < format_.width_px; x += block_.cols) {
        const auto tile = TIFFComputeTile(tiff_, static_cast<std::uint32_t>(x), static_cast<std::uint32_t>(first), 0,
                                          static_cast<std::uint16_t>(sample));
        if (TIFFReadEncodedTile(tiff_, tile, block_.data, bytes) != bytes) return 0;
        const int used = std::min(block_.cols, format_.width_px - x);
        const cv::Mat from = block_(cv::Rect(0, 0, used, count));
        cv::Mat to = band_(cv::Rect(x, 0, used, count));
        if (apart_) {
          cv::insertChannel(from, to, sample);
        } else {
          from.copyTo(to);
        }
      }
    }
    return count;
  }

  void deliver(int row, int band_row, int count) {
    const cv::Mat rows = band_.rowRange(band_row, band_row + count);
    const bool palette = layout_.photometric == PHOTOMETRIC_PALETTE;
    if (!palette && layout_.photometric != PHOTOMETRIC_MINISWHITE && layout_.samples == layout_.colours()) {
      sink_.take(RgbStrip{row, rows});
      return;
    }
    pixels_.create(count, format_.width_px, layout_.type(format_.channels));
    if (palette) {
      expand(rows);
    } else if (layout_.colours() == 1) {
      cv::extractChannel(rows, pixels_, 0);
    } else {
      const int pairs[] = {0, 0, 1, 1, 2, 2};
      cv::mixChannels(&rows, 1, &pixels_, 1, pairs, 3);
    }
    if (layout_.photometric == PHOTOMETRIC_MINISWHITE) cv::bitwise_not(pixels_, pixels_);
    sink_.take(RgbStrip{row, pixels_});
  }

  void expand(const cv::Mat& rows) {
    for (int row = 0; row < rows.rows; ++row) {
      const std::uint8_t* codes = rows.ptr(row);
      std::uint8_t* target = pixels_.ptr(row);
      for (int x = 0; x < rows.cols; ++x, target += 3) std::copy_n(palette_[codes[x * layout_.samples]], 3, target);
    }
  }

  TIFF* tiff_;
  const Layout& layout_;
  const PictureFormat& format_;
  TiffSource& source_;
  StripSink& sink_;
  cv::Mat& pixels_;
  cv::Mat band_, block_;
  bool apart_ = false;
  std::uint8_t palette_[256][3] = {};
};

Decoded<PictureFormat> tiff_format(std::span<const std::byte> file, DecodeWorkspace&) {
  TiffSource source{file, 0, false, 0, {}};
  return open(source).map([](Opened&& opened) { return std::move(opened.format); });
}

Decoded<PictureFormat> decode_tiff(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace) {
  TiffSource source{file, 0, false, 0, {}};
  auto opened = open(source);
  if (!opened) return tl::unexpected(opened.error());
  sink.start(opened->format);
  TiffReader reader(*opened, source, sink, workspace);
  if (auto failed = reader.run()) return tl::unexpected(*std::move(failed));
  opened->format.remarks = source.remarks;
  return std::move(opened->format);
}

bool is_tiff(std::span<const std::byte> file) {
  using namespace std::string_view_literals;
  return has_bytes(file, 0, "II*\0"sv) || has_bytes(file, 0, "MM\0*"sv) || has_bytes(file, 0, "II+\0"sv) ||
         has_bytes(file, 0, "MM\0+"sv);
}

}  // namespace

const Codec kTiffCodec = {"TIFF", is_tiff, tiff_format, decode_tiff};

}  // namespace focusfall
