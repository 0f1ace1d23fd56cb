// The findings of `lens` in plain words: what was seen, how sure it is, and what to do next. Never a repair instruction.
#pragma once

#include <string>

#include "analysis/compare/lens_report.h"

namespace focusfall {

const char* lens_finding_name(LensFinding finding);   // "front focus" ... "not enough evidence"
const char* series_kind_name(SeriesKind kind);        // "test series", "ordinary frames"
const char* focus_area_place_name(FocusAreaPlace place);   // "centre", "off centre", "unknown"
const char* trend_kind_name(TrendKind kind);          // "focus distance" ...
const char* trend_unit(TrendKind kind);               // "um per doubling" ...

std::string finding_text(const LensGroup& group);
std::string next_step_text(const LensGroup& group);
std::string summary_text(const LensReport& report);

}  // namespace focusfall
