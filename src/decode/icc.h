// What the colour profile of a picture says about its tone curve.
//
// The estimators need one curve from code to linear light. It is read along the neutral axis of the profile: for a
// profile of matrix and curves that is the sum of the three curves weighted with the luminance of their colorants,
// exact for neutral edges; for a profile of tables it is the luminance that the table gives to R = G = B.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "src/decode/decoder.h"

namespace focusfall {

// `linear_of_code` is empty where the profile cannot be used: then sRGB is to be assumed, and `note` says why.
struct ProfileCurve {
  std::vector<float> linear_of_code;     // code_count entries, never decreasing, last entry 1.0
  std::optional<DecodeNote> note;
};

// `channels` is 1 or 3 as the picture is delivered, `code_count` 256 or 65536.
ProfileCurve profile_curve(std::span<const std::byte> profile, int channels, int code_count);

// Sets format.transfer and format.linear_of_code from an embedded profile; an empty one leaves sRGB assumed.
void apply_profile(std::span<const std::byte> profile, PictureFormat& format);

// A pure power curve: linear = code^exponent. Used where a file states a gamma and no profile.
std::vector<float> power_curve(double exponent, int code_count);

}  // namespace focusfall
