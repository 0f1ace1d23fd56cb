#include "metadata/standard_xmp.h"

#include <fmt/format.h>

#include <cmath>

#include "metadata/focus_area.h"
#include "metadata/focus_distance.h"
#include "metadata/standard_exif.h"

namespace focusfall {
namespace {

// ---- values ---------------------------------------------------------------------------------------------------------

struct TextRow {
  const char* key;
  OptionalSourced<std::string> Capture::*field;
};
constexpr TextRow kTexts[] = {
    {"Xmp.exifEX.LensModel", &Capture::lens},
    {"Xmp.aux.Lens", &Capture::lens},
    {"Xmp.exifEX.LensSerialNumber", &Capture::lens_serial},
    {"Xmp.aux.LensSerialNumber", &Capture::lens_serial},
    {"Xmp.exifEX.BodySerialNumber", &Capture::body_serial},
    {"Xmp.aux.SerialNumber", &Capture::body_serial},
    {"Xmp.tiff.Model", &Capture::camera},
    {"Xmp.xmp.CreatorTool", &Capture::software},
};

struct NumberRow {
  const char* key;
  OptionalSourced<double> Capture::*field;
  Plausible limits;
};
constexpr NumberRow kNumbers[] = {
    {"Xmp.exif.FocalLength", &Capture::focal_length_mm, kFocalLength},
    {"Xmp.exif.FNumber", &Capture::f_number, kFNumber},
    {"Xmp.exif.ExposureTime", &Capture::exposure_time_s, kExposureTime},
    {"Xmp.exifEX.PhotographicSensitivity", &Capture::iso_speed, kIsoSpeed},
    {"Xmp.exif.ISOSpeedRatings[1]", &Capture::iso_speed, kIsoSpeed},
    {"Xmp.exif.ISOSpeedRatings", &Capture::iso_speed, kIsoSpeed},
    {"Xmp.exif.ExposureBiasValue", &Capture::exposure_bias_ev, kExposureBias},
    {"Xmp.exif.BrightnessValue", &Capture::brightness_apex, kBrightness},
};

void read_values(const XmpTags& tags, Capture& capture, Remarks& remarks) {
  for (const TextRow& row : kTexts) {
    if (capture.*row.field) continue;
    if (auto text = tags.text(row.key)) capture.*row.field = Sourced<std::string>{std::move(*text), Source::xmp};
  }
  for (const NumberRow& row : kNumbers) {
    if (capture.*row.field) continue;
    const auto value = tags.real(row.key);
    if (!value) continue;
    if (const auto usable = plausible(*value, row.limits, remarks))
      capture.*row.field = Sourced<double>{*usable, Source::xmp};
  }
  if (const auto fired = tags.text("Xmp.exif.Flash/exif:Fired"); fired && !capture.flash_fired) {
    capture.flash_fired = Sourced<bool>{*fired == "True" || *fired == "true", Source::xmp};
  }
}

// XMP dates are ISO 8601 already, with the fraction and the zone in them; the zone of other programs is their own, and
// is kept as it is written.
void read_time(const XmpTags& tags, Capture& capture) {
  const auto text = tags.text("Xmp.exif.DateTimeOriginal");
  if (capture.taken_at || !text || text->size() < 19) return;
  std::string fraction, zone;
  std::size_t at = 19;
  if (at < text->size() && (*text)[at] == '.') {
    const auto end = text->find_first_not_of("0123456789", at + 1);
    fraction = text->substr(at + 1, end == std::string::npos ? end : end - at - 1);
    at = end == std::string::npos ? text->size() : end;
  }
  zone = text->substr(at);
  if (auto iso = iso_time(text->substr(0, 19), fraction, zone)) {
    capture.taken_at = Sourced<std::string>{std::move(*iso), Source::xmp};
  }
}

// Written by raw developers from a maker note, rounded in ways of their own: the last resort, with little trust.
void read_approximate_distance(const XmpTags& tags, Capture& capture, Remarks& remarks) {
  constexpr double kBound = 0.1;              // judgement
  constexpr double kInfinite = 4294967295.0;  // 32 bits set
  const auto value = tags.real("Xmp.aux.ApproximateFocusDistance");
  if (capture.focus_distance || !value || *value == 0) return;
  if (*value >= kInfinite) {
    capture.focus_distance = Sourced<FocusDistance>{distance_at_infinity(kInfinityFromM), Source::xmp};
  } else if (const auto usable = plausible(*value, kDistance, remarks)) {
    capture.focus_distance = Sourced<FocusDistance>{distance_within(*usable, kBound), Source::xmp};
  }
}

// ---- regions --------------------------------------------------------------------------------------------------------

// More than anybody marks in a picture (judgement); a damaged file must not keep us busy.
constexpr int kMostRegions = 1000;

// The regions belong to a picture of this size. One that was turned or cropped since has its regions elsewhere.
bool applies(const XmpTags& tags, const std::string& regions, DecodedSize decoded) {
  const auto width = tags.real(regions + "/mwg-rs:AppliedToDimensions/stDim:w");
  const auto height = tags.real(regions + "/mwg-rs:AppliedToDimensions/stDim:h");
  if (!width || !height || *width <= 0 || *height <= 0 || decoded.width_px <= 0 || decoded.height_px <= 0) return true;
  constexpr double kSameShape = 0.02;
  const double shape = static_cast<double>(decoded.width_px) / decoded.height_px;
  return std::abs(*width / *height / shape - 1) < kSameShape;
}

// Metadata Working Group, Guidelines for Handling Image Metadata 2.0 (2010), section 5.9: Area is given by its centre,
// in fractions of the frame as stored, Orientation not applied. A circle has a diameter `d`.
std::optional<FractionRect> mwg_area(const XmpTags& tags, const std::string& region) {
  const std::string area = region + "/mwg-rs:Area/stArea:";
  if (tags.text(area + "unit").value_or("normalized") != "normalized") return std::nullopt;
  const auto x = tags.real(area + "x"), y = tags.real(area + "y");
  if (!x || !y) return std::nullopt;
  const auto diameter = tags.real(area + "d");
  const double width = tags.real(area + "w").value_or(diameter.value_or(0));
  const double height = tags.real(area + "h").value_or(diameter.value_or(0));
  return FractionRect{*x - width / 2, *y - height / 2, width, height};
}

void read_mwg_regions(const XmpTags& tags, DecodedSize decoded, Capture& capture, Remarks& remarks) {
  const std::string regions = "Xmp.mwg-rs.Regions";
  bool said = false;
  for (int i = 1; i <= kMostRegions; ++i) {
    const std::string region = fmt::format("{}/mwg-rs:RegionList[{}]", regions, i);
    if (!tags.has(region)) break;
    const std::string type = tags.text(region + "/mwg-rs:Type").value_or("");
    if (type != "Focus" && type != "Face") continue;
    const auto area = mwg_area(tags, region);
    if (area && lies_in_frame(*area) && applies(tags, regions, decoded)) {
      const auto kind = type == "Focus" ? FocusAreaKind::focus_region : FocusAreaKind::face_region;
      capture.focus_areas.push_back({*area, kind, Source::xmp});
    } else if (!said) {
      said = true;
      remark_absurd("region", fmt::format("one of type {} outside this frame, or for a picture of another shape", type),
                    "a place in this frame", remarks);
    }
  }
}

// IPTC Photo Metadata 2019.1, Image Region: rectangles by their top-left corner, circles by their centre and radius
// (rbRx, in fractions of the width); the unit must be "relative". The content type "human" stands for a face or a
// person (newscodes/imageregiontype, from memory).
std::optional<FractionRect> iptc_area(const XmpTags& tags, const std::string& region, DecodedSize decoded) {
  const std::string boundary = region + "/Iptc4xmpExt:RegionBoundary/Iptc4xmpExt:rb";
  if (tags.text(boundary + "Unit") != "relative") return std::nullopt;
  const auto x = tags.real(boundary + "X"), y = tags.real(boundary + "Y");
  if (!x || !y) return std::nullopt;
  const std::string shape = tags.text(boundary + "Shape").value_or("");
  if (shape == "rectangle") {
    const auto width = tags.real(boundary + "W"), height = tags.real(boundary + "H");
    if (width && height) return FractionRect{*x, *y, *width, *height};
  } else if (shape == "circle" && decoded.width_px > 0 && decoded.height_px > 0) {
    const auto radius = tags.real(boundary + "Rx");
    const double shape_ratio = static_cast<double>(decoded.width_px) / decoded.height_px;
    if (radius) return FractionRect{*x - *radius, *y - *radius * shape_ratio, 2 * *radius, 2 * *radius * shape_ratio};
  }
  return std::nullopt;
}

bool is_of_a_person(const XmpTags& tags, const std::string& region) {
  // Identifiers are a bag: Exiv2 gives one text for all of its members.
  for (const char* form : {"/xmp:Identifier", "/xmp:Identifier[1]"}) {
    const std::string types = tags.text(region + "/Iptc4xmpExt:rCtype[1]" + form).value_or("");
    if (types.find("imageregiontype/human") != std::string::npos) return true;
  }
  return tags.has(region + "/Iptc4xmpExt:PersonInImage[1]");
}

void read_iptc_regions(const XmpTags& tags, DecodedSize decoded, Capture& capture) {
  for (int i = 1; i <= kMostRegions; ++i) {
    const std::string region = fmt::format("Xmp.iptcExt.ImageRegion[{}]", i);
    if (!tags.has(region)) break;
    const auto area = iptc_area(tags, region, decoded);
    if (area && lies_in_frame(*area) && is_of_a_person(tags, region)) {
      capture.focus_areas.push_back({*area, FocusAreaKind::face_region, Source::xmp});
    }
  }
}

}  // namespace

void read_standard_xmp(const XmpTags& tags, DecodedSize decoded, Capture& capture, Remarks& remarks) {
  if (tags.empty()) return;
  read_values(tags, capture, remarks);
  read_time(tags, capture);
  read_approximate_distance(tags, capture, remarks);
  read_mwg_regions(tags, decoded, capture, remarks);
  read_iptc_regions(tags, decoded, capture);
}

}  // namespace focusfall
