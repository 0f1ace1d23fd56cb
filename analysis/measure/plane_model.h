// Internals of the plane fit: edges chosen for it, the signed blur field, and how a field is scored.
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "analysis/measure/measurement.h"
#include "analysis/measure/plane.h"

namespace focusfall::plane_fit {

// An edge in frame coordinates that are centred and of order 1: X = (x - centre_x) / scale, Y likewise.
struct Point {
  double x = 0, y = 0;
  double squared_disc_px2 = 0;
  double weight = 1;           // 0..1, quality of the fit; more for what stands for a whole square
  int cluster = 0;             // spatial neighbours share one: they are not independent
};

// Several edges within 32 px taken together, for the search and for counting inliers.
struct Cluster {
  double x = 0, y = 0;
  double squared_disc_px2 = 0;
  double sigma_px = 0.3;       // of c, from the scatter and number of its edges
};

struct Scene {
  double centre_x_px = 0, centre_y_px = 0, scale_px = 1;
  std::vector<Point> points;
  std::vector<Cluster> clusters;
};

// l = g + a X + b Y, S = l^2 + floor; px, centred coordinates.
struct Field {
  double g = 0, a = 0, b = 0;
  double floor_px2 = 0;
};

inline double signed_disc(const Field& field, double x, double y) { return field.g + field.a * x + field.b * y; }

// Direction of the near side, unit vector in the unrotated frame.
struct Direction {
  double x = 0, y = 1;
};
Direction direction_of(NearSide side);

// Chooses, place by place, the finest pyramid level that can tell the blur there, and keeps its edges.
Scene scene_of(std::span<const EdgeSample> edges, std::span<const BlurSample> samples, const PlaneOptions& options);

// Cost of a field: the clusters from the near side up to the end of the surface are judged, those beyond (background
// above the horizon) cost what a cluster costs that says nothing. Lower is better; negative = the field explains them.
struct Score {
  double cost = 0;
  double far_end = 0;          // position of that end along the near direction, centred coordinates
  int clusters = 0;            // judged
};
Score score_of(const Scene& scene, const Field& field, const Direction& near, std::vector<int>& order);

// Candidates, best first, well apart from each other. `near` turns by up to options.direction_range_deg.
std::vector<Field> search(const Scene& scene, const Direction& near, double direction_range_deg);

struct Fit {
  Field field;
  double covariance[3][3] = {};   // of (g, a, b), centred coordinates
  Score score;
  double inlier_fraction = 0;
  double least_px = 0, most_px = 0;   // signed blur that the inliers span, outer twentieths left out
  bool settled = false;
};
Fit refine(const Scene& scene, const Field& start, const Direction& near);

// Where the subject meets the surface.
struct ContactFinding {
  Contact contact = Contact::none;
  double x = 0, y = 0;            // fractions of the frame
  double extra_sigma_px = 0;      // of the signed blur there, from not knowing the place
};
ContactFinding find_contact(const Scene& scene, const Fit& fit, NearSide near_side, const PlaneOptions& options);

bool is_inlier(const Cluster& cluster, const Field& field);

// Standard error of S for single edges whose disc is `squared_disc_px2`: scatter of mixed content, 20 % of S, and the
// fit's own on a sharp edge. Measured on rendered tiles; its scale is estimated anew in every frame.
double edge_sigma_px2(double squared_disc_px2);

// Blur beyond this is not used: wide discs are under-read on fine texture.
constexpr double kWidestDiscPx = 18;

}  // namespace focusfall::plane_fit
