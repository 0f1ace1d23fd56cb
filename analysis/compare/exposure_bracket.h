// Exposure brackets: frames taken one after the other at exposures in equal steps.
#pragma once

#include <span>
#include <vector>

#include "analysis/compare/exposure_audit.h"

namespace focusfall {

// Runs of three frames and more of a set at one f-number, at most a few seconds apart beside their exposures, whose exposures as set
// (t S / N^2, else the recorded bias) are all different and, sorted, in equal steps of a third of a stop or more.
// `set` gives the frames in the order of time and their relative levels.
std::vector<Bracket> find_brackets(std::span<const ExposureFrame> frames, const ExposureSet& set);

}  // namespace focusfall
