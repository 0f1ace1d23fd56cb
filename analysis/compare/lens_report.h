// Front or back focus of a lens on a body from many frames: bias, repeatability, confidence, trends, and the finding.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/compare/lens_reading.h"
#include "analysis/compare/lens_trend.h"
#include "analysis/conventions.h"

namespace focusfall {

// The least bias that is called a side: a quarter of the limit of the depth of field. Common practice asks an autofocus
// to stay within a third at the widest opening (no source); a quarter is well inside that (judgement).
inline constexpr double kToleranceLimits = 0.25;

// What more frames of the same kind do not average away, 95 %: the plane's own bias, the working f-number, the marked
// focal length. Rendered sets showed .2 to 5 % of the limit.
inline constexpr double kSystematicFloorLimits = 0.05;

inline constexpr int kLeastFrames = 5;              // usable frames of a group before anything is said
inline constexpr int kLeastAcquisitionsForBias = 3; // two degrees of freedom
inline constexpr int kLeastOrdinary = 20;           // acquisitions that ordinary frames need for a finding

enum class LensFinding { front_focus, back_focus, within_tolerance, scatter, not_enough_evidence };

// A series made to test the lens (aim on one surface, like distances), or frames made for another purpose, which were
// taken under conditions that nobody chose for this question.
enum class SeriesKind { test_series, ordinary_frames };

struct LensGroup {
  ReadingGroup of;
  SeriesKind kind = SeriesKind::test_series;
  std::optional<Interval> bias_um;          // robust mean over the acquisitions; 95 %: Student and floor
  std::optional<Interval> bias_limits;      // in limits of the depth of field
  std::optional<Interval> spread_um;        // standard deviation between acquisitions beside the frames' own errors
  double within_third = 0;                  // share of the acquisitions, as measured
  double within_whole = 0;
  bool mixed = false;                       // front and back, each by a clear margin
  double p = 1;                             // of a bias at least so large where there is none
  double p_holm = 1;                        // over all groups and trends of the run
  std::vector<std::size_t> outliers;        // the caller's frame numbers
  LensFinding finding = LensFinding::not_enough_evidence;
  bool hint = false;                        // ordinary frames: the wording is weaker
  std::string text;                         // finding in one or two sentences
  std::string next;                         // what to do next, one sentence
};

struct LensReport {
  std::vector<LensGroup> groups;
  std::vector<LensTrend> trends;
  LensOrBody lens_or_body;
  std::optional<LensFinding> finding;       // where all groups that have one agree
  std::string summary;
};

struct LensReportOptions {
  std::optional<SeriesKind> kind;           // as the user says; else seen from the frames
};

LensReport lens_report(std::span<const LensReading> readings, const LensReportOptions& options = {});

// Holm (A simple sequentially rejective multiple test procedure, 1979): adjusted probabilities in the order given.
std::vector<double> holm_adjusted(std::span<const double> p);

// Trend and effect as a sentence.
std::string trend_text(const LensTrend& trend);
std::string lens_or_body_text(const LensOrBody& parts);

}  // namespace focusfall
