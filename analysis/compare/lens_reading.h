// What one photograph says about a lens, and how readings are brought together: acquisitions and groups.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace focusfall {

enum class FocusAreaPlace { centre, off_centre, unknown };
enum class ApproachSide { near, far, unknown };   // from which focus came: from nearer or from farther than the subject

// One frame whose plane fit was accepted and touches the aim. Every one counts, inside the depth of field too.
struct LensReading {
  std::size_t frame = 0;                    // the caller's number of the frame
  std::string lens, body;                   // serial number with the model, else the model; "" where not recorded
  double focal_length_mm = 0;               // > 0
  double f_number = 0;                      // as marked
  std::optional<double> focus_distance_m;   // may be infinite
  FocusAreaPlace area = FocusAreaPlace::unknown;
  std::string focus_mode;                   // "single", "continuous"; "" where not recorded
  ApproachSide approach = ApproachSide::unknown;
  std::optional<double> taken_at_s;         // on the body's own clock, any origin
  bool on_surface = false;                  // the aim lay on the surface itself, not on something standing on it
  double defocus_um = 0;                    // signed, at the sensor; + = focus fell behind the subject
  double sigma_um = 0;                      // standard error of that one reading
  double limit_um = 0;                      // half the depth of focus: acceptable blur x working f-number
};

// One act of focusing. All its frames share the error that is looked for, so that they are one witness, not many.
struct Acquisition {
  std::vector<std::size_t> readings;        // positions in the span that was grouped, in order of time
  double defocus_um = 0;                    // mean of the frames, weighted by their errors
  double sigma_um = 0;
};

// Readings of one lens on one body under like conditions.
struct ReadingGroup {
  std::string lens, body, focus_mode;
  int focal_cluster = 0;                    // focal lengths within 5 % of their middle, numbered from the shortest
  double f_number = 0;
  std::optional<int> distance_band;         // focus distances within a factor of 1.5, numbered from the nearest
  FocusAreaPlace area = FocusAreaPlace::unknown;
  double focal_length_mm = 0;               // median
  std::optional<double> focus_distance_m;   // median
  double limit_um = 0;                      // median
  std::vector<std::size_t> readings;
  std::vector<Acquisition> acquisitions;
};

// Groups in the order of their keys. Bands are cut where distances leave a gap, never at fixed marks: a frame's own
// focus error shifts its recorded distance, and a mark across the readings would sort them by the error itself.
std::vector<ReadingGroup> group_readings(std::span<const LensReading> readings);

double median(std::vector<double> values);   // of at least one

}  // namespace focusfall
