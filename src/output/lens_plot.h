// The plot of `lens`: every frame's signed defocus with its interval against the depth of focus, group by group.
// Readable in grey print: points, lines, a band.
#pragma once

#include <string>

#include "src/output/lens_report.h"

namespace focusfall {

inline constexpr const char* kLensPlotMark = "Focusfall lens plot";

// The bytes of an SVG file that is_marked_svg() knows by kLensPlotMark. Frames stand in groups, in order of time.
std::string lens_plot_svg(const LensOutput& output);

}  // namespace focusfall
