#include "metadata/pixel_pitch.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "metadata/picture_shape.h"
#include "metadata/standard_exif.h"

namespace focusfall {
namespace {

// Diagonal of 24 mm x 36 mm, to which the 35 mm equivalent refers.
constexpr double kFullFrameDiagonalMm = 43.2666;
constexpr double kFullFrameWidthMm = 36;

// Relative 95 % half widths. Measured on real files of 345 makes and models where both rules apply: the focal plane
// resolution is right to 3 % where the 35 mm equivalent confirms it, though some bodies are wrong by up to 17 %; the
// equivalent is rounded to whole millimetres and stands for a diagonal, which costs 4 %. Unconfirmed: judgement.
constexpr double kConfirmedBound = 0.03;
constexpr double kUnconfirmedBound = 0.05;
constexpr double kEquivalentBound = 0.04;

// Two rules that differ by more do not speak of the same picture.
constexpr double kAgreement = 0.08;

double long_side(DecodedSize size) {
  return std::max(size.width_px, size.height_px);
}
double short_side(DecodedSize size) {
  return std::min(size.width_px, size.height_px);
}

CoarseValue with_bound(double value, double bound) {
  return {value, value * (1 - bound), value * (1 + bound)};
}

void remark_unknown(std::string reason, Remarks& remarks) {
  remarks.push_back(
      {kPitchUnknown, reason + " The pixel pitch is taken as not known; --pixel-pitch or --sensor says it."});
}

// FocalPlaneResolutionUnit as micrometres: 2 inch and 3 centimetre are the standard's; 4 and 5 occur in real files.
std::optional<double> unit_um(int unit) {
  switch (unit) {
    case 2:
      return 25400;
    case 3:
      return 10000;
    case 4:
      return 1000;
    case 5:
      return 1;
    default:
      return std::nullopt;
  }
}

// EOS and PowerShot bodies write the native width times 1000 over the sensor's width in thousandths of an inch.
struct SensorFraction {
  double native_px = 0;
  double sensor_um = 0;
};

std::optional<SensorFraction> sensor_fraction(const PitchEvidence& e) {
  const auto& ratio = e.focal_plane_resolution;
  if (!ratio || e.focal_plane_unit != 2) return std::nullopt;
  const bool form = ratio->numerator >= 500'000 && ratio->numerator % 1000 == 0 && ratio->denominator >= 100 &&
                    ratio->denominator <= 2500;
  if (!form) return std::nullopt;
  return SensorFraction{static_cast<double>(ratio->numerator) / 1000, static_cast<double>(ratio->denominator) * 25.4};
}

// Pitch of the recorded pixels by the focal plane resolution.
std::optional<double> focal_plane_pitch(const PitchEvidence& e) {
  const auto unit = unit_um(e.focal_plane_unit);
  const auto& ratio = e.focal_plane_resolution;
  if (!unit || !ratio || ratio->numerator <= 0 || ratio->denominator <= 0) return std::nullopt;
  double pitch = *unit * static_cast<double>(ratio->denominator) / static_cast<double>(ratio->numerator);
  const auto sensor = sensor_fraction(e);
  if (!sensor) return pitch;
  if (e.sensor_active_width_px && *e.sensor_active_width_px > 0) {
    pitch = sensor->sensor_um / *e.sensor_active_width_px;
  }
  if (e.reduced_by_camera && is_known(e.recorded)) pitch *= sensor->native_px / long_side(e.recorded);
  return pitch;
}

// Pitch of the recorded pixels by the 35 mm equivalent. In a crop mode the equivalent is that of the part that was
// recorded, and so is the diagonal. Makers mean the diagonal, or the width; for 4:3 and 3:2 that is the
// same to 4 %, for other shapes the truth lies anywhere between: a square frame of a phone of 1.5 um pixels reads 1.33
// um by the diagonal.
std::optional<CoarseValue> equivalent_pitch(const PitchEvidence& e, DecodedSize size) {
  if (!e.focal_length_mm || !e.equivalent_mm || *e.equivalent_mm <= 0 || *e.focal_length_mm <= 0) return std::nullopt;
  const double scale = *e.focal_length_mm / *e.equivalent_mm * 1000;
  const double by_diagonal = scale * kFullFrameDiagonalMm / std::hypot(size.width_px, size.height_px);
  constexpr double kSquarest = 1.3, kWidest = 1.55;
  const double shape = long_side(size) / short_side(size);
  if (shape >= kSquarest && shape <= kWidest) return with_bound(by_diagonal, kEquivalentBound);
  const double by_width = scale * kFullFrameWidthMm / long_side(size);
  const double low = std::min(by_diagonal, by_width), high = std::max(by_diagonal, by_width);
  return CoarseValue{(low + high) / 2, low * (1 - kEquivalentBound), high * (1 + kEquivalentBound)};
}

// Pitch by the diagonal of a 4:3 sensor. Wider pictures keep its width, squarer ones its height.
std::optional<double> diagonal_pitch(const PitchEvidence& e, DecodedSize size) {
  if (!e.sensor_diagonal_mm) return std::nullopt;
  const double by_width = 0.8 * *e.sensor_diagonal_mm * 1000 / long_side(size);
  const double by_height = 0.6 * *e.sensor_diagonal_mm * 1000 / short_side(size);
  return std::min(by_width, by_height);
}

// Whether the picture is not the one that the camera wrote, so that its pixels are of no known size.
bool altered(const PitchEvidence& e, Remarks& remarks) {
  // The part of the sensor that is kept is enlarged again by some cameras and not by others, and the equivalent takes
  // it in or does not; which, no tag tells.
  if (e.digital_zoom && *e.digital_zoom > 1) {
    remark_unknown("The camera's digital zoom was in use.", remarks);
    return true;
  }
  if (is_known(e.recorded) && is_known(e.decoded) && !same_shape(e.recorded, e.decoded)) {
    remark_unknown(fmt::format("The camera recorded {} x {} px and the picture holds {} x {} px: it was cropped.",
                               e.recorded.width_px, e.recorded.height_px, e.decoded.width_px, e.decoded.height_px),
                   remarks);
    return true;
  }
  if (e.cropped_by_editor) {
    remark_unknown("A raw developer cut off a part of the picture.", remarks);
    return true;
  }
  // Programs that write the tags anew put the size of their own picture beside the resolution of the camera's.
  const auto sensor = sensor_fraction(e);
  if (e.rewritten && !sensor && !e.equivalent_mm) {
    remark_unknown("Another program wrote the capture data anew, and the recorded size may be its own.", remarks);
    return true;
  }
  if (sensor && is_known(e.recorded) && !e.reduced_by_camera && long_side(e.recorded) < 0.98 * sensor->native_px) {
    remark_unknown(fmt::format("The sensor resolution belongs to a width of {:.0f} px and {:.0f} px are recorded: "
                               "the picture was reduced or cropped.",
                               sensor->native_px, long_side(e.recorded)),
                   remarks);
    return true;
  }
  return false;
}

// Outside the interval of the equivalent by more than rules of the same picture are.
bool contradict(double by_plane, const CoarseValue& by_equivalent) {
  constexpr double kBeyond = kAgreement - kEquivalentBound;
  return by_plane < by_equivalent.low * (1 - kBeyond) || by_plane > by_equivalent.high * (1 + kBeyond);
}

}  // namespace

std::optional<CoarseValue> pixel_pitch_um(const PitchEvidence& e, Remarks& remarks) {
  const DecodedSize recorded = is_known(e.recorded) ? e.recorded : e.decoded;
  if (!is_known(recorded)) return std::nullopt;
  const double to_delivered = is_known(e.decoded) ? long_side(recorded) / long_side(e.decoded) : 1.0;

  auto by_plane = focal_plane_pitch(e);
  if (!by_plane) by_plane = diagonal_pitch(e, recorded);
  const auto by_equivalent = equivalent_pitch(e, recorded);
  if (!by_plane && !by_equivalent) return std::nullopt;
  if (altered(e, remarks)) return std::nullopt;
  if (by_plane && by_equivalent && contradict(*by_plane, *by_equivalent)) {
    remark_unknown(fmt::format("The focal plane resolution gives {:.3g} um and the 35 mm equivalent {:.3g} um.",
                               *by_plane * to_delivered, by_equivalent->value * to_delivered),
                   remarks);
    return std::nullopt;
  }
  const bool confirmed = by_equivalent || e.sensor_active_width_px;
  CoarseValue pitch =
      by_plane ? with_bound(*by_plane, confirmed ? kConfirmedBound : kUnconfirmedBound) : *by_equivalent;
  for (double* value : {&pitch.value, &pitch.low, &pitch.high}) *value *= to_delivered;
  return plausible(pitch.value, kPixelPitch, remarks) ? std::optional(pitch) : std::nullopt;
}

namespace {

// Makers of which no camera is known to leave out its note (judgement), and how Exiv2 names the groups of the note.
struct NoteMaker {
  std::string_view make;
  std::string_view group;
};
constexpr NoteMaker kNoteMakers[] = {{"Canon", "Canon"},     {"NIKON", "Nikon"},         {"SONY", "Sony"},
                                     {"OLYMPUS", "Olympus"}, {"Panasonic", "Panasonic"}, {"FUJIFILM", "Fujifilm"},
                                     {"PENTAX", "Pentax"}};

// Raw files may hold the tags of the note without the note as a whole.
bool note_is_gone(const ExifTags& tags) {
  const std::string make = tags.text("Exif.Image.Make").value_or("");
  return std::ranges::any_of(kNoteMakers, [&](const NoteMaker& maker) {
    return make.starts_with(maker.make) && !tags.has("Exif.Photo.MakerNote") && !tags.has_group(maker.group);
  });
}

}  // namespace

PitchEvidence pitch_evidence(const ExifTags& tags, DecodedSize decoded) {
  PitchEvidence evidence;
  evidence.recorded = recorded_size(tags).value_or(DecodedSize{});
  evidence.decoded = decoded;
  for (const char* group : {"Exif.Photo.", "Exif.Image."}) {
    if (evidence.focal_plane_resolution) break;
    evidence.focal_plane_resolution = tags.ratio(std::string(group) + "FocalPlaneXResolution");
    const auto unit = tags.integer(std::string(group) + "FocalPlaneResolutionUnit");
    if (unit) evidence.focal_plane_unit = static_cast<int>(std::clamp<std::int64_t>(*unit, 0, 100));
  }
  evidence.equivalent_mm = tags.real("Exif.Photo.FocalLengthIn35mmFilm");
  if (evidence.equivalent_mm && *evidence.equivalent_mm <= 0) evidence.equivalent_mm.reset();  // 0: not known
  evidence.rewritten = note_is_gone(tags);
  evidence.digital_zoom = tags.real("Exif.Photo.DigitalZoomRatio");
  return evidence;
}

}  // namespace focusfall
