// What was measured in the pixels of one frame: the `measurement` object of the JSON record.
#pragma once

#include <cstdint>
#include <optional>
#include <vector>

#include "analysis/conventions.h"

namespace focusfall {

// One fitted edge. Positions in level-0 pixels of the unrotated frame.
struct EdgeSample {
  float x = 0, y = 0;            // where the edge crosses
  float normal_x = 1, normal_y = 0;  // unit vector across the edge, towards the bright side
  float squared_disc_px2 = 0;    // S in level-0 px^2, before any baseline is taken off
  float amplitude = 0;           // step height, linear light
  float residual = 0;            // rms of the fit / |amplitude|
  float width_level_px = 0;      // fitted Gaussian sigma, px of the level it was fitted on
  std::uint8_t level = 0;        // pyramid level on which it was fitted
  bool saturated = false;        // wider than that level can tell: a lower bound
};

// Which side of the value the evidence leaves open.
enum class Bound { none, lower, upper };

// Blur of one region. Present only where there is evidence; `edges` is counted either way.
struct BlurEstimate {
  double squared_disc_px2 = 0;   // baseline not taken off
  double squared_disc_low_px2 = 0;
  double squared_disc_high_px2 = 0;
  double edge_rise_px = 0;       // 10-90 % of the step
  double mtf50_cycles_per_px = 0;
  Bound bound = Bound::none;
};

struct BlurReading {
  std::optional<BlurEstimate> estimate;   // absent: no evidence
  int edges = 0;
};

// Motion or shake: the anisotropic part of the blur.
struct MotionReading {
  double length_px = 0;
  double length_low_px = 0;
  double length_high_px = 0;
  double angle_deg = 0;              // 0..180 from +x towards +y (down), unrotated frame
  double isotropic_squared_disc_px2 = 0;
  double anisotropy_px2 = 0;         // m = 2 sqrt(b^2 + d^2)
  double anisotropy_sigma_px2 = 0;
};

// Signed blur on the surface that carries the subject: l(x, y) = x_gradient x + y_gradient y + g, px,
// positive where the surface lies *nearer* than the plane of focus (focus fell behind it).
enum class Contact { none, aim, foot };
enum class NearSide { bottom, top, left, right };    // in the unrotated frame

struct PlaneReading {
  double x_gradient_px = 0;          // per frame width
  double y_gradient_px = 0;          // per frame height
  double offset_px = 0;              // g: signed blur at the frame's top-left corner
  double covariance[3][3] = {};      // of (x_gradient, y_gradient, offset)
  Contact contact = Contact::none;
  double contact_x = 0, contact_y = 0;   // fractions
  std::optional<Interval> at_contact_px; // signed blur there
  double at_contact_sigma_px = 0;
  double gradient_sigma_px = 0;      // of the slope along its own direction
  double inlier_fraction = 0;        // 0..1
  double residual_squared_disc_px2 = 0;  // S0: what is left on the line of best focus
  NearSide near_side = NearSide::bottom;
};

enum class ClippedKind { none, points, area, colour };
enum class ClippedOn { picture, mosaic };

// Fractions 0..1 of the pixels (photosites for a mosaic) at or above the clipping level.
struct Clipping {
  double red = 0, green = 0, blue = 0;
  double any = 0;                    // at least one channel
  double two_or_more = 0;            // at least two channels
  double aim_any = 0;                // inside the aim, at least one channel
  double aim_two_or_more = 0;
  double largest_patch = 0;          // largest connected patch, fraction of the frame
  ClippedKind kind = ClippedKind::none;
  ClippedOn measured_on = ClippedOn::picture;
  double shadows_any = 0;            // pixels whose every channel is at the black end
  std::optional<double> headroom_ev{};   // mosaic: stops above the level where the picture clips
};

struct Tone {
  double mean_linear = 0;
  double median_linear = 0;
  std::optional<double> aim_median_linear;
  double p99_linear = 0;
};

// Mean light on a grid of square tiles, row by row: small enough to keep, fine enough to register one frame on another
// and to compare the same surfaces in both. Only whole tiles; what is left over at the right and the bottom is dropped.
struct LevelGrid {
  int rows = 0;
  int columns = 0;
  int tile_px = 0;                   // side of a tile
  std::vector<float> mean_linear;    // 1.0 = clipping level
  std::vector<float> contrast;       // standard deviation / mean inside the tile, linear; 0 where the mean is 0
  std::vector<float> clipped;        // fraction of its pixels with any channel clipped
};

// How much of the picture lies above a level, by the largest of the three channels of each pixel.
// share_above[k] belongs to the level 2^-(k / 8): k = 0 is the clipping level itself, the last four stops below.
struct Highlights {
  std::vector<float> frame_share_above;   // kHighlightSteps entries, never decreasing, fractions 0..1
  std::vector<float> aim_share_above;     // the same inside the aim; empty without one
};
inline constexpr int kHighlightSteps = 33;
inline constexpr double kHighlightStepsPerStop = 8;

// Blur and clipping on a regular grid, row by row.
struct TileMap {
  int rows = 0;
  int columns = 0;
  int tile_px = 0;                   // side of a square tile, level-0 px; the last row and column may be cut
  std::vector<std::optional<float>> squared_disc_px2;
  std::vector<float> sigma_px;       // standard error of c, px; meaningful where a value is
  std::vector<int> edges;
  std::vector<float> clipped;        // fraction, any channel
};

struct Aim {
  FractionBox box;
  bool grown = false;                // enlarged about its centre to the least size that can be measured
  bool mixed = false;                // holds two blurs; the sharper group was judged
};

struct SharpestRegion {
  FractionBox box;
  BlurReading reading;
};

struct Measurement {
  Aim aim;
  BlurReading aim_blur;
  std::optional<BlurEstimate> aim_softer_part;   // the other group of edges where `mixed`; not the one that was judged
  std::optional<SharpestRegion> best;
  std::optional<MotionReading> motion;
  std::optional<MotionReading> background_motion;
  std::optional<PlaneReading> plane;
  std::optional<Clipping> clipping;
  std::optional<Tone> tone;
  std::optional<LevelGrid> levels;
  std::optional<Highlights> highlights;
  std::optional<TileMap> tiles;
  double noise_codes = 0;            // standard deviation of the noise, 8-bit codes
};

}  // namespace focusfall
