// Measures one frame: blur at the aim, the tile map, the sharpest region, motion, and the plane.
#pragma once

#include <memory>
#include <optional>

#include "analysis/measure/luma_picture.h"
#include "analysis/measure/measurement.h"

namespace focusfall {

struct MeasureRequest {
  Aim aim;                                   // box in the unrotated frame; least size already grown
  bool whole_frame = true;                   // false: only the aim (and its surroundings for motion) is measured
  bool near_side_known = true;               // false: no orientation recorded, all four sides are tried
  NearSide near_side = NearSide::bottom;     // which side of the *unrotated* frame shows the nearer ground
  std::optional<double> contact_x, contact_y;   // where the subject meets the ground, as the user said; fractions
  bool keep_tiles = true;                    // fill Measurement::tiles
};

// Owns every buffer, so that a thread measures frame after frame without allocating. Not thread-safe; one per thread.
// Fills all of Measurement but `clipping` and `tone`, which are counted while the picture is decoded.
class FrameMeasurer {
 public:
  FrameMeasurer();
  ~FrameMeasurer();
  FrameMeasurer(FrameMeasurer&&) noexcept;
  FrameMeasurer& operator=(FrameMeasurer&&) noexcept;

  [[nodiscard]] Measurement measure(const LumaPicture& picture, const MeasureRequest& request);

 private:
  struct Buffers;
  std::unique_ptr<Buffers> buffers_;
};

}  // namespace focusfall
