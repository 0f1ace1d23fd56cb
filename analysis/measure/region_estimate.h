// Blur of one region of the picture with its 95 % bounds: edges and spectrum brought together.
#pragma once

#include <optional>
#include <span>

#include "analysis/measure/measurement.h"
#include "analysis/measure/pyramid.h"
#include "analysis/measure/region_blur.h"
#include "analysis/measure/spectrum.h"

namespace focusfall {

// Edges and spectrum of one region fused. Where they agree the mean counts; where the edges read less, the region
// holds fine texture, whose edges crowd each other, and the spectrum is believed; where they read more, the spectrum
// was misled by something that is no texture, and the edges are believed. nullopt if neither says anything.
std::optional<BlurEstimate> fused_blur(const std::optional<EdgeBlur>& edges,
                                       const std::optional<SpectralBlur>& spectrum);

// A BlurEstimate of c = sqrt(S) +- sigma_px, with rise and MTF50 of the same disc.
BlurEstimate blur_estimate(double squared_disc_px2, double sigma_px, Bound bound = Bound::none);

// Spectral blur of a region in level-0 px, on the pyramid level that suits the blur; nullopt as SpectralEstimator, or
// for a region below SpectralEstimator::kTile. `scratch` is a buffer to reuse.
std::optional<SpectralBlur> region_spectrum(const Pyramid& pyramid, PixelRect region, SpectralEstimator& estimator,
                                            cv::Mat& scratch);

// The edges of a region that holds two blurs (a subject and what is behind it, or two parts of one subject), apart.
struct EdgeGroups {
  std::vector<EdgeSample> sharper, softer;   // both empty where one blur explains all edges
};

// The split asks for a clear gap, a quarter of the weight in the sharper group, 12 edges in each, and for the two groups
// to lie in different places: the scatter of one blur does not.
EdgeGroups edge_groups(std::span<const EdgeSample> edges, PixelRect region);

}  // namespace focusfall
