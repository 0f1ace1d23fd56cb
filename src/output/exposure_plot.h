// The exposure of sets as a drawing: level against exposure with the unit slope, and the error of every f-number.
// Readable in grey print.
#pragma once

#include <string>

#include "src/output/exposure_report.h"
#include "src/output/sheet.h"

namespace focusfall {

inline constexpr const char* kExposurePlotMark = "Focusfall exposure plot";   // comment that says who wrote the SVG

// Pixels of the drawing: one strip a tested set; one with a sentence where none was.
struct PlotSize {
  int width_px = 0;
  int height_px = 0;
};
PlotSize exposure_plot_size(const ExposureReport& report);

// Draws on a sheet of that size.
void draw_exposure_plot(const ExposureReport& report, Sheet& sheet);

// The whole drawing as the text of an SVG file.
std::string exposure_plot_svg(const ExposureReport& report);

}  // namespace focusfall
