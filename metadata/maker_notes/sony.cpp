#include <algorithm>
#include <array>
#include <cmath>
#include <string_view>

#include "metadata/focus_distance.h"
#include "metadata/maker_notes/take.h"

namespace focusfall {
namespace {

// ---- focus distance -------------------------------------------------------------------------------------------------

// Bodies with the E mount; others write the same tag with another meaning.
bool has_e_mount(const std::string& model) {
  constexpr std::array kStarts = {"ILCE-", "NEX-", "ILME-", "ZV-E"};
  return std::ranges::any_of(kStarts, [&](const char* start) { return model.starts_with(start); });
}

// (2^(v/16 - 5) + 1) x the 35 mm equivalent in m: a magnification, so that it is rough. 255: infinity.
void take_focus_position(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr std::int64_t kInfinite = 255, kLeast = 16;
  constexpr double kBound = 0.25;  // judgement
  const auto v = context.tags.integer(key);
  const auto& equivalent = context.equivalent_mm;
  if (note.rough_focus_distance || !v || *v < kLeast || !equivalent || *equivalent <= 0 ||
      !has_e_mount(context.model)) {
    return;
  }
  const auto distance = [&](double position) { return (std::exp2(position / 16 - 5) + 1) * *equivalent / 1000; };
  note.rough_focus_distance = *v == kInfinite ? distance_at_infinity(distance(kInfinite - 1) * (1 - kBound))
                                              : distance_within(distance(static_cast<double>(*v)), kBound);
}

// ---- focus area -----------------------------------------------------------------------------------------------------

// A note that an editor moved holds other numbers at this place.
bool is_shape_of_picture(double width, double height, DecodedSize size) {
  constexpr double kSameShape = 0.03;
  if (size.width_px <= 0 || size.height_px <= 0) return false;
  return std::abs(width / height * size.height_px / size.width_px - 1) < kSameShape;
}

// Another tag of the group that `key` belongs to: notes of raw files have no signature and are a group of their own.
std::string sibling(const char* key, const char* name) {
  const std::string whole = key;
  return whole.substr(0, whole.rfind('.') + 1) + name;
}

// 0x2027: width, height, x, y of the place that the body enlarges on playback. The centre without a frame of its own
// is written when the place is not known. 0x2037: width, height, 0 if there is no frame.
void take_focus_location(const NoteContext& context, const char* key, MakerNote& note) {
  if (!note.focus_areas.empty()) return;
  double v[4] = {};
  for (std::size_t i = 0; i < 4; ++i) v[i] = context.tags.real(key, i).value_or(0);
  if (v[0] <= 0 || v[1] <= 0 || v[2] <= 0 || v[3] <= 0 || v[2] > v[0] || v[3] > v[1]) return;
  if (!is_shape_of_picture(v[0], v[1], context.size)) return;
  const bool has_frame = context.tags.integer(sibling(key, "0x2037"), 2).value_or(0) != 0;
  const double width = has_frame ? context.tags.real(sibling(key, "0x2037"), 0).value_or(0) : 0;
  const double height = has_frame ? context.tags.real(sibling(key, "0x2037"), 1).value_or(0) : 0;
  const bool in_centre = std::abs(v[2] - v[0] / 2) <= 1 && std::abs(v[3] - v[1] / 2) <= 1;
  if (in_centre && (width <= 0 || height <= 0)) return;
  note.focus_areas.push_back({(v[2] - width / 2) / v[0], (v[3] - height / 2) / v[1], width / v[0], height / v[1]});
}

// The place of the flexible spot in a space of 640 x 480, on bodies with the E mount; it is a setting, and counts where
// the camera focused with it (area mode 3).
void take_flexible_spot(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr std::int64_t kFlexibleSpot = 3;
  constexpr double kWidth = 640, kHeight = 480;
  const auto x = context.tags.real(key, 0), y = context.tags.real(key, 1);
  if (!note.focus_areas.empty() || note.focus_mode == FocusMode::manual || !has_e_mount(context.model) || !x || !y)
    return;
  if (context.tags.integer(sibling(key, "0x201c")) != kFlexibleSpot || *x <= 0 || *y <= 0) return;
  if (*x < kWidth && *y < kHeight) note.focus_areas.push_back({*x / kWidth, *y / kHeight, 0, 0});
}

// ---- the rest -------------------------------------------------------------------------------------------------------

// 4 and 6 let the body or a turn of the ring decide, and do not say which it was.
constexpr take::Code<FocusMode> kFocusModes[] = {
    {0, FocusMode::manual}, {2, FocusMode::single}, {3, FocusMode::continuous}};

// Compacts write 0 in this tag whatever they do, but for the newest.
void take_focus_mode(const NoteContext& context, const char* key, MakerNote& note) {
  constexpr std::array kNewCompacts = {"DSC-RX10M4",   "DSC-RX100M6", "DSC-RX100M7",
                                       "DSC-RX100M5A", "DSC-HX99",    "DSC-RX0M2"};
  const bool meant = !context.model.starts_with("DSC-") ||
                     std::ranges::any_of(kNewCompacts, [&](const char* m) { return context.model.starts_with(m); });
  if (!note.focus_mode && meant) note.focus_mode = meaning(kFocusModes, context.tags.integer(key));
}

// What older compacts write; 0 is nothing.
constexpr take::Code<FocusMode> kOldFocusModes[] = {{1, FocusMode::single}, {2, FocusMode::continuous}};
constexpr take::Code<bool> kStabiliser[] = {{0, false}, {1, true}};
// Compacts tell it by this tag: 1 at all times, 2 while the picture is taken.
constexpr take::Code<bool> kAntiBlur[] = {{0, false}, {1, true}, {2, true}};

// Sony1 has a signature, Sony2 none.
constexpr NoteRow kRows[] = {
    {"Exif.Sony2Fp.FocusPosition2", take_focus_position},
    {"Exif.Sony1.0x2027", take_focus_location},
    {"Exif.Sony2.0x2027", take_focus_location},
    {"Exif.Sony1.0x201b", take_focus_mode},
    {"Exif.Sony2.0x201b", take_focus_mode},
    {"Exif.Sony1.0x201d", take_flexible_spot},
    {"Exif.Sony2.0x201d", take_flexible_spot},
    {"Exif.Sony1.FocusMode", take::focus_mode<kOldFocusModes>},
    {"Exif.Sony2.FocusMode", take::focus_mode<kOldFocusModes>},
    {"Exif.Sony1.ImageStabilization", take::stabiliser<kStabiliser>},
    {"Exif.Sony2.ImageStabilization", take::stabiliser<kStabiliser>},
    {"Exif.Sony1.AntiBlur", take::stabiliser<kAntiBlur>},
    {"Exif.Sony2.AntiBlur", take::stabiliser<kAntiBlur>},
    {"Exif.Sony1.SequenceNumber", take::sequence<0, 65535>},
    {"Exif.Sony2.SequenceNumber", take::sequence<0, 65535>},
};

// "SONY DSC " or "SONY CAM " and three NUL bytes stand before the directory of most bodies.
bool is_in_place(const NoteContext& context) {
  const auto note = context.tags.bytes("Exif.Photo.MakerNote");
  constexpr std::string_view kSignature = "SONY ";
  const bool signed_note = note.size() > 12 && std::equal(kSignature.begin(), kSignature.end(), note.begin());
  return offsets_lie_in_note(context, signed_note ? 12 : 0);
}

constexpr Maker kMakers[] = {{"SONY", kRows, is_in_place}};

}  // namespace

std::span<const Maker> sony_notes() {
  return kMakers;
}

}  // namespace focusfall
