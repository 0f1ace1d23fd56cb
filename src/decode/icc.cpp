#include "src/decode/icc.h"

#include <lcms2.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <memory>
#include <utility>

namespace focusfall {
namespace {

struct CloseProfile {
  void operator()(void* profile) const { cmsCloseProfile(profile); }
};
struct DeleteTransform {
  void operator()(void* transform) const { cmsDeleteTransform(transform); }
};
using Profile = std::unique_ptr<void, CloseProfile>;
using Transform = std::unique_ptr<void, DeleteTransform>;

// A curve that rises by less than this over the whole range says nothing about light (judgement).
constexpr double kLeastRise = 1e-6;

const cmsToneCurve* tone_curve(const Profile& profile, cmsTagSignature tag) {
  return static_cast<const cmsToneCurve*>(cmsReadTag(profile.get(), tag));
}

double code_value(int code, int code_count) { return static_cast<double>(code) / (code_count - 1); }

std::vector<double> grey_curve(const Profile& profile, int code_count) {
  const cmsToneCurve* curve = tone_curve(profile, cmsSigGrayTRCTag);
  if (curve == nullptr) return {};
  std::vector<double> values(static_cast<std::size_t>(code_count));
  for (int code = 0; code < code_count; ++code) {
    values[static_cast<std::size_t>(code)] =
        static_cast<double>(cmsEvalToneCurveFloat(curve, static_cast<float>(code_value(code, code_count))));
  }
  return values;
}

// ICC.1:2022, annex F.3: linear = TRC(code) per channel, Y = sum of linear times the colorant's Y.
std::vector<double> matrix_curve(const Profile& profile, int code_count) {
  constexpr std::array kCurves = {cmsSigRedTRCTag, cmsSigGreenTRCTag, cmsSigBlueTRCTag};
  constexpr std::array kColorants = {cmsSigRedColorantTag, cmsSigGreenColorantTag, cmsSigBlueColorantTag};
  std::vector<double> values(static_cast<std::size_t>(code_count), 0);
  for (std::size_t channel = 0; channel < 3; ++channel) {
    const cmsToneCurve* curve = tone_curve(profile, kCurves[channel]);
    const auto* colorant = static_cast<const cmsCIEXYZ*>(cmsReadTag(profile.get(), kColorants[channel]));
    if (curve == nullptr || colorant == nullptr) return {};
    for (int code = 0; code < code_count; ++code) {
      const float linear = cmsEvalToneCurveFloat(curve, static_cast<float>(code_value(code, code_count)));
      values[static_cast<std::size_t>(code)] += colorant->Y * static_cast<double>(linear);
    }
  }
  return values;
}

// The luminance that the profile's table gives to neutral codes, relative colorimetric, nothing optimised away.
std::vector<double> table_curve(const Profile& profile, int channels, int code_count) {
  const Profile xyz(cmsCreateXYZProfile());
  const cmsUInt32Number type = channels == 1 ? TYPE_GRAY_DBL : TYPE_RGB_DBL;
  const Transform transform(cmsCreateTransform(profile.get(), type, xyz.get(), TYPE_XYZ_DBL,
                                               INTENT_RELATIVE_COLORIMETRIC, cmsFLAGS_NOOPTIMIZE | cmsFLAGS_NOCACHE));
  if (!transform) return {};
  std::vector<double> values(static_cast<std::size_t>(code_count));
  for (int code = 0; code < code_count; ++code) {
    const double x = code_value(code, code_count);
    const std::array<double, 3> in = {x, x, x};
    cmsCIEXYZ out{};
    cmsDoTransform(transform.get(), in.data(), &out, 1);
    values[static_cast<std::size_t>(code)] = out.Y;
  }
  return values;
}

// Never decreasing, 1.0 at the end; empty where that cannot be made of it.
std::vector<float> normalised(const std::vector<double>& values) {
  if (values.empty() || !std::isfinite(values.back()) || values.back() - std::max(values.front(), 0.0) < kLeastRise) {
    return {};
  }
  std::vector<float> curve(values.size());
  double highest = 0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (!std::isfinite(values[i])) return {};
    highest = std::max(highest, values[i] / values.back());
    curve[i] = static_cast<float>(std::min(highest, 1.0));
  }
  return curve;
}

ProfileCurve unusable(std::string seen) {
  return {{}, DecodeNote{"profile-unusable", "the colour profile " + std::move(seen) + "; sRGB was assumed"}};
}

}  // namespace

ProfileCurve profile_curve(std::span<const std::byte> bytes, int channels, int code_count) {
  // A context of its own: its error handler prints nothing, and threads share no state.
  const std::unique_ptr<std::remove_pointer_t<cmsContext>, decltype(&cmsDeleteContext)> context(
      cmsCreateContext(nullptr, nullptr), &cmsDeleteContext);
  const Profile profile(cmsOpenProfileFromMemTHR(context.get(), bytes.data(), static_cast<cmsUInt32Number>(bytes.size())));
  if (!profile) return unusable("cannot be read");
  const auto expected = channels == 1 ? cmsSigGrayData : cmsSigRgbData;
  if (cmsGetColorSpace(profile.get()) != expected) {
    return unusable(channels == 1 ? "is not one for grey pictures" : "is not one for RGB pictures");
  }

  ProfileCurve result;
  if (cmsIsTag(profile.get(), cmsSigAToB0Tag) == 0) {
    result.linear_of_code = normalised(channels == 1 ? grey_curve(profile, code_count) : matrix_curve(profile, code_count));
  } else {
    result.linear_of_code = normalised(table_curve(profile, channels, code_count));
    result.note = DecodeNote{"profile-of-tables",
                             "the colour profile holds tables: the picture was linearised along their neutral axis"};
  }
  if (result.linear_of_code.empty()) return unusable("holds no rising tone curve");
  return result;
}

void apply_profile(std::span<const std::byte> profile, PictureFormat& format) {
  if (profile.empty()) return;
  ProfileCurve read = profile_curve(profile, format.channels, format.bits > 8 ? 65536 : 256);
  if (read.note) format.notes.push_back(*std::move(read.note));
  if (read.linear_of_code.empty()) return;
  format.linear_of_code = std::move(read.linear_of_code);
  format.transfer = Transfer::profile;
}

std::vector<float> power_curve(double exponent, int code_count) {
  std::vector<float> curve(static_cast<std::size_t>(code_count));
  for (int code = 0; code < code_count; ++code) {
    curve[static_cast<std::size_t>(code)] = static_cast<float>(std::pow(code_value(code, code_count), exponent));
  }
  return curve;
}

}  // namespace focusfall
