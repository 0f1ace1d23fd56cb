// The mosaic of a camera raw file, for clipping and tone. Costs the unpacking of the whole raw data: ask for it only
// where clipping is asked for.
#pragma once

#include <cstddef>
#include <span>

#include "analysis/measure/mosaic_clipping.h"
#include "src/decode/decoder.h"

namespace focusfall {

class MosaicSink {
 public:
  virtual ~MosaicSink() = default;
  virtual void start(const MosaicFormat& format) = 0;
  virtual void take(const MosaicStrip& strip) = 0;
};

// True for a camera raw file, by content alone. Its mosaic may still turn out to be unreadable.
bool is_camera_raw(std::span<const std::byte> file);

// Strips of the visible photosites from top to bottom, unrotated. Errors: not-raw, raw-unknown-body (no decoder for
// it), raw-damaged (the data is cut short or contradicts itself; nothing is delivered), raw-unsupported (other than
// three colours, floating point).
Decoded<MosaicFormat> decode_mosaic(std::span<const std::byte> file, MosaicSink& sink);

}  // namespace focusfall
