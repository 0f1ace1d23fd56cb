#include "metadata/standard_exif.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <chrono>
#include <cmath>
#include <cstdio>

#include "metadata/focus_area.h"
#include "metadata/focus_distance.h"

namespace focusfall {
namespace {

// Years in which a photograph with capture data can have been taken: the first edition of Exif is of 1995, and
// makers' own forms are a few years older (judgement).
constexpr int kFirstYear = 1988;
constexpr int kLastYear = 2150;

// A rational of which all bits of the numerator are set says "infinite" for a distance (Exif 2.32, SubjectDistance).
constexpr std::int64_t kAllBits = 0xFFFFFFFF;

// A quantity from its tag. What is no number, n/0 and 0/0 among it, is remarked.
std::optional<double> real_or_remark(const ExifTags& tags, std::string_view key, const Plausible& limits,
                                     Remarks& remarks) {
  if (!tags.has(key)) return std::nullopt;
  const auto value = tags.real(key);
  if (value) return plausible(*value, limits, remarks);
  if (const auto ratio = tags.ratio(key)) {
    remark_absurd(limits.name, fmt::format("{}/{}", ratio->numerator, ratio->denominator),
                  fmt::format("{:g} to {:g}{}", limits.least, limits.greatest, limits.unit), remarks);
  } else {
    remark_absurd(limits.name, "something that is no number", "a number", remarks);
  }
  return std::nullopt;
}

template <class T>
void set(OptionalSourced<T>& field, std::optional<T> value, Source source = Source::exif) {
  if (value) field = Sourced<T>{std::move(*value), source};
}

// The first of the keys that holds text.
std::optional<std::string> first_text(const ExifTags& tags, std::initializer_list<const char*> keys) {
  for (const char* key : keys) {
    if (auto text = tags.text(key)) return text;
  }
  return std::nullopt;
}

// ---- who ------------------------------------------------------------------------------------------------------------

// What companies call themselves beside their name, left away at its end.
constexpr std::array<std::string_view, 12> kCompanyWords = {"CORPORATION", "CORP.",     "CORP",    "IMAGING",
                                                            "OPTICAL",     "COMPANY",   "CO.,LTD", "CO.,LTD.",
                                                            "Co., Ltd.",   "CO., LTD.", "CAMERA",  "AG"};

std::string without_company_words(std::string make) {
  for (bool again = true; again;) {
    again = false;
    for (const std::string_view word : kCompanyWords) {
      if (make.size() > word.size() + 1 && make.ends_with(word) && make[make.size() - word.size() - 1] == ' ') {
        make = trimmed(make.substr(0, make.size() - word.size()));
        again = true;
      }
    }
  }
  return make;
}

bool starts_with_word(const std::string& text, const std::string& word) {
  const auto same = [](char a, char b) {
    return std::tolower(static_cast<unsigned char>(a)) == std::tolower(static_cast<unsigned char>(b));
  };
  return text.size() >= word.size() && std::equal(word.begin(), word.end(), text.begin(), same);
}

std::optional<std::string> camera_name(const ExifTags& tags) {
  const auto make = tags.text("Exif.Image.Make");
  const auto model = tags.text("Exif.Image.Model");
  if (!model) return make;
  if (!make) return model;
  const std::string maker = without_company_words(*make);
  const std::string first_word = maker.substr(0, maker.find(' '));
  return starts_with_word(*model, first_word) ? *model : maker + " " + *model;
}

void read_identity(const ExifTags& tags, Capture& capture) {
  set(capture.camera, camera_name(tags));
  // Bodies write "----" or "0.0 mm f/0.0" for a lens that does not tell its name.
  if (auto lens = tags.text("Exif.Photo.LensModel");
      lens && lens->find_first_not_of("- ") != std::string::npos && !lens->starts_with("0.0 mm")) {
    set(capture.lens, lens);
  }
  set(capture.lens_serial, first_text(tags, {"Exif.Photo.LensSerialNumber"}));
  set(capture.body_serial, first_text(tags, {"Exif.Photo.BodySerialNumber", "Exif.Image.CameraSerialNumber"}));
  set(capture.software, first_text(tags, {"Exif.Image.Software", "Exif.Image.ProcessingSoftware"}));
}

// ---- when -----------------------------------------------------------------------------------------------------------

struct TimeKeys {
  const char* time;
  const char* fraction;
  const char* zone;
};

// Image.DateTime is when the file was changed and says nothing about the photograph.
constexpr std::array<TimeKeys, 3> kTimeKeys = {{
    {"Exif.Photo.DateTimeOriginal", "Exif.Photo.SubSecTimeOriginal", "Exif.Photo.OffsetTimeOriginal"},
    {"Exif.Photo.DateTimeDigitized", "Exif.Photo.SubSecTimeDigitized", "Exif.Photo.OffsetTimeDigitized"},
    {"Exif.Image.DateTimeOriginal", "Exif.Photo.SubSecTimeOriginal", "Exif.Photo.OffsetTimeOriginal"},
}};

// Unknown times are written with blanks, or zeros, in place of the digits.
bool says_unknown_time(const std::string& text) {
  return text.find_first_of("123456789") == std::string::npos;
}

void read_time(const ExifTags& tags, Capture& capture, Remarks& remarks) {
  for (const TimeKeys& keys : kTimeKeys) {
    const auto time = tags.text(keys.time);
    if (!time || says_unknown_time(*time)) continue;
    const auto iso = iso_time(*time, tags.text(keys.fraction).value_or(""), tags.text(keys.zone).value_or(""));
    if (iso) {
      capture.taken_at = Sourced<std::string>{*iso, Source::exif};
      return;
    }
    remark_absurd("time taken", fmt::format("\"{}\"", *time),
                  fmt::format("YYYY:MM:DD hh:mm:ss between {} and {}", kFirstYear, kLastYear), remarks);
  }
}

// ---- exposure -------------------------------------------------------------------------------------------------------

// f-number from FNumber, else from the APEX value: N = 2^(Av/2).
void read_f_number(const ExifTags& tags, Capture& capture, Remarks& remarks) {
  for (const char* key : {"Exif.Photo.FNumber", "Exif.Image.FNumber"}) {
    if (const auto value = real_or_remark(tags, key, kFNumber, remarks)) return set(capture.f_number, value);
  }
  for (const char* key : {"Exif.Photo.ApertureValue", "Exif.Image.ApertureValue"}) {
    // A zero is written where the lens tells nothing, so that f/1.0 by this tag alone is not believed.
    const auto apex = tags.real(key);
    if (!apex || *apex == 0) continue;
    if (const auto value = plausible(std::exp2(*apex / 2), kFNumber, remarks)) return set(capture.f_number, value);
  }
}

// Exposure time from ExposureTime, else from the APEX value: t = 2^-Tv.
void read_exposure_time(const ExifTags& tags, Capture& capture, Remarks& remarks) {
  for (const char* key : {"Exif.Photo.ExposureTime", "Exif.Image.ExposureTime"}) {
    if (const auto value = real_or_remark(tags, key, kExposureTime, remarks))
      return set(capture.exposure_time_s, value);
  }
  for (const char* key : {"Exif.Photo.ShutterSpeedValue", "Exif.Image.ShutterSpeedValue"}) {
    const auto apex = tags.real(key);
    if (!apex) continue;
    if (const auto value = plausible(std::exp2(-*apex), kExposureTime, remarks))
      return set(capture.exposure_time_s, value);
  }
}

// Speeds above 65535 do not fit into the first tag; SensitivityType says which of the three long ones holds it
// (Exif 2.32, table of SensitivityType). Every one of a combination gives the same speed; the first that is there is
// taken.
std::optional<double> long_speed(const ExifTags& tags) {
  static constexpr const char* kOutput = "Exif.Photo.StandardOutputSensitivity";
  static constexpr const char* kIndex = "Exif.Photo.RecommendedExposureIndex";
  static constexpr const char* kSpeed = "Exif.Photo.ISOSpeed";
  std::vector<const char*> keys;
  switch (tags.integer("Exif.Photo.SensitivityType").value_or(0)) {
    case 1:
      keys = {kOutput};
      break;
    case 2:
      keys = {kIndex};
      break;
    case 3:
      keys = {kSpeed};
      break;
    case 4:
      keys = {kOutput, kIndex};
      break;
    case 5:
      keys = {kOutput, kSpeed};
      break;
    case 6:
      keys = {kIndex, kSpeed};
      break;
    default:
      keys = {kOutput, kIndex, kSpeed};
      break;
  }
  for (const char* key : keys) {
    if (const auto value = tags.real(key); value && *value > 0) return value;
  }
  return std::nullopt;
}

// The tag may hold two numbers of which one is 0 ("200 0", "0 200").
std::optional<double> short_speed(const ExifTags& tags) {
  for (const char* key : {"Exif.Photo.ISOSpeedRatings", "Exif.Image.ISOSpeedRatings"}) {
    for (std::size_t i = 0; i < std::min<std::size_t>(tags.count(key), 4); ++i) {
      if (const auto value = tags.real(key, i); value && *value > 0) return value;
    }
  }
  return std::nullopt;
}

void read_iso_speed(const ExifTags& tags, Capture& capture, Remarks& remarks) {
  constexpr double kDoesNotFit = 65535;
  auto speed = short_speed(tags);
  if (!speed || *speed >= kDoesNotFit) {
    if (const auto longer = long_speed(tags)) speed = longer;
  }
  if (speed) set(capture.iso_speed, plausible(*speed, kIsoSpeed, remarks));
}

// ExposureMode: 0 automatic, 1 manual, 2 bracket. Many cameras say "manual" by ExposureProgram = 1 alone.
void read_exposure_mode(const ExifTags& tags, Capture& capture) {
  const auto mode = tags.integer("Exif.Photo.ExposureMode");
  auto program = tags.integer("Exif.Photo.ExposureProgram");
  if (!program) program = tags.integer("Exif.Image.ExposureProgram");
  std::optional<ExposureMode> found;
  if (mode == 2) {
    found = ExposureMode::bracket;
  } else if (mode == 1 || program == 1) {
    found = ExposureMode::manual;
  } else if (mode == 0 || (program >= 2 && program <= 8)) {
    found = ExposureMode::automatic;
  }
  set(capture.exposure_mode, found);
}

// A numerator of which all bits are set says "not known" (Exif 2.32, BrightnessValue); the number is signed.
std::optional<double> brightness_or_remark(const ExifTags& tags, const std::string& key, Remarks& remarks) {
  const auto ratio = tags.ratio(key);
  if (ratio && (ratio->numerator == -1 || ratio->numerator == kAllBits)) return std::nullopt;
  return real_or_remark(tags, key, kBrightness, remarks);
}

void read_exposure(const ExifTags& tags, Capture& capture, Remarks& remarks) {
  for (const char* key : {"Exif.Photo.FocalLength", "Exif.Image.FocalLength"}) {
    if (capture.focal_length_mm) break;
    set(capture.focal_length_mm, real_or_remark(tags, key, kFocalLength, remarks));
  }
  read_f_number(tags, capture, remarks);
  read_exposure_time(tags, capture, remarks);
  read_iso_speed(tags, capture, remarks);
  for (const std::string group : {"Exif.Photo.", "Exif.Image."}) {
    if (!capture.exposure_bias_ev) {
      set(capture.exposure_bias_ev, real_or_remark(tags, group + "ExposureBiasValue", kExposureBias, remarks));
    }
    if (!capture.brightness_apex) {
      set(capture.brightness_apex, brightness_or_remark(tags, group + "BrightnessValue", remarks));
    }
    const auto flash = tags.integer(group + "Flash");
    if (flash && !capture.flash_fired) capture.flash_fired = Sourced<bool>{(*flash & 1) != 0, Source::exif};
  }
  read_exposure_mode(tags, capture);
  if (const auto sharpening = tags.integer("Exif.Photo.Sharpness"); sharpening >= 0 && sharpening <= 2) {
    capture.sharpening = static_cast<int>(*sharpening);
  }
}

// ---- where focus was ------------------------------------------------------------------------------------------------

// Exif 2.32: numerator 0 is "unknown", 0xFFFFFFFF "infinity". The interval is half a unit of the last place written.
void read_subject_distance(const ExifTags& tags, Capture& capture, Remarks& remarks) {
  const char* key =
      tags.has("Exif.Photo.SubjectDistance") ? "Exif.Photo.SubjectDistance" : "Exif.Image.SubjectDistance";
  const auto ratio = tags.ratio(key);
  if (!ratio || ratio->numerator == 0) return;
  if (ratio->numerator == kAllBits) {
    capture.focus_distance = Sourced<FocusDistance>{distance_at_infinity(kInfinityFromM), Source::exif};
    return;
  }
  if (const auto value = real_or_remark(tags, key, kDistance, remarks)) {
    const double half_unit_m = 0.5 / static_cast<double>(std::abs(ratio->denominator));
    capture.focus_distance = Sourced<FocusDistance>{
        {*value, std::max(0.0, *value - half_unit_m), *value + half_unit_m, false}, Source::exif};
  }
}

// Phones write a box about the centre when nobody chose anything: 55 % x 44 % of a 4:3 frame, and of a square cut from
// it the same in pixels; older ones a box of 27 % x 36 %. One that somebody chose is hardly ever in the very centre.
bool is_phone_default(const FractionRect& box, DecodedSize size, const std::string& make) {
  constexpr double kNear = 0.02;
  const double off_x = std::abs(box.x + box.width / 2 - 0.5), off_y = std::abs(box.y + box.height / 2 - 0.5);
  if (off_x > kNear || off_y > kNear || box.width <= 0 || box.height <= 0) return false;
  constexpr double kDefaultHeight = 0.44, kDefaultShape = 0.55 * 4 / (0.44 * 3);
  const double shape = box.width * size.width_px / (box.height * size.height_px);
  if (std::abs(box.height - kDefaultHeight) < kNear && std::abs(shape / kDefaultShape - 1) < kNear) return true;
  const bool in_very_centre = off_x * size.width_px <= 2 && off_y * size.height_px <= 2;
  return make == "Apple" && in_very_centre;
}

// SubjectArea: two values are a point, three a circle (centre, diameter), four a box (centre, width, height).
std::optional<FractionRect> subject_box(const ExifTags& tags, const char* key, DecodedSize size) {
  const std::size_t count = tags.count(key);
  if (count < 2 || count > 4 || size.width_px <= 0 || size.height_px <= 0) return std::nullopt;
  std::array<double, 4> v{};
  for (std::size_t i = 0; i < count; ++i) {
    const auto value = tags.real(key, i);
    if (!value || *value < 0) return std::nullopt;
    v[i] = *value;
  }
  const double width = count == 2 ? 0 : v[2];
  const double height = count == 4 ? v[3] : width;
  return FractionRect{.x = (v[0] - width / 2) / size.width_px,
                      .y = (v[1] - height / 2) / size.height_px,
                      .width = width / size.width_px,
                      .height = height / size.height_px};
}

std::optional<DecodedSize> size_in(const ExifTags& tags, const std::string& width_key, const std::string& height_key) {
  constexpr std::int64_t kLargestSide = 1 << 20;  // judgement: larger than any picture that can be decoded
  const auto width = tags.integer(width_key), height = tags.integer(height_key);
  if (!width || !height || *width < 1 || *height < 1 || *width > kLargestSide || *height > kLargestSide) {
    return std::nullopt;
  }
  return DecodedSize{static_cast<int>(*width), static_cast<int>(*height)};
}

void read_subject_area(const ExifTags& tags, DecodedSize decoded, Capture& capture, Remarks& remarks) {
  const DecodedSize size = recorded_size(tags).value_or(decoded);
  const std::string make = tags.text("Exif.Image.Make").value_or("");
  for (const char* key : {"Exif.Photo.SubjectArea", "Exif.Photo.SubjectLocation", "Exif.Image.SubjectLocation"}) {
    const auto box = subject_box(tags, key, size);
    if (!box || is_phone_default(*box, size, make)) continue;
    const double centre_x = box->x + box->width / 2, centre_y = box->y + box->height / 2;
    if (!lies_in_frame(*box)) {
      remark_absurd("subject area", fmt::format("centred at {:.3g}, {:.3g} of the frame", centre_x, centre_y),
                    "a place inside the frame", remarks);
      continue;
    }
    // A corner of zeros is how writers leave the tag unset.
    if (centre_x == 0 && centre_y == 0) continue;
    capture.focus_areas.push_back({*box, FocusAreaKind::subject_area, Source::exif});
    return;
  }
}

}  // namespace

std::optional<std::string> iso_time(const std::string& exif_time, const std::string& fraction,
                                    const std::string& zone) {
  int year = 0, month = 0, day = 0, hour = 0, minute = 0, second = 0;
  if (std::sscanf(exif_time.c_str(), "%4d%*1[:-]%2d%*1[:-]%2d%*1[ T]%2d:%2d:%2d", &year, &month, &day, &hour, &minute,
                  &second) != 6) {
    return std::nullopt;
  }
  const std::chrono::year_month_day date{std::chrono::year{year}, std::chrono::month{static_cast<unsigned>(month)},
                                         std::chrono::day{static_cast<unsigned>(day)}};
  if (!date.ok() || year < kFirstYear || year > kLastYear) return std::nullopt;
  if (hour < 0 || hour > 23 || minute < 0 || minute > 59 || second < 0 || second > 60) return std::nullopt;
  std::string iso = fmt::format("{:04}-{:02}-{:02}T{:02}:{:02}:{:02}", year, month, day, hour, minute, second);

  constexpr std::size_t kMostDigits = 9;
  const std::string digits = trimmed(fraction).substr(0, kMostDigits);
  if (!digits.empty() && digits.find_first_not_of("0123456789") == std::string::npos) iso += "." + digits;

  char sign[2] = {};
  int zone_hour = 0, zone_minute = 0;
  if (zone.size() == 6 && std::sscanf(zone.c_str(), "%1[+-]%2d:%2d", sign, &zone_hour, &zone_minute) == 3) {
    if (zone_hour >= 0 && zone_hour <= 14 && zone_minute >= 0 && zone_minute <= 59) iso += zone;
  } else if (zone == "Z") {
    iso += zone;
  }
  return iso;
}

std::optional<std::string> lens_by_specification(const ExifTags& tags) {
  static constexpr const char* kKey = "Exif.Photo.LensSpecification";
  const auto shortest = tags.real(kKey, 0), longest = tags.real(kKey, 1), at_shortest = tags.real(kKey, 2),
             at_longest = tags.real(kKey, 3);
  if (!shortest || !longest || *shortest <= 0 || *longest < *shortest) return std::nullopt;
  std::string text =
      *shortest == *longest ? fmt::format("{:g} mm", *shortest) : fmt::format("{:g}-{:g} mm", *shortest, *longest);
  if (at_shortest && *at_shortest > 0) {
    text += fmt::format(" f/{:g}", *at_shortest);
    if (at_longest && *at_longest > *at_shortest) text += fmt::format("-{:g}", *at_longest);
  }
  return text;
}

std::optional<DecodedSize> recorded_size(const ExifTags& tags) {
  if (const auto size = size_in(tags, "Exif.Photo.PixelXDimension", "Exif.Photo.PixelYDimension")) return size;
  // A raw file describes its pictures one by one; NewSubfileType 0 is the one at full size (TIFF 6.0).
  for (const char* group :
       {"Exif.Image.", "Exif.SubImage1.", "Exif.SubImage2.", "Exif.SubImage3.", "Exif.SubImage4."}) {
    const std::string prefix = group;
    if (tags.integer(prefix + "NewSubfileType") != 0) continue;
    if (const auto size = size_in(tags, prefix + "ImageWidth", prefix + "ImageLength")) return size;
  }
  return std::nullopt;
}

void read_standard_exif(const ExifTags& tags, DecodedSize decoded, Capture& capture, Remarks& remarks) {
  read_identity(tags, capture);
  read_time(tags, capture, remarks);
  read_exposure(tags, capture, remarks);
  read_subject_distance(tags, capture, remarks);
  read_subject_area(tags, decoded, capture, remarks);
  if (const auto size = recorded_size(tags)) {
    capture.width_px = size->width_px;
    capture.height_px = size->height_px;
  }
  if (const auto orientation = tags.integer("Exif.Image.Orientation"); orientation >= 1 && orientation <= 8) {
    capture.orientation = Sourced<int>{static_cast<int>(*orientation), Source::exif};
  }
}

}  // namespace focusfall
