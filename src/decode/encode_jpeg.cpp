// JPEG octets from a small picture in memory.
#include <cstddef>
#include <cstdio>

#include <jpeglib.h>

#include <csetjmp>
#include <cstdlib>

#include "src/decode/preview.h"

namespace focusfall {
namespace {

// Plain data: longjmp crosses nothing that has a destructor.
struct Encoding {
  jpeg_error_mgr errors{};
  std::jmp_buf jump;
  jpeg_compress_struct codec{};
  unsigned char* bytes = nullptr;
  unsigned long size = 0;

  static void fail(j_common_ptr common) { std::longjmp(static_cast<Encoding*>(common->client_data)->jump, 1); }
  static void stay_silent(j_common_ptr) {}
};

bool encode(const cv::Mat& picture, int quality, Encoding& state) {
  if (setjmp(state.jump) != 0) return false;
  jpeg_create_compress(&state.codec);
  jpeg_mem_dest(&state.codec, &state.bytes, &state.size);
  state.codec.image_width = static_cast<JDIMENSION>(picture.cols);
  state.codec.image_height = static_cast<JDIMENSION>(picture.rows);
  state.codec.input_components = picture.channels();
  state.codec.in_color_space = picture.channels() == 1 ? JCS_GRAYSCALE : JCS_RGB;
  jpeg_set_defaults(&state.codec);
  jpeg_set_quality(&state.codec, quality, TRUE);
  state.codec.optimize_coding = TRUE;
  jpeg_start_compress(&state.codec, TRUE);
  while (state.codec.next_scanline < state.codec.image_height) {
    JSAMPROW row = const_cast<JSAMPROW>(picture.ptr(static_cast<int>(state.codec.next_scanline)));
    jpeg_write_scanlines(&state.codec, &row, 1);
  }
  jpeg_finish_compress(&state.codec);
  return true;
}

}  // namespace

std::string encode_jpeg(const cv::Mat& picture, int quality) {
  CV_Assert(picture.type() == CV_8UC3 || picture.type() == CV_8UC1);
  if (picture.empty()) return {};
  Encoding state;
  state.codec.err = jpeg_std_error(&state.errors);
  state.errors.error_exit = &Encoding::fail;
  state.errors.output_message = &Encoding::stay_silent;
  state.codec.client_data = &state;
  std::string result;
  if (encode(picture, quality, state)) result.assign(reinterpret_cast<const char*>(state.bytes), state.size);
  jpeg_destroy_compress(&state.codec);
  std::free(state.bytes);
  return result;
}

}  // namespace focusfall
