// Brings together what the file, the command line and the settings say about one frame: command line > file >
// settings, which fill gaps unless they say `override = true`. Maps what was said about the picture as displayed
// into the unrotated frame, once.
#pragma once

#include <optional>
#include <vector>

#include "analysis/measure/measurement.h"
#include "analysis/optics/prediction.h"
#include "metadata/capture.h"
#include "metadata/read_capture.h"
#include "src/pipeline/frame_record.h"
#include "src/pipeline/options.h"
#include "src/pipeline/settings.h"

namespace focusfall {

// Least side of an aim that can be measured, px (judgement: a region of three tiles of 64 px).
inline constexpr int kLeastAimPx = 192;

// A point in fractions of the unrotated frame.
struct FramePoint {
  double x = 0;
  double y = 0;
};

// What camera processing adds to S, and who says so.
struct Baseline {
  Interval squared_disc_px2{0, -5.88, 5.88};      // prior N(0, 3^2) px^2: 1.96 x 3 (measurement.md, section 4)
  const char* source = "prior";                  // "prior" | "settings" | "learned"
};

struct Resolved {
  Capture capture;                               // merged; every value remembers its source
  std::optional<OpticalSetup> setup;             // absent: focal length or f-number is not known
  FocusArea aim;                                 // unrotated frame, inside it, grown where needed
  bool aim_grown = false;
  std::optional<NearSide> near_side;             // unrotated; absent: not known, all four sides are to be tried
  std::optional<FramePoint> contact;             // where the subject touches the ground, as the user said
  bool aim_may_be_judged = true;                 // false: aim is the bare centre and is not to be trusted
  Baseline baseline;
  std::vector<Issue> issues;
};

// `decoded` is the size of the stored picture; 0 x 0 where there is none (`predict`).
Resolved resolve(const Capture& capture, const UserValues& user, const Settings& settings, DecodedSize decoded);

// Maps a box or a point of the displayed picture into the unrotated frame (Exif orientation 1..8).
FractionRect unrotated_rect(const FractionRect& displayed, int orientation);
FramePoint unrotated_point(FramePoint displayed, int orientation);
NearSide unrotated_side(NearSide displayed, int orientation);

// And back, for drawing.
FramePoint displayed_point(FramePoint unrotated, int orientation);

// The least aim: `box` (fractions of a width_px x height_px frame) enlarged about its centre to kLeastAimPx a side and
// moved inside the frame. The second value says whether it had to be enlarged.
struct GrownBox {
  FractionRect box;
  bool grown = false;
};
GrownBox grow_aim(FractionRect box, DecodedSize frame);

}  // namespace focusfall
