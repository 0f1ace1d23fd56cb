// JPEG through libjpeg-turbo: coded planes in strips of whole MCU rows, no colour conversion, no upsampling.
#include "src/decode/jpeg.h"

#include <fmt/core.h>
#include <jerror.h>

#include <algorithm>
#include <cstdlib>
#include <memory>
#include <utility>

#include "src/decode/icc.h"

namespace focusfall {
namespace {

// A file that ends in at least this many zero bytes with no end-of-image marker before them was never written to its
// end (a copy broken off, a card pulled): the zeros would decode as flat grey. Judgement: longer than any padding.
constexpr std::size_t kZeroTailBytes = 64;

// More scans than any camera or program writes (10 is usual): a file made to keep the decoder busy (judgement).
constexpr int kMaxScans = 200;

// Rows of a strip of RGB-coded pictures; the others take their height from the coding.
constexpr int kRgbStripRows = 16;

std::size_t size_without_zero_tail(std::span<const std::byte> file) {
  std::size_t size = file.size();
  while (size > 0 && file[size - 1] == std::byte{0}) --size;
  if (file.size() - size < kZeroTailBytes || size < 2) return file.size();
  const bool ends = file[size - 2] == std::byte{0xFF} && file[size - 1] == std::byte{0xD9};
  return ends ? file.size() : size;
}

// Warnings after which the pixels are no longer those of the picture. The others are oddities around them.
bool is_damage(int code) {
  return code == JWRN_HIT_MARKER || code == JWRN_HUFF_BAD_CODE || code == JWRN_MUST_RESYNC ||
         code == JWRN_ARITH_BAD_CODE;
}

bool is_unsupported(int code) {
  return code == JERR_SOF_UNSUPPORTED || code == JERR_BAD_PRECISION || code == JERR_CCIR601_NOTIMPL ||
         code == JERR_CONVERSION_NOTIMPL || code == JERR_FRACT_SAMPLE_NOTIMPL || code == JERR_ARITH_NOTIMPL ||
         code == JERR_COMPONENT_COUNT;
}

}  // namespace

// Everything libjpeg wants to call back into. Plain data: longjmp crosses nothing that has a destructor.
struct JpegDecoder::Handler {
  jpeg_error_mgr errors{};
  jpeg_progress_mgr progress{};
  std::jmp_buf jump;
  char message[JMSG_LENGTH_MAX] = {};
  int error_code = 0;
  int remarks = 0;
  bool input_ended = false;    // the decoder asked for bytes past the end
  bool damaged = false;
  bool too_many_scans = false;

  static Handler& of(j_common_ptr common) { return *static_cast<Handler*>(common->client_data); }

  static void fail(j_common_ptr common) {
    Handler& handler = of(common);
    common->err->format_message(common, handler.message);
    handler.error_code = common->err->msg_code;
    std::longjmp(handler.jump, 1);
  }

  static void note(j_common_ptr common, int level) {
    if (level >= 0) return;   // trace, not a warning
    Handler& handler = of(common);
    const int code = common->err->msg_code;
    if (code == JWRN_JPEG_EOF) handler.input_ended = true;
    if (is_damage(code)) {
      handler.damaged = true;
    } else {
      ++handler.remarks;
    }
  }

  static void watch(j_common_ptr common) {
    Handler& handler = of(common);
    if (reinterpret_cast<j_decompress_ptr>(common)->input_scan_number <= kMaxScans) return;
    handler.too_many_scans = true;
    std::longjmp(handler.jump, 1);
  }

  static void stay_silent(j_common_ptr) {}
};

JpegDecoder::JpegDecoder() : handler_(std::make_unique<Handler>()) {
  codec_.err = jpeg_std_error(&handler_->errors);
  handler_->errors.error_exit = &Handler::fail;
  handler_->errors.emit_message = &Handler::note;
  handler_->errors.output_message = &Handler::stay_silent;
  handler_->progress.progress_monitor = &Handler::watch;
  codec_.client_data = handler_.get();
  jpeg_create_decompress(&codec_);
  codec_.progress = &handler_->progress;
  jpeg_save_markers(&codec_, JPEG_APP0 + 2, 0xFFFF);   // where a colour profile lies (ICC.1:2022, annex B.4)
}

JpegDecoder::~JpegDecoder() { jpeg_destroy_decompress(&codec_); }

// Runs one call of libjpeg; false where it gave up. `step` must own nothing.
template <class Step>
bool JpegDecoder::guarded(Step step) {
  if (setjmp(handler_->jump) != 0) return false;
  step();
  return true;
}

DecodeError JpegDecoder::error() const {
  const int code = handler_->error_code;
  if (handler_->too_many_scans) {
    return {"picture-unsupported", fmt::format("the JPEG holds more than {} scans; expected at most that many", kMaxScans)};
  }
  if (code == JERR_EMPTY_IMAGE) {
    return {"picture-empty", fmt::format("the JPEG declares {} x {} pixels; expected a picture", codec_.image_width,
                                         codec_.image_height)};
  }
  if (code == JERR_IMAGE_TOO_BIG) {
    return {"picture-too-large", fmt::format("the JPEG declares {} x {} pixels; expected at most {} a side",
                                             codec_.image_width, codec_.image_height, JPEG_MAX_DIMENSION)};
  }
  if (is_unsupported(code)) {
    return {"picture-unsupported", fmt::format("a kind of JPEG that is not read ({}); expected 8 bits a channel, "
                                               "grey, YCbCr or RGB, baseline or progressive", handler_->message)};
  }
  if (handler_->input_ended) {
    return {"picture-truncated", "the JPEG ends inside its header; expected a whole file"};
  }
  return {"picture-damaged", fmt::format("the JPEG cannot be decoded ({}); expected an undamaged file", handler_->message)};
}

// Row `row` is the first that did not come out whole.
DecodeError JpegDecoder::row_error(unsigned row) const {
  if (handler_->input_ended) {
    return {"picture-truncated", fmt::format("the JPEG data end at row {} of {}; expected a whole file", row,
                                             codec_.image_height)};
  }
  return {"picture-damaged", fmt::format("the JPEG data are damaged from row {} of {} on; expected an undamaged file",
                                         row, codec_.image_height)};
}

// Mean quantiser of the luma coefficients of lowest frequency, without the constant one: of ITU-T T.81 annex A.3.3 the
// coefficients S(u, v) with 1 <= u + v <= 3, in 8-bit codes times the 8 of that transform's scale.
double JpegDecoder::coding_step() const {
  const int number = codec_.comp_info[0].quant_tbl_no;
  if (number < 0 || number >= NUM_QUANT_TBLS || codec_.quant_tbl_ptrs[number] == nullptr) return 0;
  const UINT16* steps = codec_.quant_tbl_ptrs[number]->quantval;
  double sum = 0;
  int count = 0;
  for (int v = 0; v <= 3; ++v) {
    for (int u = 0; u + v <= 3; ++u) {
      if (u + v == 0) continue;
      sum += steps[v * DCTSIZE + u];
      ++count;
    }
  }
  return sum / count;
}

Decoded<PictureFormat> JpegDecoder::open(std::span<const std::byte> file) {
  jpeg_abort_decompress(&codec_);
  handler_->error_code = 0;
  handler_->remarks = 0;
  handler_->input_ended = handler_->damaged = handler_->too_many_scans = false;
  codec_.image_width = codec_.image_height = 0;

  const std::size_t size = size_without_zero_tail(file);
  const bool read = guarded([&] {
    jpeg_mem_src(&codec_, reinterpret_cast<const unsigned char*>(file.data()), size);
    jpeg_read_header(&codec_, TRUE);
  });
  if (!read) return tl::unexpected(error());
  if (auto refused = size_error("JPEG", codec_.image_width, codec_.image_height)) {
    return tl::unexpected(*std::move(refused));
  }

  // Every 8 x 8 block takes at least one bit of a Huffman code: a file with fewer bits cannot hold its picture, and
  // no memory need be taken to find out.
  const auto& luma = codec_.comp_info[0];
  if (!codec_.arith_code && size * 8 < std::size_t{luma.width_in_blocks} * luma.height_in_blocks) {
    return tl::unexpected(DecodeError{"picture-truncated",
        fmt::format("the JPEG declares {} x {} pixels and is {} bytes long, too short to hold them; expected a whole "
                    "file", codec_.image_width, codec_.image_height, size)});
  }
  if (codec_.jpeg_color_space != JCS_YCbCr && codec_.jpeg_color_space != JCS_GRAYSCALE &&
      codec_.jpeg_color_space != JCS_RGB) {
    return tl::unexpected(DecodeError{"picture-unsupported",
        fmt::format("a JPEG of {} channels ({}); expected grey, YCbCr or RGB", codec_.num_components,
                    codec_.num_components == 4 ? "CMYK, for printing" : "of unknown meaning")});
  }
  PictureFormat format{.width_px = static_cast<int>(codec_.image_width),
                       .height_px = static_cast<int>(codec_.image_height),
                       .bits = 8,
                       .channels = codec_.jpeg_color_space == JCS_GRAYSCALE ? 1 : 3,
                       .kind = "JPEG",
                       .remarks = handler_->remarks,
                       .coding_step_codes = coding_step()};
  read_profile(format);
  return format;
}

// The profile may be spread over several APP2 markers; libjpeg puts them together.
void JpegDecoder::read_profile(PictureFormat& format) {
  JOCTET* bytes = nullptr;
  unsigned length = 0;
  const int remarks_before = handler_->remarks;
  if (!guarded([&] { jpeg_read_icc_profile(&codec_, &bytes, &length); })) return;
  const std::unique_ptr<JOCTET, decltype(&std::free)> owned(bytes, &std::free);
  if (bytes != nullptr) {
    apply_profile({reinterpret_cast<const std::byte*>(bytes), length}, format);
  } else if (handler_->remarks > remarks_before) {
    format.notes.push_back({"profile-unusable", "parts of the colour profile are missing; sRGB was assumed"});
  }
}

Decoded<PictureFormat> JpegDecoder::format(std::span<const std::byte> file) { return open(file); }

// Planes can be taken as coded where luma is at full size and both chroma planes share one whole step.
bool JpegDecoder::planes_are_simple() const {
  if (codec_.jpeg_color_space == JCS_GRAYSCALE) return true;
  const auto* part = codec_.comp_info;
  return codec_.jpeg_color_space == JCS_YCbCr && part[0].h_samp_factor == codec_.max_h_samp_factor &&
         part[0].v_samp_factor == codec_.max_v_samp_factor && part[1].h_samp_factor == part[2].h_samp_factor &&
         part[1].v_samp_factor == part[2].v_samp_factor && codec_.max_h_samp_factor % part[1].h_samp_factor == 0 &&
         codec_.max_v_samp_factor % part[1].v_samp_factor == 0;
}

// In a file of several scans the end of the data shows nowhere in the rows: each scan refines the whole picture. It is
// whole where every coefficient of every channel came down to its last bit.
bool JpegDecoder::scans_are_complete() const {
  if (!handler_->input_ended) return true;
  if (!codec_.progressive_mode || codec_.coef_bits == nullptr) return false;
  for (int part = 0; part < codec_.num_components; ++part) {
    const int* bits = codec_.coef_bits[part];
    if (std::any_of(bits, bits + DCTSIZE2, [](int missing) { return missing != 0; })) return false;
  }
  return true;
}

Decoded<PictureFormat> JpegDecoder::decode(std::span<const std::byte> file, StripSink& sink) {
  auto format = open(file);
  if (!format) return format;
  const bool planes = planes_are_simple();
  codec_.raw_data_out = planes ? TRUE : FALSE;
  codec_.out_color_space = planes ? codec_.jpeg_color_space : JCS_RGB;
  codec_.do_fancy_upsampling = FALSE;   // the clipping counts are defined on replicated chroma (clipping.h)
  sink.start(*format);

  if (!guarded([&] { jpeg_start_decompress(&codec_); })) return tl::unexpected(error());
  if (jpeg_has_multiple_scans(&codec_) && (handler_->damaged || !scans_are_complete())) {
    return tl::unexpected(handler_->input_ended
        ? DecodeError{"picture-truncated", fmt::format("the JPEG of several scans ends in scan {}, before any row is "
                                                       "complete; expected a whole file", codec_.input_scan_number)}
        : DecodeError{"picture-damaged", "the JPEG of several scans is damaged; expected an undamaged file"});
  }
  if (auto failed = planes ? deliver_planes(sink) : deliver_rgb(sink)) return tl::unexpected(*std::move(failed));

  // All rows are out: what follows them in the file is no matter of the picture.
  format->remarks = handler_->remarks;
  return format;
}

std::optional<DecodeError> JpegDecoder::deliver_planes(StripSink& sink) {
  // Sizes padded to whole MCUs, as libjpeg writes them.
  const bool grey = codec_.jpeg_color_space == JCS_GRAYSCALE;
  const int width = static_cast<int>(codec_.image_width), height = static_cast<int>(codec_.image_height);
  const int strip_rows = codec_.max_v_samp_factor * DCTSIZE;
  const int mcu_width = codec_.max_h_samp_factor * DCTSIZE;
  const int padded_width = (width + mcu_width - 1) / mcu_width * mcu_width;
  const int padded_height = (height + strip_rows - 1) / strip_rows * strip_rows;
  YccStrip strip;
  if (!grey) {
    strip.chroma_step_x = codec_.max_h_samp_factor / codec_.comp_info[1].h_samp_factor;
    strip.chroma_step_y = codec_.max_v_samp_factor / codec_.comp_info[1].v_samp_factor;
    cb_.create(strip_rows / strip.chroma_step_y, padded_width / strip.chroma_step_x, CV_8UC1);
    cr_.create(cb_.size(), CV_8UC1);
  }
  cv::Mat plane = sink.luma_destination(padded_width, padded_height);
  const bool in_place = !plane.empty();
  if (!in_place) y_.create(strip_rows, padded_width, CV_8UC1);
  CV_Assert(!in_place || (plane.type() == CV_8UC1 && plane.cols >= padded_width && plane.rows >= padded_height));

  JSAMPROW rows[3][MAX_SAMP_FACTOR * DCTSIZE];
  JSAMPARRAY planes[3] = {rows[0], rows[1], rows[2]};
  for (int row = 0; row < cb_.rows && !grey; ++row) {
    rows[1][row] = cb_.ptr(row);
    rows[2][row] = cr_.ptr(row);
  }
  for (int first = 0; first < height; first += strip_rows) {
    for (int row = 0; row < strip_rows; ++row) rows[0][row] = in_place ? plane.ptr(first + row) : y_.ptr(row);
    const bool read = guarded([&] { jpeg_read_raw_data(&codec_, planes, static_cast<JDIMENSION>(strip_rows)); });
    if (!read || handler_->damaged) return row_error(static_cast<unsigned>(first));

    const int count = std::min(strip_rows, height - first);
    strip.first_row = first;
    strip.y = (in_place ? plane.rowRange(first, first + count) : y_.rowRange(0, count)).colRange(0, width);
    if (!grey) {
      const cv::Rect used(0, 0, (width + strip.chroma_step_x - 1) / strip.chroma_step_x,
                          (count + strip.chroma_step_y - 1) / strip.chroma_step_y);
      strip.cb = cb_(used);
      strip.cr = cr_(used);
    }
    sink.take(strip);
  }
  return std::nullopt;
}

std::optional<DecodeError> JpegDecoder::deliver_rgb(StripSink& sink) {
  const int width = static_cast<int>(codec_.output_width), height = static_cast<int>(codec_.output_height);
  rgb_.create(kRgbStripRows, width, CV_8UC3);
  JSAMPROW rows[kRgbStripRows];
  for (int row = 0; row < kRgbStripRows; ++row) rows[row] = rgb_.ptr(row);

  RgbStrip strip;
  for (int first = 0; first < height; first += kRgbStripRows) {
    const int count = std::min(kRgbStripRows, height - first);
    JDIMENSION done = 0;
    const bool read = guarded([&] {
      while (done < static_cast<JDIMENSION>(count)) {
        done += jpeg_read_scanlines(&codec_, rows + done, static_cast<JDIMENSION>(count) - done);
      }
    });
    if (!read || handler_->damaged) return row_error(static_cast<unsigned>(first));
    strip.first_row = first;
    strip.rgb = rgb_.rowRange(0, count);
    sink.take(strip);
  }
  return std::nullopt;
}

namespace {

bool is_jpeg(std::span<const std::byte> file) { return has_bytes(file, 0, "\xFF\xD8\xFF"); }

Decoded<PictureFormat> jpeg_format(std::span<const std::byte> file, DecodeWorkspace& workspace) {
  return workspace.jpeg().format(file);
}

Decoded<PictureFormat> decode_jpeg(std::span<const std::byte> file, StripSink& sink, DecodeWorkspace& workspace) {
  return workspace.jpeg().decode(file, sink);
}

}  // namespace

const Codec kJpegCodec = {"JPEG", is_jpeg, jpeg_format, decode_jpeg};

}  // namespace focusfall
