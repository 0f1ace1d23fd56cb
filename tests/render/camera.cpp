#include "tests/render/camera.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <csetjmp>
#include <cstdio>
#include <jpeglib.h>
#include <opencv2/imgproc.hpp>

namespace focusfall::render {
namespace {

// A representative full-frame sensor of about 6 um pitch: 50,000 electrons at the clipping level of ISO 100, 3
// electrons of read noise. Judgement; bodies on the market lie within a factor of two.
constexpr double kElectronsAtIso100 = 50000;
constexpr double kReadNoiseElectrons = 3;

constexpr int kEncodeSteps = 8192;

// sRGB code value 0..255 (not rounded) on linear light 0..1, indexed by the square root for even resolution.
const std::array<float, kEncodeSteps + 2>& encode_table() {
  static const auto table = [] {
    std::array<float, kEncodeSteps + 2> values{};
    for (int i = 0; i < kEncodeSteps + 2; ++i) {
      const double root = static_cast<double>(i) / kEncodeSteps;
      values[static_cast<std::size_t>(i)] = 255.0f * srgb_encode(static_cast<float>(root * root));
    }
    return values;
  }();
  return table;
}

float encode_fast(float linear) {
  const float position = std::sqrt(std::clamp(linear, 0.0f, 1.0f)) * kEncodeSteps;
  const auto index = static_cast<std::size_t>(position);
  const auto& table = encode_table();
  return table[index] + (position - static_cast<float>(index)) * (table[index + 1] - table[index]);
}

void add_noise(cv::Mat& light, double iso_speed, Random& random) {
  if (iso_speed <= 0) return;
  const NoiseModel noise = noise_of(iso_speed);
  const int count = light.cols * light.channels();
  for (int row = 0; row < light.rows; ++row) {
    auto* line = light.ptr<float>(row);
    for (int i = 0; i < count; ++i) {
      const double variance = noise.slope * std::max(line[i], 0.0f) + noise.floor;
      line[i] += static_cast<float>(std::sqrt(variance) * random.normal());
    }
  }
}

// Colour of the photosite in an RGGB mosaic: 0 red, 1 green, 2 blue.
int photosite(int x, int y) { return (y & 1) == 0 ? ((x & 1) == 0 ? 0 : 1) : ((x & 1) == 0 ? 1 : 2); }

cv::Mat to_mosaic(const cv::Mat& rgb) {
  cv::Mat mosaic(rgb.size(), CV_32FC1);
  for (int y = 0; y < rgb.rows; ++y)
    for (int x = 0; x < rgb.cols; ++x) mosaic.at<float>(y, x) = rgb.at<cv::Vec3f>(y, x)[photosite(x, y)];
  return mosaic;
}

// Gradient-corrected linear interpolation, Malvar, He, Cutler 2004 ("High-quality linear interpolation for demosaicing
// of Bayer-patterned color images", fig. 2; coefficients in eighths, from memory). The border is mirrored, which keeps
// the colours of the mosaic in step.
cv::Mat from_mosaic(const cv::Mat& mosaic) {
  cv::Mat m;
  cv::copyMakeBorder(mosaic, m, 2, 2, 2, 2, cv::BORDER_REFLECT_101);
  cv::Mat rgb(mosaic.size(), CV_32FC3);
  for (int y = 0; y < mosaic.rows; ++y) {
    const float* r[5];
    for (int i = 0; i < 5; ++i) r[i] = m.ptr<float>(y + i);
    for (int x = 0; x < mosaic.cols; ++x) {
      const int i = x + 2;
      const float own = r[2][i];
      const float cross = r[1][i] + r[3][i] + r[2][i - 1] + r[2][i + 1];
      const float far_x = r[2][i - 2] + r[2][i + 2], far_y = r[0][i] + r[4][i];
      const float diagonal = r[1][i - 1] + r[1][i + 1] + r[3][i - 1] + r[3][i + 1];
      const float along_x = (5 * own + 4 * (r[2][i - 1] + r[2][i + 1]) - far_x - diagonal + 0.5f * far_y) / 8;
      const float along_y = (5 * own + 4 * (r[1][i] + r[3][i]) - far_y - diagonal + 0.5f * far_x) / 8;
      auto& out = rgb.at<cv::Vec3f>(y, x);
      if (photosite(x, y) == 1) {
        const bool red_row = (y & 1) == 0;
        out = red_row ? cv::Vec3f(along_x, own, along_y) : cv::Vec3f(along_y, own, along_x);
      } else {
        const float green = (4 * own + 2 * cross - far_x - far_y) / 8;
        const float opposite = (6 * own + 2 * diagonal - 1.5f * (far_x + far_y)) / 8;
        out = photosite(x, y) == 0 ? cv::Vec3f(own, green, opposite) : cv::Vec3f(opposite, green, own);
      }
    }
  }
  return rgb;
}

// An S-curve about the middle of the encoded scale that keeps 0 and 1: slope 1 + strength in the middle.
float s_curve(float value, float strength) {
  const float bend = value * (1 - value) * (2 * value - 1);  // 0 at 0, .5, 1; slope -1, .5, -1
  return std::clamp(value + 2 * strength * bend, 0.0f, 1.0f);
}

// Camera processing on the encoded picture (0..255, float, not rounded): noise reduction, then sharpening on luma.
void process(cv::Mat& encoded, const CameraSpec& camera) {
  if (camera.tone_contrast > 0) {
    encoded.forEach<cv::Vec3f>([&](cv::Vec3f& pixel, const int*) {
      for (int channel = 0; channel < 3; ++channel)
        pixel[channel] = 255 * s_curve(pixel[channel] / 255, static_cast<float>(camera.tone_contrast));
    });
  }
  if (camera.noise_reduction > 0 && camera.iso_speed > 0) {
    // Noise of a mid grey in codes, from the slope of the sRGB curve there.
    const NoiseModel noise = noise_of(camera.iso_speed);
    const double codes = 255 * 1.13 * std::sqrt(noise.slope * 0.18 + noise.floor);
    cv::Mat smooth;
    cv::bilateralFilter(encoded, smooth, 5, camera.noise_reduction * codes, 1.6);
    encoded = smooth;
  }
  if (camera.sharpening > 0) {
    cv::Mat luma, blurred;
    cv::transform(encoded, luma, cv::Matx13f(0.299f, 0.587f, 0.114f));
    cv::GaussianBlur(luma, blurred, {}, camera.sharpening_radius_px, camera.sharpening_radius_px, cv::BORDER_REFLECT_101);
    cv::Mat detail = (luma - blurred) * camera.sharpening;
    cv::Mat planes[] = {detail, detail, detail}, all;
    cv::merge(planes, 3, all);
    encoded += all;
  }
}

cv::Mat luma_of(const cv::Mat& rgb) {
  cv::Mat luma;
  cv::transform(rgb, luma, cv::Matx13f(0.299f, 0.587f, 0.114f));  // JFIF, ITU-T T.871
  return luma;
}

struct JpegFault {
  jpeg_error_mgr manager;
  std::jmp_buf jump;
};

void leave(j_common_ptr info) { std::longjmp(reinterpret_cast<JpegFault*>(info->err)->jump, 1); }

// Decodes into `out`, whose type chooses grey (the Y plane itself) or RGB. False where the bytes are no JPEG.
bool decode_into(const std::vector<std::uint8_t>& jpeg, J_COLOR_SPACE space, cv::Mat& out) {
  jpeg_decompress_struct info;
  JpegFault fault;
  info.err = jpeg_std_error(&fault.manager);
  fault.manager.error_exit = leave;
  jpeg_create_decompress(&info);
  if (setjmp(fault.jump)) {
    jpeg_destroy_decompress(&info);
    return false;
  }
  jpeg_mem_src(&info, jpeg.data(), static_cast<unsigned long>(jpeg.size()));
  jpeg_read_header(&info, TRUE);
  info.out_color_space = space;
  info.dct_method = JDCT_ISLOW;
  info.do_fancy_upsampling = FALSE;  // chroma as the file holds it, the meaning that clipping is counted by
  jpeg_start_decompress(&info);
  out.create(static_cast<int>(info.output_height), static_cast<int>(info.output_width),
             space == JCS_GRAYSCALE ? CV_8UC1 : CV_8UC3);
  while (info.output_scanline < info.output_height) {
    JSAMPROW line = out.ptr<std::uint8_t>(static_cast<int>(info.output_scanline));
    jpeg_read_scanlines(&info, &line, 1);
  }
  jpeg_finish_decompress(&info);
  jpeg_destroy_decompress(&info);
  return true;
}

}  // namespace

NoiseModel noise_of(double iso_speed) {
  if (iso_speed <= 0) return {};
  const double electrons = kElectronsAtIso100 * 100 / iso_speed;
  return {1 / electrons, (kReadNoiseElectrons / electrons) * (kReadNoiseElectrons / electrons)};
}

float srgb_encode(float linear) {
  const float v = std::clamp(linear, 0.0f, 1.0f);
  return v <= 0.0031308f ? 12.92f * v : 1.055f * std::pow(v, 1 / 2.4f) - 0.055f;
}

float srgb_decode(float encoded) {
  return encoded <= 0.04045f ? encoded / 12.92f : std::pow((encoded + 0.055f) / 1.055f, 2.4f);
}

std::vector<std::uint8_t> encode_jpeg(const cv::Mat& rgb, int quality, ChromaSampling chroma) {
  jpeg_compress_struct info;
  jpeg_error_mgr manager;
  info.err = jpeg_std_error(&manager);
  jpeg_create_compress(&info);
  unsigned char* bytes = nullptr;
  unsigned long size = 0;
  jpeg_mem_dest(&info, &bytes, &size);
  info.image_width = static_cast<JDIMENSION>(rgb.cols);
  info.image_height = static_cast<JDIMENSION>(rgb.rows);
  info.input_components = 3;
  info.in_color_space = JCS_RGB;
  jpeg_set_defaults(&info);
  jpeg_set_quality(&info, quality, TRUE);
  info.dct_method = JDCT_ISLOW;
  info.optimize_coding = TRUE;
  info.comp_info[0].h_samp_factor = info.comp_info[0].v_samp_factor = chroma == ChromaSampling::half ? 2 : 1;
  jpeg_start_compress(&info, TRUE);
  while (info.next_scanline < info.image_height) {
    JSAMPROW line = const_cast<JSAMPROW>(rgb.ptr<std::uint8_t>(static_cast<int>(info.next_scanline)));
    jpeg_write_scanlines(&info, &line, 1);
  }
  jpeg_finish_compress(&info);
  std::vector<std::uint8_t> jpeg(bytes, bytes + size);
  jpeg_destroy_compress(&info);
  std::free(bytes);
  return jpeg;
}

// Mean of the first nine alternating quantisers of table 0, which encode_jpeg writes first, 8 bits each in zigzag order
// (ITU-T T.81, B.2.4.1: FF DB, length, precision and number, 64 values).
static double luma_quantiser(const std::vector<std::uint8_t>& jpeg) {
  for (std::size_t i = 0; i + 69 < jpeg.size(); ++i) {
    if (jpeg[i] != 0xFF || jpeg[i + 1] != 0xDB || jpeg[i + 4] != 0) continue;
    double sum = 0;
    for (std::size_t k = 1; k <= 9; ++k) sum += jpeg[i + 5 + k];
    return sum / 9;
  }
  return 0;
}

Picture decode_jpeg(std::vector<std::uint8_t> jpeg) {
  Picture picture;
  picture.coding_step_codes = luma_quantiser(jpeg);
  if (!decode_into(jpeg, JCS_GRAYSCALE, picture.luma) || !decode_into(jpeg, JCS_RGB, picture.rgb))
    CV_Error(cv::Error::StsParseError, "the renderer's own JPEG could not be read back");
  picture.jpeg = std::move(jpeg);
  return picture;
}

Picture develop(const cv::Mat& linear, const CameraSpec& camera, Random random) {
  cv::Mat light;
  if (linear.channels() == 3) {
    light = linear.clone();
  } else {
    // A neutral scene on a sensor with a mosaic still has independent noise in its three colours.
    cv::merge(std::vector<cv::Mat>{linear, linear, linear}, light);
  }
  // Photosites clip before anything else happens to their values.
  if (camera.mosaic) {
    cv::Mat mosaic = to_mosaic(light);
    add_noise(mosaic, camera.iso_speed, random);
    mosaic = cv::min(cv::max(mosaic, 0.0), 1.0);
    light = from_mosaic(mosaic);
  } else {
    add_noise(light, camera.iso_speed, random);
  }
  light.forEach<cv::Vec3f>([](cv::Vec3f& pixel, const int*) {
    for (int channel = 0; channel < 3; ++channel) pixel[channel] = encode_fast(pixel[channel]);
  });
  process(light, camera);
  Picture picture;
  light.convertTo(picture.rgb, CV_8U);  // rounds to nearest and saturates
  if (camera.jpeg_quality > 0) return decode_jpeg(encode_jpeg(picture.rgb, camera.jpeg_quality, camera.chroma));
  picture.luma = luma_of(picture.rgb);
  return picture;
}

}  // namespace focusfall::render
