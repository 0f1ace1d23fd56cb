#include "tests/render/tile.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <opencv2/imgproc.hpp>

#include "tests/render/scene.h"

namespace focusfall::render {
namespace {

constexpr int kOversampling = 4;
// Beyond the disc's edge the line spread is zero, but the Airy pattern has a long tail: so many lambda N / p are kept
// around the tile before the transform wraps (encircled energy there 99 %, rest is spread evenly).
constexpr double kAiryReach = 10;

int margin_px(const BlurSpec& blur) {
  return static_cast<int>(
      std::ceil(blur.disc_px / 2 + blur.motion_px / 2 + kAiryReach * blur.lambda_n_over_p_px + 2));
}

// Product of the transfer functions that are not radial, tabulated over one axis pair.
struct SystemOtf {
  SystemOtf(const BlurSpec& blur, int samples) : radial(blur.disc_px, blur.lambda_n_over_p_px, 3.0) {
    const double angle = blur.motion_angle_deg * std::numbers::pi / 180;
    motion_x = blur.motion_px * std::cos(angle);
    motion_y = blur.motion_px * std::sin(angle);
    // The canvas antialiases with a box of one sample; taken out again, the pixel aperture alone is left.
    for (int k = 0; k < samples; ++k) {
      const int centred = k <= samples / 2 ? k : k - samples;
      const double f = static_cast<double>(centred) * kOversampling / samples;
      frequency.push_back(static_cast<float>(f));
      aperture.push_back(static_cast<float>(sinc(f) / sinc(f / kOversampling)));
    }
  }
  float operator()(int kx, int ky) const {
    const float fx = frequency[static_cast<std::size_t>(kx)], fy = frequency[static_cast<std::size_t>(ky)];
    float value = radial(std::sqrt(fx * fx + fy * fy)) * aperture[static_cast<std::size_t>(kx)] *
                  aperture[static_cast<std::size_t>(ky)];
    if (motion_x != 0 || motion_y != 0) value *= static_cast<float>(sinc(fx * motion_x + fy * motion_y));
    return value;
  }
  RadialOtf radial;
  double motion_x = 0, motion_y = 0;
  std::vector<float> frequency, aperture;
};

// One plane, n*kOversampling samples, to n pixels: transform, multiply, fold the bands above the pixels' Nyquist
// frequency onto it (this is the sampling at pixel centres) and transform back.
cv::Mat blur_and_sample(const cv::Mat& fine, const SystemOtf& otf) {
  const int big = fine.cols, n = big / kOversampling;
  cv::Mat spectrum, small(n, n, CV_32FC2);
  cv::dft(fine, spectrum, cv::DFT_COMPLEX_OUTPUT);
  for (int y = 0; y < n; ++y) {
    auto* out = small.ptr<std::complex<float>>(y);
    std::fill(out, out + n, std::complex<float>{});
    for (int ky = y; ky < big; ky += n) {
      const auto* line = spectrum.ptr<std::complex<float>>(ky);
      for (int kx = 0; kx < big; kx += n)
        for (int x = 0; x <= n / 2; ++x) out[x] += line[kx + x] * otf(kx + x, ky);
    }
  }
  // The other half by the symmetry of a real picture.
  for (int y = 0; y < n; ++y)
    for (int x = n / 2 + 1; x < n; ++x)
      small.at<cv::Vec2f>(y, x) = {small.at<cv::Vec2f>((n - y) % n, n - x)[0],
                                   -small.at<cv::Vec2f>((n - y) % n, n - x)[1]};
  cv::Mat picture;
  cv::dft(small, picture, cv::DFT_INVERSE | cv::DFT_REAL_OUTPUT | cv::DFT_SCALE);
  return picture / (kOversampling * kOversampling);
}

}  // namespace

cv::Mat render_linear_tile(const TileSpec& spec) {
  const int margin = margin_px(spec.blur);
  const int pixels = cv::getOptimalDFTSize(spec.size_px + 2 * margin);
  const int offset = (pixels - spec.size_px) / 2;
  Canvas canvas(pixels * kOversampling, spec.colour > 0 ? 3 : 1, kOversampling, -offset);
  draw_scene(canvas, spec);
  const SystemOtf otf(spec.blur, pixels * kOversampling);
  std::vector<cv::Mat> fine, planes;
  cv::split(canvas.picture(), fine);
  for (const cv::Mat& plane : fine) {
    const cv::Mat whole = blur_and_sample(plane, otf);
    planes.push_back(whole(cv::Rect(offset, offset, spec.size_px, spec.size_px)).clone());
  }
  cv::Mat picture;
  cv::merge(planes, picture);
  return picture * spec.exposure;
}

Picture render_tile(const TileSpec& spec) {
  return develop(render_linear_tile(spec), spec.camera, Random(spec.random_key).branch(2));
}

double lsf_variance_px2(const BlurSpec& blur, double normal_angle_deg) {
  const double turn = (normal_angle_deg - blur.motion_angle_deg) * std::numbers::pi / 180;
  const double along = blur.motion_px * std::cos(turn);
  return blur.disc_px * blur.disc_px / 16 + along * along / 12 + 1.0 / 12;
}

const char* texture_name(Texture texture) {
  switch (texture) {
    case Texture::polygons: return "polygons";
    case Texture::dead_leaves: return "dead leaves";
    case Texture::mixed: return "mixed";
    case Texture::grass: return "grass";
    case Texture::gravel: return "gravel";
    case Texture::step_edges: return "step edges";
    case Texture::power_law: return "power law";
    case Texture::smooth: return "smooth";
    case Texture::flat: return "flat";
  }
  return "unknown";
}

}  // namespace focusfall::render
