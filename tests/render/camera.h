// From linear light on the photosites to the 8-bit picture a camera delivers.
#pragma once

#include <cstdint>
#include <opencv2/core.hpp>
#include <vector>

#include "tests/render/random.h"

namespace focusfall::render {

enum class ChromaSampling { full, half };  // 4:4:4 and 4:2:0

struct CameraSpec {
  double iso_speed = 100;            // sets the noise, see noise_of(); 0 = no noise at all
  bool mosaic = false;               // sample through a Bayer mosaic (RGGB) and interpolate (Malvar, He, Cutler 2004)
  double noise_reduction = 0;        // 0 = none; range of a bilateral filter in standard deviations of the noise
  double sharpening = 0;             // 0 = none; gain of an unsharp mask on the encoded luma
  double sharpening_radius_px = 1;   // standard deviation of its Gaussian
  double tone_contrast = 0;          // 0 = plain sRGB curve; > 0 adds an S-curve of this strength (0.3 is a usual look)
  int jpeg_quality = 0;              // 0 = no JPEG round trip
  ChromaSampling chroma = ChromaSampling::full;
};

// Variance of the noise in linear light (1.0 = clipping level): variance = slope * signal + floor.
struct NoiseModel {
  double slope = 0;
  double floor = 0;
};
NoiseModel noise_of(double iso_speed);

// A developed picture. luma is Y of JFIF as a JPEG decoder delivers it; rgb is in the order R, G, B.
struct Picture {
  cv::Mat luma;                      // CV_8UC1
  cv::Mat rgb;                       // CV_8UC3
  double coding_step_codes = 0;      // mean luma quantiser of the nine lowest frequencies; 0 without a round trip
  std::vector<std::uint8_t> jpeg;    // the file's bytes where a round trip was asked for
};

// linear: CV_32FC1 or CV_32FC3 (R, G, B), 1.0 = clipping level, more than 1 clips.
Picture develop(const cv::Mat& linear, const CameraSpec& camera, Random random);

// sRGB (IEC 61966-2-1). encode clips to 0..1 and returns 0..1.
float srgb_encode(float linear);
float srgb_decode(float encoded);

std::vector<std::uint8_t> encode_jpeg(const cv::Mat& rgb, int quality, ChromaSampling chroma);
Picture decode_jpeg(std::vector<std::uint8_t> jpeg);

}  // namespace focusfall::render
