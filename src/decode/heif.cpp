// HEIF through libheif: 8 bits as they are, more of them spread over 16. The container's rotation and crop are applied
// by libheif, once: the picture comes upright and Exif's orientation no longer holds.
#include <fmt/core.h>
#include <libheif/heif.h>

#include <algorithm>
#include <cmath>
#include <memory>
#include <utility>

#include "src/decode/codec.h"
#include "src/decode/icc.h"

namespace focusfall {
namespace {

constexpr int kStripRows = 16;

template <auto kRelease>
struct Release {
  template <class T>
  void operator()(T* object) const { kRelease(object); }
};
using Context = std::unique_ptr<heif_context, Release<heif_context_free>>;
using Handle = std::unique_ptr<heif_image_handle, Release<heif_image_handle_release>>;
using Image = std::unique_ptr<heif_image, Release<heif_image_release>>;
using Nclx = std::unique_ptr<heif_color_profile_nclx, Release<heif_nclx_color_profile_free>>;

struct Opened {
  Context context;
  Handle handle;
  PictureFormat format;
};

// ISO/IEC 14496-12, section 4.2: boxes of length, type, content. A file is cut short where the last one reaches
// beyond its end.
bool ends_early(std::span<const std::byte> file) {
  std::uint64_t position = 0;
  const auto number = [&](std::uint64_t at, int bytes) {
    std::uint64_t value = 0;
    for (int i = 0; i < bytes; ++i) value = value << 8 | std::to_integer<std::uint64_t>(file[at + static_cast<std::uint64_t>(i)]);
    return value;
  };
  while (position < file.size()) {
    if (file.size() - position < 8) return true;
    std::uint64_t length = number(position, 4);
    if (length == 0) return false;   // to the end of the file
    if (length == 1) {
      if (file.size() - position < 16) return true;
      length = number(position + 8, 8);
    }
    if (length < 8) return false;
    if (length > file.size() - position) return true;
    position += length;
  }
  return false;
}

DecodeError heif_failure(std::span<const std::byte> file, const heif_error& error) {
  if (ends_early(file)) return {"picture-truncated", "the HEIF data end before its last box does; expected a whole file"};
  if (error.code == heif_error_Unsupported_filetype || error.code == heif_error_Unsupported_feature) {
    return {"picture-unsupported", fmt::format("a kind of HEIF that is not read ({}); expected a still picture", error.message)};
  }
  return {"picture-damaged", fmt::format("the HEIF cannot be decoded ({}); expected an undamaged file", error.message)};
}

// Light of the transfer characteristics that cameras write (ITU-T H.273, table 3), 1.0 at the largest code.
std::optional<double> linear_of(int transfer, double x) {
  switch (transfer) {
    case heif_transfer_characteristic_ITU_R_BT_709_5:
    case heif_transfer_characteristic_ITU_R_BT_601_6:
    case heif_transfer_characteristic_ITU_R_BT_2020_2_10bit:
    case heif_transfer_characteristic_ITU_R_BT_2020_2_12bit:
      return x < 0.081 ? x / 4.5 : std::pow((x + 0.099) / 1.099, 1 / 0.45);
    case heif_transfer_characteristic_ITU_R_BT_470_6_System_M: return std::pow(x, 2.2);
    case heif_transfer_characteristic_ITU_R_BT_470_6_System_B_G: return std::pow(x, 2.8);
    case heif_transfer_characteristic_linear: return x;
    case heif_transfer_characteristic_ITU_R_BT_2100_0_PQ: {
      constexpr double m1 = 0.1593017578125, m2 = 78.84375, c1 = 0.8359375, c2 = 18.8515625, c3 = 18.6875;
      const double root = std::pow(x, 1 / m2);
      return std::pow(std::max(root - c1, 0.0) / (c2 - c3 * root), 1 / m1);
    }
    case heif_transfer_characteristic_ITU_R_BT_2100_0_HLG:
      return x <= 0.5 ? x * x / 3 : (std::exp((x - 0.55991073) / 0.17883277) + 0.28466892) / 12;
    default: return std::nullopt;   // sRGB, unspecified and the rest: sRGB is assumed
  }
}

void read_colour(const heif_image_handle* handle, PictureFormat& format) {
  if (const std::size_t size = heif_image_handle_get_raw_color_profile_size(handle); size > 0) {
    std::vector<std::byte> profile(size);
    if (heif_image_handle_get_raw_color_profile(handle, profile.data()).code == heif_error_Ok) apply_profile(profile, format);
    return;
  }
  heif_color_profile_nclx* stated = nullptr;
  if (heif_image_handle_get_nclx_color_profile(handle, &stated).code != heif_error_Ok) return;
  const Nclx nclx(stated);
  const int transfer = nclx->transfer_characteristics;
  if (!linear_of(transfer, 0)) return;
  const int codes = format.bits > 8 ? 65536 : 256;
  format.linear_of_code.resize(static_cast<std::size_t>(codes));
  for (int code = 0; code < codes; ++code) {
    const double light = linear_of(transfer, static_cast<double>(code) / (codes - 1)).value_or(0);
    format.linear_of_code[static_cast<std::size_t>(code)] = static_cast<float>(std::clamp(light, 0.0, 1.0));
  }
  format.linear_of_code.back() = 1.0F;
  format.notes.push_back({"transfer-stated", fmt::format("the HEIF states transfer function {} of ITU-T H.273, which "
                                                         "linearised it", transfer)});
}

Decoded<Opened> open(std::span<const std::byte> file) {
  Opened opened{Context(heif_context_alloc()), nullptr, {}};
  // No copy is taken; the caller keeps the bytes while the picture is decoded.
  heif_error error = heif_context_read_from_memory_without_copy(opened.context.get(), file.data(), file.size(), nullptr);
  if (error.code != heif_error_Ok) return tl::unexpected(heif_failure(file, error));
  heif_image_handle* handle = nullptr;
  error = heif_context_get_primary_image_handle(opened.context.get(), &handle);
  if (error.code != heif_error_Ok) return tl::unexpected(heif_failure(file, error));
  opened.handle.reset(handle);

  const int width = heif_image_handle_get_width(handle), height = heif_image_handle_get_height(handle);
  for (const auto& [w, h] : {std::pair{width, height}, {heif_image_handle_get_ispe_width(handle), heif_image_handle_get_ispe_height(handle)}}) {
    if (auto refused = size_error("HEIF", w, h)) return tl::unexpected(*std::move(refused));
  }
  const int bits = heif_image_handle_get_luma_bits_per_pixel(handle);
  opened.format = {.width_px = width,
                   .height_px = height,
                   .bits = bits > 8 ? 16 : 8,
                   .channels = 3,
                   .kind = "HEIF",
                   .orientation = 1};
  read_colour(handle, opened.format);
  if (heif_image_handle_has_alpha_channel(handle) != 0) {
    opened.format.notes.push_back({"alpha-dropped", "the HEIF holds transparency, which was left out"});
  }
  if (heif_context_get_number_of_top_level_images(opened.context.get()) > 1) {
    opened.format.notes.push_back({"more-pictures", "the HEIF holds several pictures: the first was read"});
  }
  return opened;
}

Decoded<PictureFormat> heif_format(std::span<const std::byte> file, DecodeWorkspace&) {
  return open(file).map([](Opened&& opened) { return std::move(opened.format); });
}

// Codes of `bits` spread over 16 so that the largest is 65535.
void widen(const cv::Mat& from, int bits, cv::Mat& to) {
  to.create(from.size(), CV_16UC3);
  const int up = 16 - bits, down = 2 * bits - 16;
  for (int row = 0; row < from.rows; ++row) {
    const auto* source = from.ptr<std::uint16_t>(row);
    auto* target = to.ptr<std::uint16_t>(row);
    for (int i = 0; i < from.cols * 3; ++i) target[i] = static_cast<std::uint16_t>(source[i] << up | source[i] >> down);
  }
}

Decoded<PictureFormat> decode_heif(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace) {
  auto opened = open(file);
  if (!opened) return tl::unexpected(opened.error());
  const bool wide = opened->format.bits == 16;
  heif_image* decoded = nullptr;
  const heif_error error = heif_decode_image(opened->handle.get(), &decoded, heif_colorspace_RGB,
                                             wide ? heif_chroma_interleaved_RRGGBB_LE : heif_chroma_interleaved_RGB, nullptr);
  if (error.code != heif_error_Ok) return tl::unexpected(heif_failure(file, error));
  const Image image(decoded);
  int step = 0;
  std::uint8_t* codes = heif_image_get_plane(image.get(), heif_channel_interleaved, &step);
  const int width = heif_image_get_width(image.get(), heif_channel_interleaved);
  const int height = heif_image_get_height(image.get(), heif_channel_interleaved);
  if (codes == nullptr || width != opened->format.width_px || height != opened->format.height_px) {
    return tl::unexpected(DecodeError{"picture-damaged", fmt::format("the HEIF declares {} x {} pixels and holds {} x {}",
                                                                     opened->format.width_px, opened->format.height_px, width, height)});
  }

  sink.start(opened->format);
  const int bits = heif_image_get_bits_per_pixel_range(image.get(), heif_channel_interleaved);
  const cv::Mat all(height, width, wide ? CV_16UC3 : CV_8UC3, codes, static_cast<std::size_t>(step));
  for (int first = 0; first < height; first += kStripRows) {
    const cv::Mat rows = all.rowRange(first, std::min(first + kStripRows, height));
    if (wide) widen(rows, bits, workspace.strip);
    sink.take(RgbStrip{first, wide ? workspace.strip : rows});
  }
  return std::move(opened->format);
}

// ISO/IEC 23008-12: brands of still pictures, among the first boxes' major and compatible ones.
bool is_heif(std::span<const std::byte> file) {
  if (!has_bytes(file, 4, "ftyp")) return false;
  for (const char* brand : {"heic", "heix", "hevc", "hevx", "heim", "heis", "mif1", "msf1", "avif"}) {
    if (has_bytes(file, 8, brand)) return true;
  }
  return false;
}

}  // namespace

const Codec kHeifCodec = {"HEIF", is_heif, heif_format, decode_heif};

}  // namespace focusfall
