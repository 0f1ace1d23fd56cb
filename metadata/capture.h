// What the camera recorded about one photograph: values, each with where it came from.
//
// Everything is in the unrotated sensor frame: fractions 0..1 of width and height, x to the right, y down,
// origin at the top-left corner of the stored picture. `orientation` is applied once, at the edge of the program.
// A value that the file does not hold is std::nullopt; nothing is guessed here.
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace focusfall {

// Where a value came from. The JSON spelling stands in source_name().
enum class Source { exif, maker_note, xmp, raw, settings, user, derived, assumed };

// "exif", "maker note", "xmp", "raw", "settings", "user", "derived", "assumed".
const char* source_name(Source source);

// A value and its origin.
template <class T>
struct Sourced {
  T value{};
  Source source = Source::exif;
};

template <class T>
using OptionalSourced = std::optional<Sourced<T>>;

// A quantity that its source gives only coarsely: low <= value <= high, 95 % bounds, all in the same unit.
struct CoarseValue {
  double value = 0;
  double low = 0;
  double high = 0;
};

// Distance on which the lens was focused, metres, as recorded. Infinity is std::numeric_limits::infinity():
// value_m and high_m may be infinite, low_m too. `stale` is set where the file gives reason to believe that the
// distance was not updated for this very frame.
struct FocusDistance {
  double value_m = 0;
  double low_m = 0;
  double high_m = 0;
  bool stale = false;
};

// A rectangle in fractions of the unrotated frame: top-left corner, width and height.
struct FractionRect {
  double x = 0;
  double y = 0;
  double width = 0;
  double height = 0;
};

// Where the camera, or a person with another program, said that focus or the subject is. In order of preference.
enum class FocusAreaKind {
  user,           // given on the command line or in the settings
  focus_area,     // the focus area that the camera recorded (maker note)
  focus_region,   // an MWG or IPTC region of type Focus
  face_region,    // an MWG or IPTC region of type Face
  subject_area,   // Exif SubjectArea or SubjectLocation
  centre,         // nothing recorded: the centre of the frame
};

struct FocusArea {
  FractionRect box;  // a point has width = height = 0
  FocusAreaKind kind = FocusAreaKind::centre;
  Source source = Source::exif;
};

enum class FocusMode { single, continuous, manual };          // JSON: the same words
enum class ExposureMode { automatic, manual, bracket };       // Exif ExposureMode and ExposureProgram = manual

// Every field may be absent. Order follows the `capture` object of the JSON record.
struct Capture {
  OptionalSourced<std::string> camera;       // make and model, make not repeated
  OptionalSourced<std::string> lens;
  OptionalSourced<std::string> body_serial;
  OptionalSourced<std::string> lens_serial;
  OptionalSourced<std::string> taken_at;     // ISO 8601, fraction of a second kept, zone only if recorded
  OptionalSourced<long> sequence;            // frame counter or position in the burst
  OptionalSourced<double> focal_length_mm;   // > 0
  OptionalSourced<double> f_number;          // >= 0.7
  OptionalSourced<double> exposure_time_s;   // > 0
  OptionalSourced<double> iso_speed;         // > 0
  OptionalSourced<double> exposure_bias_ev;
  OptionalSourced<double> brightness_apex;   // Bv
  OptionalSourced<ExposureMode> exposure_mode;
  OptionalSourced<FocusDistance> focus_distance;
  OptionalSourced<CoarseValue> pixel_pitch_um;  // of the delivered pixels
  std::optional<int> width_px;               // as recorded; the decoder's size wins over it
  std::optional<int> height_px;
  OptionalSourced<int> orientation;          // Exif 1..8
  OptionalSourced<bool> flash_fired;
  OptionalSourced<bool> stabiliser_on;
  OptionalSourced<FocusMode> focus_mode;

  // Used on the way, not printed on their own.
  OptionalSourced<std::string> software;     // Exif Software: a hint that the file was edited
  std::optional<int> sharpening;             // Exif Sharpness: 0 normal, 1 soft, 2 hard
  std::vector<FocusArea> focus_areas;        // all that were found, best kind first
};

// A value that was there but could not be used, in one sentence. `code` is a stable short name for programs.
struct CaptureRemark {
  std::string code;
  std::string message;
};

struct CaptureReading {
  Capture capture;
  std::vector<CaptureRemark> remarks;
};

}  // namespace focusfall
