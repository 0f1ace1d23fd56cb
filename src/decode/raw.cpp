// Camera raw through LibRaw: the embedded preview by way of the JPEG decoder, or a development at half size in which
// no photosite lends anything to another cell; and the mosaic as the sensor gave it.
#include <fmt/core.h>
#include <libraw/libraw.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <memory>
#include <numeric>
#include <utility>

#include "src/decode/codec.h"
#include "src/decode/jpeg.h"
#include "src/decode/mosaic.h"

namespace focusfall {
namespace {

// A preview whose long side is at least this part of the frame's is full size: makers crop a few pixels at the rim,
// and the next smaller size in use is 3/4 (judgement).
constexpr double kFullSizePreview = 0.9;
constexpr int kStripRows = 48;              // whole periods of 2 and of 6 rows
constexpr int kMostPreviews = 64;           // JPEG beginnings tried in a file that LibRaw does not know
constexpr unsigned kXTrans = 9;             // LibRaw's `filters` for a mosaic of 6 x 6

// A code that ends the histogram of a colour and holds this many photosites, and this many times more than those just
// below it hold on average, is where the sensor saturates (judgement).
constexpr std::uint32_t kPileUpSites = 32;
constexpr double kPileUpFactor = 8;
constexpr int kPileUpNeighbours = 8;
constexpr double kLeastWhite = 0.75;        // of the stated white level; LibRaw's own adjustment uses the same part

enum class Opening { done, unknown, broken };

struct RawFile {
  std::unique_ptr<LibRaw> raw;
  Opening opening = Opening::broken;
  std::string reason{};
};

RawFile open_raw(std::span<const std::byte> file) {
  RawFile opened{std::make_unique<LibRaw>(LIBRAW_OPIONS_NO_MEMERR_CALLBACK | LIBRAW_OPIONS_NO_DATAERR_CALLBACK)};
  const int code = opened.raw->open_buffer(const_cast<std::byte*>(file.data()), file.size());
  opened.reason = libraw_strerror(code);
  opened.opening = code == LIBRAW_SUCCESS                                               ? Opening::done
                   : code == LIBRAW_FILE_UNSUPPORTED || code == LIBRAW_NOT_IMPLEMENTED ? Opening::unknown
                                                                                        : Opening::broken;
  return opened;
}

DecodeError truncated(const std::string& reason) {
  return {"picture-truncated", fmt::format("the raw data are cut short or damaged ({}); expected a whole file", reason)};
}

bool is_linear(LibRaw& raw) {
  return raw.imgdata.idata.filters == 0 && raw.imgdata.idata.colors == 3 &&
         (raw.imgdata.rawdata.color3_image != nullptr || raw.imgdata.rawdata.color4_image != nullptr);
}

bool is_mosaic(LibRaw& raw) {
  return raw.imgdata.rawdata.raw_image != nullptr && raw.imgdata.idata.filters != 0 && raw.imgdata.idata.colors == 3 &&
         raw.imgdata.rawdata.ioparams.fuji_width == 0 &&
         (raw.imgdata.idata.filters == kXTrans || raw.imgdata.idata.filters > 1000);
}

// Visible rows as CV_16UC1 or CV_16UC3; `fourth` holds them where LibRaw keeps a fourth channel beside the three.
cv::Mat visible_rows(LibRaw& raw, int first, int count, cv::Mat& fourth) {
  const auto& sizes = raw.imgdata.sizes;
  const auto& data = raw.imgdata.rawdata;
  const int top = sizes.top_margin + first;
  const cv::Rect visible(sizes.left_margin, 0, sizes.width, count);
  const auto rows = [&](void* start, int type) {
    const std::size_t step = static_cast<std::size_t>(sizes.raw_width) * CV_ELEM_SIZE(type);
    const std::size_t pitch = sizes.raw_pitch >= step ? sizes.raw_pitch : step;
    return cv::Mat(count, sizes.raw_width, type, static_cast<std::uint8_t*>(start) + pitch * static_cast<std::size_t>(top), pitch)(visible);
  };
  if (data.raw_image != nullptr) return rows(data.raw_image, CV_16UC1);
  if (data.color3_image != nullptr) return rows(data.color3_image, CV_16UC3);
  const cv::Mat four = rows(data.color4_image, CV_16UC4);
  fourth.create(four.size(), CV_16UC3);
  const int pairs[] = {0, 0, 1, 1, 2, 2};
  cv::mixChannels(&four, 1, &fourth, 1, pairs, 3);
  return fourth;
}

// Black of the site: a common part, a part of its colour and a part of a pattern (LibRaw's data structures, colordata).
float black_of(const libraw_colordata_t& color, int colour, int row, int column) {
  unsigned black = color.black + color.cblack[colour];
  const unsigned rows = color.cblack[4], columns = color.cblack[5];
  if (rows > 0 && columns > 0) {
    black += color.cblack[6 + static_cast<unsigned>(row) % rows * columns + static_cast<unsigned>(column) % columns];
  }
  return static_cast<float>(black);
}

// A DNG states its white level, of a linear one for each channel; else it is LibRaw's for the body.
float stated_white(LibRaw& raw, int channel) {
  const auto& color = raw.imgdata.color;
  if (raw.imgdata.idata.dng_version != 0) {
    const auto& levels = color.dng_levels.dng_whitelevel;
    const unsigned own = is_linear(raw) ? levels[channel] : levels[0];
    if (own > 0) return static_cast<float>(own);
    if (levels[0] > 0) return static_cast<float>(levels[0]);
  }
  return static_cast<float>(color.maximum);
}

MosaicFormat layout_of(LibRaw& raw) {
  const auto& color = raw.imgdata.color;
  MosaicFormat format;
  format.width_px = raw.imgdata.sizes.width;
  format.height_px = raw.imgdata.sizes.height;
  format.linear_rgb = is_linear(raw);
  if (format.linear_rgb) {
    format.period_x = format.period_y = format.cell_px = 1;
    for (int c = 0; c < 3; ++c) {
      format.sites.push_back({static_cast<std::uint8_t>(c), black_of(color, c, 0, 0), stated_white(raw, c)});
    }
    return format;
  }
  const bool xtrans = raw.imgdata.idata.filters == kXTrans;
  format.cell_px = xtrans ? 3 : 2;
  // Some Bayer patterns of old sensors repeat after 8 rows only.
  format.period_x = std::lcm(xtrans ? 6 : 2, std::max(1, static_cast<int>(color.cblack[5])));
  format.period_y = std::lcm(xtrans ? 6 : 8, std::max(1, static_cast<int>(color.cblack[4])));
  for (int y = 0; y < format.period_y; ++y) {
    for (int x = 0; x < format.period_x; ++x) {
      const int colour = raw.COLOR(y, x);
      const int channel = colour == 3 ? 1 : colour;
      format.sites.push_back({static_cast<std::uint8_t>(channel), black_of(color, colour, y, x), stated_white(raw, channel)});
    }
  }
  return format;
}

// Sensors of many bodies saturate below the number that their format could hold: where the codes of a colour pile up
// at their end, that end is its white level. Files that state a white level are believed.
void lower_white_to_pile_up(LibRaw& raw, MosaicFormat& format) {
  if (raw.imgdata.idata.dng_version != 0 || format.linear_rgb) return;
  std::array<std::vector<std::uint32_t>, 3> histograms;
  for (auto& histogram : histograms) histogram.assign(65536, 0);
  cv::Mat unused;
  for (int y = 0; y < format.height_px; ++y) {
    const cv::Mat row = visible_rows(raw, y, 1, unused);
    const auto* codes = row.ptr<std::uint16_t>(0);
    const MosaicSite* sites = format.sites.data() + y % format.period_y * format.period_x;
    for (int x = 0; x < format.width_px; ++x) ++histograms[sites[x % format.period_x].channel][codes[x]];
  }
  for (MosaicSite& site : format.sites) {
    const auto& histogram = histograms[site.channel];
    int last = 65535;
    while (last > 0 && histogram[static_cast<std::size_t>(last)] == 0) --last;
    if (last < kPileUpNeighbours || static_cast<double>(last) < kLeastWhite * static_cast<double>(site.white)) continue;
    const auto end = histogram.begin() + last;
    const double below = std::accumulate(end - kPileUpNeighbours, end, 0.0) / kPileUpNeighbours;
    if (*end >= kPileUpSites && *end >= kPileUpFactor * below) site.white = std::min(site.white, static_cast<float>(last));
  }
}

// Passes a preview on under the name of the raw file that holds it.
class PreviewSink final : public StripSink {
 public:
  PreviewSink(StripSink& inner, const PictureFormat& shown) : inner_(inner), shown_(shown) {}
  void start(const PictureFormat&) override { inner_.start(shown_); }
  void take(const YccStrip& strip) override { inner_.take(strip); }
  void take(const RgbStrip& strip) override { inner_.take(strip); }
  cv::Mat luma_destination(int width, int height) override { return inner_.luma_destination(width, height); }

 private:
  StripSink& inner_;
  const PictureFormat& shown_;
};

// What of a raw file is to be measured.
struct Choice {
  std::span<const std::byte> preview;     // empty: develop
  PictureFormat format;
};

struct RawPicture {
  RawFile file;
  Choice choice;
};

PictureFormat preview_format(PictureFormat format) {
  format.kind = "raw";
  format.measured_from = MeasuredFrom::embedded_preview;
  return format;
}

// The largest JPEG among all that begin somewhere in the file.
std::optional<Choice> largest_preview(std::span<const std::byte> file, JpegDecoder& jpeg) {
  std::optional<Choice> best;
  constexpr std::array kBegin = {std::byte{0xFF}, std::byte{0xD8}, std::byte{0xFF}};
  auto at = file.begin();
  for (int tried = 0; tried < kMostPreviews; ++tried) {
    at = std::search(at, file.end(), kBegin.begin(), kBegin.end());
    if (at == file.end()) break;
    const auto part = file.subspan(static_cast<std::size_t>(at - file.begin()));
    if (auto format = jpeg.format(part)) {
      if (!best || format->width_px > best->format.width_px) best = Choice{part, preview_format(*std::move(format))};
    }
    ++at;
  }
  return best;
}

std::optional<Choice> stated_preview(LibRaw& raw, JpegDecoder& jpeg) {
  if (raw.unpack_thumb() != LIBRAW_SUCCESS || raw.imgdata.thumbnail.tformat != LIBRAW_THUMBNAIL_JPEG) return std::nullopt;
  const auto& thumbnail = raw.imgdata.thumbnail;
  const std::span preview(reinterpret_cast<const std::byte*>(thumbnail.thumb), thumbnail.tlength);
  auto format = jpeg.format(preview);
  if (!format) return std::nullopt;
  return Choice{preview, preview_format(*std::move(format))};
}

Choice development_of(LibRaw& raw) {
  const auto& sizes = raw.imgdata.sizes;
  const unsigned filters = raw.imgdata.idata.filters;
  const int cell = filters == 0 ? 1 : filters == kXTrans ? 3 : 2;
  Choice choice;
  choice.format = {.width_px = sizes.width / cell,
                   .height_px = sizes.height / cell,
                   .bits = 16,
                   .channels = 3,
                   .kind = "raw",
                   .measured_from = MeasuredFrom::half_size_development};
  return choice;
}

Decoded<RawPicture> choose(std::span<const std::byte> file, JpegDecoder& jpeg) {
  RawPicture picture{open_raw(file), {}};
  if (picture.file.opening == Opening::broken) return tl::unexpected(truncated(picture.file.reason));
  if (picture.file.opening == Opening::unknown) {
    auto found = largest_preview(file, jpeg);
    if (!found) {
      return tl::unexpected(DecodeError{"picture-unsupported", "a raw file of an unknown body without a preview; expected a known body or a JPEG preview"});
    }
    picture.choice = *std::move(found);
    picture.choice.format.notes.push_back({"raw-unknown-body", "the raw data of this body cannot be read: clipping is that of the preview"});
    picture.choice.format.notes.push_back({"preview-only", "the size of the frame is not known: the largest embedded preview was measured"});
    return picture;
  }
  LibRaw& raw = *picture.file.raw;
  const auto& sizes = raw.imgdata.sizes;
  if (auto refused = size_error("raw file", sizes.raw_width, sizes.raw_height)) return tl::unexpected(*std::move(refused));
  auto preview = stated_preview(raw, jpeg);
  const int frame_side = std::max(sizes.width, sizes.height);
  const auto side = [](const PictureFormat& format) { return std::max(format.width_px, format.height_px); };
  if (preview && side(preview->format) >= kFullSizePreview * frame_side) {
    picture.choice = *std::move(preview);
    return picture;
  }
  const unsigned filters = raw.imgdata.idata.filters;
  const bool developable = raw.imgdata.idata.colors == 3 && raw.imgdata.idata.raw_count > 0 &&
                           raw.imgdata.idata.is_foveon == 0 && (filters == 0 || filters == kXTrans || filters > 1000);
  if (developable) {
    picture.choice = development_of(raw);
    if (auto refused = size_error("raw file", picture.choice.format.width_px, picture.choice.format.height_px)) {
      return tl::unexpected(*std::move(refused));
    }
    return picture;
  }
  if (!preview) return tl::unexpected(DecodeError{"picture-unsupported", "a raw file of other than three colours without a preview; expected red, green and blue"});
  picture.choice = *std::move(preview);
  picture.choice.format.notes.push_back({"preview-small", fmt::format("the embedded preview has {} px a side, the frame {} px", side(picture.choice.format), frame_side)});
  return picture;
}

// IEC 61966-2-1, encoding, for 65536 levels of light.
const std::vector<std::uint16_t>& srgb_codes() {
  static const std::vector<std::uint16_t> codes = [] {
    std::vector<std::uint16_t> made(65536);
    for (std::size_t i = 0; i < made.size(); ++i) {
      const double x = static_cast<double>(i) / 65535;
      const double code = x <= 0.0031308 ? 12.92 * x : 1.055 * std::pow(x, 1 / 2.4) - 0.055;
      made[i] = static_cast<std::uint16_t>(std::lround(code * 65535));
    }
    return made;
  }();
  return codes;
}

// Each cell becomes one pixel: the mean of its photosites of each colour, black taken off, balanced as the camera did.
class Development {
 public:
  Development(LibRaw& raw, const PictureFormat& format) : raw_(raw), layout_(layout_of(raw)), format_(format) {
    const float* balance = raw.imgdata.color.cam_mul;
    const float least = std::min({balance[0], balance[1], balance[2]});
    for (std::size_t c = 0; c < 3; ++c) balance_[c] = least > 0 ? static_cast<double>(balance[c] / least) : 1.0;
  }

  void deliver(StripSink& sink) {
    cv::Mat unused;
    pixels_.create(kStripRows / layout_.cell_px, format_.width_px, CV_16UC3);
    for (int first = 0; first < format_.height_px; first += pixels_.rows) {
      const int count = std::min(pixels_.rows, format_.height_px - first);
      const cv::Mat codes = visible_rows(raw_, first * layout_.cell_px, count * layout_.cell_px, unused);
      for (int row = 0; row < count; ++row) develop(codes, first, row);
      sink.take(RgbStrip{first, pixels_.rowRange(0, count)});
    }
  }

 private:
  void develop(const cv::Mat& codes, int first, int row) {
    const int cell = layout_.cell_px, step = layout_.linear_rgb ? 3 : 1;
    auto* target = pixels_.ptr<std::uint16_t>(row);
    for (int column = 0; column < format_.width_px; ++column) {
      std::array<double, 3> sum{};
      std::array<int, 3> sites{};
      for (int y = row * cell; y < (row + 1) * cell; ++y) {
        const auto* line = codes.ptr<std::uint16_t>(y);
        for (int x = column * cell * step; x < (column + 1) * cell * step; ++x) {
          const int site_row = layout_.linear_rgb ? 0 : (first * cell + y) % layout_.period_y;
          const MosaicSite& site = layout_.sites[static_cast<std::size_t>(
              layout_.linear_rgb ? x % 3 : site_row * layout_.period_x + x % layout_.period_x)];
          sum[site.channel] += static_cast<double>((line[x] - site.black) / std::max(site.white - site.black, 1.0F));
          ++sites[site.channel];
        }
      }
      for (std::size_t c = 0; c < 3; ++c) {
        const double light = sites[c] > 0 ? std::clamp(balance_[c] * sum[c] / sites[c], 0.0, 1.0) : 0;
        target[column * 3 + static_cast<int>(c)] = srgb_codes()[static_cast<std::size_t>(light * 65535 + 0.5)];
      }
    }
  }

  LibRaw& raw_;
  MosaicFormat layout_;
  const PictureFormat& format_;
  std::array<double, 3> balance_{};
  cv::Mat pixels_;
};

Decoded<PictureFormat> raw_format(std::span<const std::byte> file, DecodeWorkspace& workspace) {
  return choose(file, workspace.jpeg()).map([](RawPicture&& picture) { return std::move(picture.choice.format); });
}

Decoded<PictureFormat> decode_raw(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace) {
  auto picture = choose(file, workspace.jpeg());
  if (!picture) return tl::unexpected(picture.error());
  const Choice& choice = picture->choice;
  if (!choice.preview.empty()) {
    PreviewSink named(sink, choice.format);
    auto decoded = workspace.jpeg().decode(choice.preview, named);
    if (!decoded) return decoded;
    return choice.format;
  }
  LibRaw& raw = *picture->file.raw;
  const int code = raw.unpack();
  if (code != LIBRAW_SUCCESS || raw.error_count() > 0) return tl::unexpected(truncated(libraw_strerror(code)));
  if (!is_linear(raw) && !is_mosaic(raw)) {
    return tl::unexpected(DecodeError{"picture-unsupported", "a raw file whose photosites have no order that is read; expected a mosaic of red, green and blue"});
  }
  sink.start(choice.format);
  Development(raw, choice.format).deliver(sink);
  return choice.format;
}

}  // namespace

Decoded<MosaicFormat> decode_mosaic(std::span<const std::byte> file, MosaicSink& sink) {
  if (!is_camera_raw(file)) return tl::unexpected(DecodeError{"not-raw", "this is no camera raw file"});
  RawFile opened = open_raw(file);
  if (opened.opening == Opening::unknown) {
    return tl::unexpected(DecodeError{"raw-unknown-body", fmt::format("the raw data of this body cannot be read ({})", opened.reason)});
  }
  LibRaw& raw = *opened.raw;
  if (opened.opening == Opening::broken) {
    return tl::unexpected(DecodeError{"raw-damaged", fmt::format("the raw data cannot be read ({})", opened.reason)});
  }
  const auto& sizes = raw.imgdata.sizes;
  if (auto refused = size_error("raw file", sizes.raw_width, sizes.raw_height)) return tl::unexpected(*std::move(refused));
  const int code = raw.unpack();
  if (code == LIBRAW_FILE_UNSUPPORTED || code == LIBRAW_NOT_IMPLEMENTED) {
    return tl::unexpected(DecodeError{"raw-unknown-body", fmt::format("the raw data of this body cannot be read ({})", libraw_strerror(code))});
  }
  if (code != LIBRAW_SUCCESS || raw.error_count() > 0) {
    return tl::unexpected(DecodeError{"raw-damaged", fmt::format("the raw data are cut short or damaged ({}, {} places)", libraw_strerror(code), raw.error_count())});
  }
  if (!is_linear(raw) && !is_mosaic(raw)) {
    return tl::unexpected(DecodeError{"raw-unsupported", "the photosites are not integers of red, green and blue: clipping is that of the picture"});
  }

  MosaicFormat format = layout_of(raw);
  lower_white_to_pile_up(raw, format);
  sink.start(format);
  const int rows = std::lcm(kStripRows, format.period_y);
  cv::Mat fourth;
  for (int first = 0; first < format.height_px; first += rows) {
    const int count = std::min(rows, format.height_px - first);
    sink.take(MosaicStrip{first, visible_rows(raw, first, count, fourth)});
  }
  return format;
}

const Codec kRawCodec = {"raw", is_camera_raw, raw_format, decode_raw};

}  // namespace focusfall
