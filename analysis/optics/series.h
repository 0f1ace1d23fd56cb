// The marked series of f-numbers, exposure times and sensitivities, and the exact values that they stand for.
//
// A diaphragm and a shutter move in equal steps of a stop; the engraved numbers are rounded (f/11 is 11.31, 1/60 s is
// 1/64 s). Errors of the marks reach .141 stop for f-numbers (f/1.2) and .093 for times.
#pragma once

#include <optional>
#include <span>

namespace focusfall {

// Largest difference, in stops, between a mark and its exact value (recomputed from the printed lists).
inline constexpr double kFNumberMarkTolerance = 0.15;
inline constexpr double kTimeMarkTolerance = 0.10;

// Marks in thirds of a stop, ascending f-number (f/0.7 ... f/64) and ascending time (1/8000 ... 30 s).
std::span<const double> f_number_marks();
std::span<const double> exposure_time_marks_s();

// The exact value of a mark: 2^(k/6) for the thirds, 2^(k/4) for the half stops that are no thirds (f/1.7, f/2.4 ...).
// An exact value is its own. nullopt for a number on neither series (f/4.2 of a zoom lens): take it as it stands.
std::optional<double> exact_f_number(double nominal);

// The same for times: 2^(k/3) seconds, else 2^(k/2).
std::optional<double> exact_exposure_time_s(double nominal_s);

// What the ring or the display would show: the mark of the nearest third; nullopt beyond the ends of the series.
std::optional<double> nominal_f_number(double exact);
std::optional<double> nominal_exposure_time_s(double exact_s);

// First mark in thirds whose exact value closes at least as far (f-number) or is at most as long (time); nullopt beyond
// the ends. For settings that must hold a limit.
std::optional<double> f_number_mark_at_least(double f_number);
std::optional<double> exposure_time_mark_at_most_s(double exposure_time_s);

}  // namespace focusfall
