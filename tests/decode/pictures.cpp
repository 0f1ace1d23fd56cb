#include "tests/decode/pictures.h"

#include <jpeglib.h>
#include <lcms2.h>
#include <png.h>
#include <tiffio.h>

#include <algorithm>
#include <bit>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <stdexcept>

namespace focusfall::test {
namespace {

Bytes bytes_of(const std::string& text) {
  const auto* data = reinterpret_cast<const std::byte*>(text.data());
  return {data, data + text.size()};
}

void append(png_structp png, png_bytep data, std::size_t size) {
  auto& file = *static_cast<Bytes*>(png_get_io_ptr(png));
  file.insert(file.end(), reinterpret_cast<const std::byte*>(data), reinterpret_cast<const std::byte*>(data) + size);
}

void flush(png_structp) {}

int png_colour_type(int channels) {
  constexpr int kTypes[] = {PNG_COLOR_TYPE_GRAY, PNG_COLOR_TYPE_GRAY_ALPHA, PNG_COLOR_TYPE_RGB, PNG_COLOR_TYPE_RGB_ALPHA};
  return kTypes[channels - 1];
}

template <class SetUp>
Bytes write_png(const cv::Mat& picture, bool swap, SetUp set_up) {
  Bytes file;
  png_structp png = png_create_write_struct(PNG_LIBPNG_VER_STRING, nullptr, nullptr, nullptr);
  png_infop info = png_create_info_struct(png);
  png_set_write_fn(png, &file, append, flush);
  set_up(png, info);
  png_write_info(png, info);
  if (swap && std::endian::native == std::endian::little) png_set_swap(png);
  std::vector<png_bytep> rows;
  for (int row = 0; row < picture.rows; ++row) rows.push_back(const_cast<png_bytep>(picture.ptr(row)));
  png_write_image(png, rows.data());
  png_write_end(png, info);
  png_destroy_write_struct(&png, &info);
  return file;
}

}  // namespace

cv::Mat drawn_picture(int width, int height, int type) {
  const int channels = CV_MAT_CN(type);
  const bool wide = CV_MAT_DEPTH(type) == CV_16U;
  const int most = wide ? 65535 : 255;
  cv::Mat picture(height, width, type);
  for (int y = 0; y < height; ++y) {
    for (int x = 0; x < width; ++x) {
      for (int c = 0; c < channels; ++c) {
        const double slope = c == 0 ? static_cast<double>(x) / std::max(width - 1, 1)
                             : c == 1 ? static_cast<double>(y) / std::max(height - 1, 1)
                                      : static_cast<double>(x + y) / std::max(width + height - 2, 1);
        const bool inside = (x / 32 + y / 32) % 2 == 0;
        const int code = static_cast<int>((inside ? slope : 1 - slope) * most + 0.5);
        if (wide) {
          picture.ptr<std::uint16_t>(y)[x * channels + c] = static_cast<std::uint16_t>(code);
        } else {
          picture.ptr<std::uint8_t>(y)[x * channels + c] = static_cast<std::uint8_t>(code);
        }
      }
    }
  }
  return picture;
}

Bytes png_of(const cv::Mat& picture, const PngOptions& options) {
  const bool wide = picture.depth() == CV_16U;
  return write_png(picture, wide, [&](png_structp png, png_infop info) {
    png_set_IHDR(png, info, static_cast<png_uint_32>(picture.cols), static_cast<png_uint_32>(picture.rows), wide ? 16 : 8,
                 png_colour_type(picture.channels()), options.interlaced ? PNG_INTERLACE_ADAM7 : PNG_INTERLACE_NONE,
                 PNG_COMPRESSION_TYPE_DEFAULT, PNG_FILTER_TYPE_DEFAULT);
    if (options.gamma > 0) png_set_gAMA(png, info, options.gamma);
    if (!options.profile.empty()) {
      png_set_iCCP(png, info, "profile", PNG_COMPRESSION_TYPE_BASE, reinterpret_cast<png_const_bytep>(options.profile.data()),
                   static_cast<png_uint_32>(options.profile.size()));
    }
  });
}

Bytes palette_png(const cv::Mat& indices, const std::vector<cv::Vec3b>& palette) {
  std::vector<png_color> colours;
  for (const cv::Vec3b& colour : palette) colours.push_back({colour[0], colour[1], colour[2]});
  return write_png(indices, false, [&](png_structp png, png_infop info) {
    png_set_IHDR(png, info, static_cast<png_uint_32>(indices.cols), static_cast<png_uint_32>(indices.rows), 8,
                 PNG_COLOR_TYPE_PALETTE, PNG_INTERLACE_NONE, PNG_COMPRESSION_TYPE_DEFAULT, PNG_FILTER_TYPE_DEFAULT);
    png_set_PLTE(png, info, colours.data(), static_cast<int>(colours.size()));
  });
}

// libtiff reads its own directories again while it writes: it wants a file, which is gone as soon as it is read.
Bytes tiff_in_memory(const std::function<void(void*)>& write) {
  std::string name = (std::filesystem::temp_directory_path() / "focusfall-XXXXXX").string();
  const int descriptor = mkstemp(name.data());
  TIFF* tiff = descriptor < 0 ? nullptr : TIFFFdOpen(descriptor, name.c_str(), "w");
  if (tiff == nullptr) throw std::runtime_error("libtiff opens no file");
  write(tiff);
  TIFFClose(tiff);
  std::ifstream stream(name, std::ios::binary);
  const std::string text((std::istreambuf_iterator<char>(stream)), {});
  std::filesystem::remove(name);
  return bytes_of(text);
}

Bytes tiff_of(const cv::Mat& picture, const TiffOptions& options) {
  return tiff_in_memory([&](void* handle) {
    TIFF* tiff = static_cast<TIFF*>(handle);
    const int channels = picture.channels();
    const int photometric = options.photometric >= 0 ? options.photometric
                            : channels >= 3          ? PHOTOMETRIC_RGB
                                                     : PHOTOMETRIC_MINISBLACK;
    const int colours = photometric == PHOTOMETRIC_SEPARATED ? 4 : photometric == PHOTOMETRIC_RGB ? 3 : 1;
    TIFFSetField(tiff, TIFFTAG_IMAGEWIDTH, picture.cols);
    TIFFSetField(tiff, TIFFTAG_IMAGELENGTH, picture.rows);
    TIFFSetField(tiff, TIFFTAG_SAMPLESPERPIXEL, channels);
    TIFFSetField(tiff, TIFFTAG_BITSPERSAMPLE, static_cast<int>(picture.elemSize1()) * 8);
    TIFFSetField(tiff, TIFFTAG_SAMPLEFORMAT, options.sample_format);
    TIFFSetField(tiff, TIFFTAG_PHOTOMETRIC, photometric);
    TIFFSetField(tiff, TIFFTAG_COMPRESSION, options.compression);
    TIFFSetField(tiff, TIFFTAG_PLANARCONFIG, options.planes_apart ? PLANARCONFIG_SEPARATE : PLANARCONFIG_CONTIG);
    if (channels > colours) {
      const std::vector<std::uint16_t> extra(static_cast<std::size_t>(channels - colours), EXTRASAMPLE_UNASSALPHA);
      TIFFSetField(tiff, TIFFTAG_EXTRASAMPLES, static_cast<int>(extra.size()), extra.data());
    }
    if (photometric == PHOTOMETRIC_PALETTE) {
      std::vector<std::uint16_t> ramp(256), falling(256), flat(256, 0x4242);
      for (int i = 0; i < 256; ++i) {
        ramp[static_cast<std::size_t>(i)] = static_cast<std::uint16_t>(i * 257);
        falling[static_cast<std::size_t>(i)] = static_cast<std::uint16_t>((255 - i) * 257);
      }
      TIFFSetField(tiff, TIFFTAG_COLORMAP, ramp.data(), falling.data(), flat.data());
    }
    if (!options.profile.empty()) {
      TIFFSetField(tiff, TIFFTAG_ICCPROFILE, static_cast<std::uint32_t>(options.profile.size()), options.profile.data());
    }

    std::vector<cv::Mat> planes;
    if (options.planes_apart) {
      cv::split(picture, planes);
    } else {
      planes.push_back(picture);
    }
    if (options.tile_px > 0) {
      TIFFSetField(tiff, TIFFTAG_TILEWIDTH, options.tile_px);
      TIFFSetField(tiff, TIFFTAG_TILELENGTH, options.tile_px);
      for (std::size_t plane = 0; plane < planes.size(); ++plane) {
        for (int y = 0; y < picture.rows; y += options.tile_px) {
          for (int x = 0; x < picture.cols; x += options.tile_px) {
            cv::Mat tile(options.tile_px, options.tile_px, planes[plane].type(), cv::Scalar::all(0));
            const cv::Rect used(x, y, std::min(options.tile_px, picture.cols - x), std::min(options.tile_px, picture.rows - y));
            planes[plane](used).copyTo(tile(cv::Rect(0, 0, used.width, used.height)));
            TIFFWriteTile(tiff, tile.data, static_cast<std::uint32_t>(x), static_cast<std::uint32_t>(y), 0,
                          static_cast<std::uint16_t>(plane));
          }
        }
      }
      return;
    }
    TIFFSetField(tiff, TIFFTAG_ROWSPERSTRIP, options.rows_per_strip);
    for (std::size_t plane = 0; plane < planes.size(); ++plane) {
      for (int y = 0; y < picture.rows; ++y) {
        cv::Mat row = planes[plane].row(y).clone();   // libtiff may change it
        TIFFWriteScanline(tiff, row.data, static_cast<std::uint32_t>(y), static_cast<std::uint16_t>(plane));
      }
    }
  });
}

Bytes jpeg_of(const cv::Mat& picture, const JpegOptions& options) {
  jpeg_compress_struct codec{};
  jpeg_error_mgr errors{};
  codec.err = jpeg_std_error(&errors);
  jpeg_create_compress(&codec);
  unsigned char* data = nullptr;
  unsigned long size = 0;
  jpeg_mem_dest(&codec, &data, &size);
  codec.image_width = static_cast<JDIMENSION>(picture.cols);
  codec.image_height = static_cast<JDIMENSION>(picture.rows);
  codec.input_components = picture.channels();
  codec.in_color_space = options.cmyk ? JCS_CMYK : picture.channels() == 1 ? JCS_GRAYSCALE : JCS_RGB;
  jpeg_set_defaults(&codec);
  jpeg_set_quality(&codec, options.quality, TRUE);
  if (options.progressive) jpeg_simple_progression(&codec);
  codec.comp_info[0].h_samp_factor = options.step_x;
  codec.comp_info[0].v_samp_factor = options.step_y;
  jpeg_start_compress(&codec, TRUE);
  if (!options.profile.empty()) {
    jpeg_write_icc_profile(&codec, reinterpret_cast<const JOCTET*>(options.profile.data()),
                           static_cast<unsigned>(options.profile.size()));
  }
  while (codec.next_scanline < codec.image_height) {
    JSAMPROW row = const_cast<JSAMPROW>(picture.ptr(static_cast<int>(codec.next_scanline)));
    jpeg_write_scanlines(&codec, &row, 1);
  }
  jpeg_finish_compress(&codec);
  jpeg_destroy_compress(&codec);
  const Bytes file(reinterpret_cast<std::byte*>(data), reinterpret_cast<std::byte*>(data) + size);
  std::free(data);
  return file;
}

Bytes gamma_profile(double gamma, bool grey) {
  cmsToneCurve* curve = cmsBuildGamma(nullptr, gamma);
  const cmsCIExyY white = {0.3127, 0.3290, 1};                                            // D65
  const cmsCIExyYTRIPLE primaries = {{0.64, 0.33, 1}, {0.30, 0.60, 1}, {0.15, 0.06, 1}};   // IEC 61966-2-1
  cmsToneCurve* curves[] = {curve, curve, curve};
  cmsHPROFILE profile = grey ? cmsCreateGrayProfile(&white, curve) : cmsCreateRGBProfile(&white, &primaries, curves);
  cmsUInt32Number size = 0;
  cmsSaveProfileToMem(profile, nullptr, &size);
  Bytes bytes(size);
  cmsSaveProfileToMem(profile, bytes.data(), &size);
  cmsCloseProfile(profile);
  cmsFreeToneCurve(curve);
  return bytes;
}

void KeepingSink::start(const PictureFormat& started) {
  ++starts;
  format = started;
}

void KeepingSink::take(const YccStrip& strip) {
  in_order = in_order && strip.first_row == rows;
  rows += strip.y.rows;
  picture.push_back(strip.y);
}

void KeepingSink::take(const RgbStrip& strip) {
  in_order = in_order && strip.first_row == rows;
  rows += strip.rgb.rows;
  picture.push_back(strip.rgb);
}

Read read_picture(const Bytes& file) {
  KeepingSink sink;
  auto result = decode_picture(file, sink);
  return {std::move(sink), std::move(result)};
}

Bytes first_part(const Bytes& file, std::size_t size) {
  return {file.begin(), file.begin() + static_cast<std::ptrdiff_t>(std::min(size, file.size()))};
}

bool has_note(const PictureFormat& format, const std::string& code) {
  return std::any_of(format.notes.begin(), format.notes.end(), [&](const DecodeNote& note) { return note.code == code; });
}

}  // namespace focusfall::test
