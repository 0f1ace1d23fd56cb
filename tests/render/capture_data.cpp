// The only file of the renderer that includes Exiv2.
#include <cmath>
#include <exiv2/exiv2.hpp>

#include "tests/render/frame.h"

namespace focusfall::render {
namespace {

Exiv2::URational rational(double value, std::uint32_t denominator) {
  return {static_cast<std::uint32_t>(std::lround(value * denominator)), denominator};
}

void add(Exiv2::ExifData& exif, const char* key, const Exiv2::URational& value) {
  exif[key] = value;
}

}  // namespace

std::vector<std::uint8_t> with_capture_data(const std::vector<std::uint8_t>& jpeg, const LensSpec& lens,
                                            const CaptureData& data) {
  auto image = Exiv2::ImageFactory::open(jpeg.data(), jpeg.size());
  image->readMetadata();
  Exiv2::ExifData exif;
  exif["Exif.Image.Make"] = data.make;
  exif["Exif.Image.Model"] = data.model;
  exif["Exif.Image.Orientation"] = static_cast<std::uint16_t>(data.orientation);
  // What a valid Exif file holds besides (Exif 2.3, tags that JPEG requires).
  exif["Exif.Image.XResolution"] = Exiv2::URational(72, 1);
  exif["Exif.Image.YResolution"] = Exiv2::URational(72, 1);
  exif["Exif.Image.ResolutionUnit"] = std::uint16_t{2};
  exif["Exif.Image.YCbCrPositioning"] = std::uint16_t{1};
  exif["Exif.Photo.ComponentsConfiguration"] = "1 2 3 0";
  exif["Exif.Photo.FlashpixVersion"] = "48 49 48 48";  // "0100"
  exif["Exif.Photo.ColorSpace"] = std::uint16_t{1};    // sRGB
  exif["Exif.Image.ImageDescription"] = "Rendered, not photographed";
  // A time below half a second is written as 1/n, as cameras do.
  add(exif, "Exif.Photo.ExposureTime",
      data.exposure_time_s < 0.5 ? Exiv2::URational(1, static_cast<std::uint32_t>(std::lround(1 / data.exposure_time_s)))
                                 : rational(data.exposure_time_s, 10));
  add(exif, "Exif.Photo.FNumber", rational(lens.f_number, 10));
  exif["Exif.Photo.ExposureProgram"] = static_cast<std::uint16_t>(data.manual_exposure ? 1 : 2);
  exif["Exif.Photo.ISOSpeedRatings"] = static_cast<std::uint16_t>(std::lround(data.iso_speed));
  exif["Exif.Photo.ExifVersion"] = "48 50 51 48";  // "0230"
  exif["Exif.Photo.DateTimeOriginal"] = data.taken_at;
  exif["Exif.Photo.SubSecTimeOriginal"] = data.subsecond;
  if (data.focus_distance_m) {
    const bool infinite = std::isinf(*data.focus_distance_m);
    add(exif, "Exif.Photo.SubjectDistance",
        infinite ? Exiv2::URational(0xFFFFFFFFU, 1) : rational(*data.focus_distance_m, 1000));
  }
  exif["Exif.Photo.Flash"] = std::uint16_t{0};
  add(exif, "Exif.Photo.FocalLength", rational(lens.focal_length_mm, 10));
  if (data.focus_area) {
    Exiv2::UShortValue area;
    for (const int value : {data.focus_area->x + data.focus_area->width / 2, data.focus_area->y + data.focus_area->height / 2,
                            data.focus_area->width, data.focus_area->height})
      area.value_.push_back(static_cast<std::uint16_t>(value));
    exif.add(Exiv2::ExifKey("Exif.Photo.SubjectArea"), &area);
  }
  exif["Exif.Photo.PixelXDimension"] = static_cast<std::uint32_t>(lens.width_px);
  exif["Exif.Photo.PixelYDimension"] = static_cast<std::uint32_t>(lens.height_px);
  add(exif, "Exif.Photo.FocalPlaneXResolution", {10000000, static_cast<std::uint32_t>(std::lround(1000 * lens.pitch_um))});
  add(exif, "Exif.Photo.FocalPlaneYResolution", {10000000, static_cast<std::uint32_t>(std::lround(1000 * lens.pitch_um))});
  exif["Exif.Photo.FocalPlaneResolutionUnit"] = std::uint16_t{3};  // per centimetre
  exif["Exif.Photo.ExposureMode"] = static_cast<std::uint16_t>(data.manual_exposure ? 1 : 0);
  exif["Exif.Photo.BodySerialNumber"] = data.body_serial;
  exif["Exif.Photo.LensModel"] = data.lens;
  exif["Exif.Photo.LensSerialNumber"] = data.lens_serial;
  image->setExifData(exif);
  image->writeMetadata();
  Exiv2::BasicIo& io = image->io();
  if (io.open() != 0) throw std::runtime_error("the renderer's own JPEG could not be read back from memory");
  const Exiv2::DataBuf bytes = io.read(static_cast<long>(io.size()));
#if EXIV2_TEST_VERSION(0, 28, 0)
  return {bytes.c_data(), bytes.c_data() + bytes.size()};
#else
  return {bytes.pData_, bytes.pData_ + bytes.size_};
#endif
}

}  // namespace focusfall::render
