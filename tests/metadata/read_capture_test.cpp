// Whole files: cut short, damaged, of other kinds, read by several threads at once.
#include "metadata/read_capture.h"

#include <fmt/format.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <atomic>
#include <chrono>
#include <cmath>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <random>
#include <thread>

#include "metadata/remarks.h"
#include "tests/metadata/exif_file.h"
#include "tests/metadata/note_bytes.h"

namespace focusfall {
namespace {

std::vector<std::byte> bytes_of(const std::string& text) {
  std::vector<std::byte> bytes(text.size());
  std::memcpy(bytes.data(), text.data(), text.size());
  return bytes;
}

// A file that holds something for every part of the reader.
ExifFile full_file(int number = 7) {
  ExifFile file;
  file.set("Exif.Image.Make", "NIKON CORPORATION").set("Exif.Image.Model", "NIKON D90");
  file.set("Exif.Image.Orientation", "6").set("Exif.Image.Software", "Ver.1.00");
  file.set("Exif.Photo.FocalLength", "24/1").set("Exif.Photo.FNumber", "28/10").set("Exif.Photo.ExposureTime", "1/500");
  file.set("Exif.Photo.ISOSpeedRatings", "200").set("Exif.Photo.DateTimeOriginal", "2026:06:20 14:03:07");
  file.set("Exif.Photo.SubSecTimeOriginal", "25").set("Exif.Photo.FocalLengthIn35mmFilm", "36");
  file.set("Exif.Photo.PixelXDimension", "4288").set("Exif.Photo.PixelYDimension", "2848");
  file.set("Exif.Photo.SubjectArea", "2144 1424 400 300").set("Exif.Photo.LensSpecification", "24/1 24/1 28/10 28/10");
  file.set("Exif.Nikon3.Version", "48 50 49 48").set("Exif.Nikon3.SerialNumber", "2188172");
  file.set("Exif.Nikon3.ShutterCount", Exiv2::unsignedLong, "4044").set("Exif.Nikon3.Focus", "AF-C  ");
  file.set("Exif.NikonLd3.Version", "48 50 48 52").set("Exif.NikonLd3.FocalLength", "55");
  file.set("Exif.NikonLd3.FocusDistance", "68");
  file.xmp =
      "<x:xmpmeta xmlns:x=\"adobe:ns:meta/\"><rdf:RDF xmlns:rdf=\"http://www.w3.org/1999/02/22-rdf-syntax-ns#\">"
      "<rdf:Description rdf:about=\"\" xmlns:aux=\"http://ns.adobe.com/exif/1.0/aux/\" aux:LensSerialNumber=\"L" +
      std::to_string(number) +
      "\" xmlns:mwg-rs=\"http://www.metadataworkinggroup.com/schemas/regions/\""
      " xmlns:stArea=\"http://ns.adobe.com/xmp/sType/Area#\"><mwg-rs:Regions rdf:parseType=\"Resource\">"
      "<mwg-rs:RegionList><rdf:Bag><rdf:li><rdf:Description mwg-rs:Type=\"Face\"><mwg-rs:Area stArea:x=\"0.3\""
      " stArea:y=\"0.3\" stArea:w=\"0.1\" stArea:h=\"0.1\"/></rdf:Description></rdf:li></rdf:Bag>"
      "</mwg-rs:RegionList></mwg-rs:Regions></rdf:Description></rdf:RDF></x:xmpmeta>";
  file.decoded = {4288, 2848};
  return file;
}

TEST(ReadCapture, TheFullFileHoldsWhatTheFollowingTestsDamage) {
  const CaptureReading reading = full_file().read();
  EXPECT_TRUE(reading.remarks.empty());
  const Capture& c = reading.capture;
  EXPECT_TRUE(c.camera && c.lens && c.body_serial && c.lens_serial && c.taken_at && c.sequence && c.focal_length_mm);
  EXPECT_TRUE(c.f_number && c.exposure_time_s && c.iso_speed && c.focus_distance && c.pixel_pitch_um && c.focus_mode);
  EXPECT_EQ(c.focus_areas.size(), 2U);
}

TEST(ReadCapture, TextsOfAnyLengthAreShortened) {
  ExifFile file = full_file();
  file.set("Exif.Image.Model", std::string(30000, 'x')).set("Exif.Photo.DateTimeOriginal", std::string(20000, '9'));
  const CaptureReading reading = file.read();
  EXPECT_LE(reading.capture.camera.value().value.size(), 200U);
  ASSERT_EQ(reading.remarks.size(), 1U);
  EXPECT_LT(reading.remarks.front().message.size(), 300U);
}

TEST(ReadCapture, FocusAreasOfAPictureThatWasCroppedOrTurnedAreDropped) {
  ExifFile file = full_file();
  file.decoded = {2144, 1424};  // reduced
  EXPECT_EQ(file.read().capture.focus_areas.size(), 2U);
  for (const DecodedSize size : {DecodedSize{2848, 4288}, DecodedSize{4288, 2412}, DecodedSize{1000, 1000}}) {
    file.decoded = size;
    const CaptureReading reading = file.read();
    EXPECT_TRUE(has_remark(reading, kFocusAreaMisplaced));
    for (const FocusArea& area : reading.capture.focus_areas) EXPECT_EQ(area.source, Source::xmp);
  }
}

TEST(ReadCapture, TheFirstPartOfAJpegHoldsItsCaptureData) {
  std::vector<std::byte> jpeg = full_file().jpeg();
  jpeg.resize(jpeg.size() - 3);  // the scan data
  const CaptureReading reading = read_capture(jpeg, {4288, 2848});
  EXPECT_EQ(reading.capture.lens_serial.value().value, "L7");
  EXPECT_TRUE(reading.remarks.empty());
}

// A TIFF structure with one Exif value, as every container holds it.
std::vector<std::uint8_t> small_tiff() {
  ExifFile file;
  file.set("Exif.Photo.FNumber", "28/10");
  Exiv2::Blob blob;
  Exiv2::ExifParser::encode(blob, Exiv2::littleEndian, file.exif);
  return {blob.begin(), blob.end()};
}

void append_big_endian(std::string& bytes, std::size_t value, int count) {
  for (int shift = 8 * (count - 1); shift >= 0; shift -= 8) bytes += static_cast<char>(value >> shift & 0xFF);
}

std::string box(const std::string& type, const std::string& content) {
  std::string bytes;
  append_big_endian(bytes, content.size() + 8, 4);
  return bytes + type + content;
}

// ISO/IEC 14496-12 and 23008-12: a file type, and a meta box whose only item is Exif; its place is in iloc.
std::string heif_with_exif() {
  const auto tiff = small_tiff();
  const std::string exif = std::string(4, '\0') + std::string(tiff.begin(), tiff.end());  // offset to the TIFF header
  const std::string type = box("ftyp", std::string("heic\0\0\0\0mif1heic", 16));
  const auto meta_at = [&](std::size_t exif_at) {
    const std::string entry =
        std::string("\x02\0\0\0\0\x01\0\0", 8) + "Exif" + std::string(1, '\0');  // item 1, no protection
    const std::string items = box("iinf", std::string("\0\0\0\0\0\x01", 6) + box("infe", entry));
    std::string place("\0\0\0\0\x44\0\0\x01\0\x01\0\0\0\x01", 14);  // 4-byte offsets and lengths; item 1, one extent
    append_big_endian(place, exif_at, 4);
    append_big_endian(place, exif.size(), 4);
    const std::string handler = box("hdlr", std::string(8, '\0') + "pict" + std::string(13, '\0'));
    return box("meta", std::string(4, '\0') + handler + items + box("iloc", place));
  };
  const std::size_t exif_at = type.size() + meta_at(0).size() + 8;
  return type + meta_at(exif_at) + box("mdat", exif);
}

// PNG, third edition: a chunk eXIf holds the TIFF structure.
std::string png_with_exif() {
  const auto chunk = [](const std::string& name, const std::string& content) {
    std::string bytes;
    append_big_endian(bytes, content.size(), 4);
    bytes += name + content;
    std::uint32_t crc = 0xFFFFFFFF;
    for (const char c : name + content) {
      crc ^= static_cast<std::uint8_t>(c);
      for (int k = 0; k < 8; ++k) crc = (crc >> 1) ^ (0xEDB88320 & (0 - (crc & 1)));
    }
    append_big_endian(bytes, ~crc & 0xFFFFFFFF, 4);
    return bytes;
  };
  const auto tiff = small_tiff();
  return std::string("\x89PNG\r\n\x1a\n") + chunk("IHDR", std::string("\0\0\0\x01\0\0\0\x01\x08\x02\0\0\0", 13)) +
         chunk("eXIf", std::string(tiff.begin(), tiff.end())) +
         chunk("IDAT", std::string("\x78\x9c\x63\x60\x60\x60\0\0\0\x04\0\x01", 12)) + chunk("IEND", "");
}

TEST(ReadCapture, EveryContainerOfExifIsRead) {
  const auto tiff = small_tiff();
  const std::pair<const char*, std::string> files[] = {
      {"TIFF", std::string(tiff.begin(), tiff.end())}, {"PNG", png_with_exif()}, {"HEIF", heif_with_exif()}};
  for (const auto& [kind, file] : files) {
    const CaptureReading reading = read_capture(bytes_of(file), {1, 1});
    ASSERT_TRUE(reading.capture.f_number) << kind;
    EXPECT_DOUBLE_EQ(reading.capture.f_number->value, 2.8) << kind;
  }
}

TEST(ReadCapture, WhatIsNoPictureGivesNothingAndARemark) {
  for (const std::string text : {"", "x", "not a picture at all, but a text of some length", "http://x/y.jpg"}) {
    const CaptureReading reading = read_capture(bytes_of(text), {});
    EXPECT_FALSE(reading.capture.camera || reading.capture.f_number);
    EXPECT_EQ(has_remark(reading, kMetadataUnreadable), !text.empty()) << text;
  }
}

TEST(ReadCapture, AFileCutAnywhereNeverThrows) {
  const std::vector<std::byte> jpeg = full_file().jpeg();
  for (std::size_t size = 0; size < jpeg.size(); ++size) {
    EXPECT_NO_THROW((void)read_capture(std::span(jpeg).first(size), {4288, 2848}));
  }
}

// A packet that binds `prefix` to the basic namespace of XMP, as two generations of programs do it.
std::string bound_packet(const std::string& prefix, const std::string& serial) {
  return fmt::format(
      "<x:xmpmeta xmlns:x=\"adobe:ns:meta/\"><rdf:RDF xmlns:rdf=\"http://www.w3.org/1999/02/22-rdf-syntax-ns#\">"
      "<rdf:Description rdf:about=\"\" xmlns:{0}=\"http://ns.adobe.com/xap/1.0/\" {0}:Rating=\"0\""
      " {0}:CreatorTool=\"a tool\" {0}:CreateDate=\"2011-03-12T15:36:11.00+01:00\""
      " xmlns:aux=\"http://ns.adobe.com/exif/1.0/aux/\" aux:LensSerialNumber=\"{1}\"/></rdf:RDF></x:xmpmeta>",
      prefix, serial);
}

TEST(ReadCapture, FourThreadsReadingXmpLoseNothing) {
  // The parser rebinds prefixes while it reads, in tables that all threads share. Unprotected, some readings in a
  // thousand lost all XMP without an error, where files with different prefixes met.
  constexpr int kThreads = 4, kReadings = 1500;
  std::vector<std::vector<std::byte>> files;
  for (const char* prefix : {"xmp", "xap"}) {
    ExifFile file;
    file.xmp = bound_packet(prefix, fmt::format("L-{}", prefix));
    files.push_back(file.jpeg());
  }
  std::atomic<int> complete = 0;
  std::vector<std::thread> threads;
  for (int t = 0; t < kThreads; ++t) {
    threads.emplace_back([&files, &complete, t] {
      for (int i = 0; i < kReadings; ++i) {
        const std::size_t which = static_cast<std::size_t>(t + i) % files.size();
        const Capture capture = read_capture(files[which], {4288, 2848}).capture;
        const char* expected = which == 0 ? "L-xmp" : "L-xap";
        if (capture.lens_serial && capture.lens_serial->value == expected && capture.software) ++complete;
      }
    });
  }
  for (std::thread& thread : threads) thread.join();
  EXPECT_EQ(complete, kThreads * kReadings);
}

TEST(ReadCapture, APrefixThatOneFileBindsDoesNotRenameThePropertiesOfTheNext) {
  ExifFile odd, plain;
  odd.xmp =
      "<x:xmpmeta xmlns:x=\"adobe:ns:meta/\"><rdf:RDF xmlns:rdf=\"http://www.w3.org/1999/02/22-rdf-syntax-ns#\">"
      "<rdf:Description rdf:about=\"\" xmlns:mwg-rs=\"http://own.invalid/one/\" mwg-rs:value=\"1\""
      " xmlns:aux=\"http://own.invalid/two/\" aux:value=\"1\" xmlns:one=\"http://ns.adobe.com/exif/1.0/aux/\""
      " one:Lens=\"odd\"/></rdf:RDF></x:xmpmeta>";
  plain = full_file();
  const Capture before = plain.read().capture;
  EXPECT_EQ(odd.read().capture.lens.value().value, "odd");
  const Capture after = plain.read().capture;
  EXPECT_TRUE(before.lens_serial && after.lens_serial);
  EXPECT_EQ(after.focus_areas.size(), before.focus_areas.size());
}

// ---- damage ---------------------------------------------------------------------------------------------------------

// One of: a byte changed, a bit turned, two bytes set to an extreme, a part copied over another, the end cut off.
void damage(std::vector<std::byte>& file, std::mt19937& random) {
  const auto any = [&](std::size_t n) { return std::uniform_int_distribution<std::size_t>(0, n - 1)(random); };
  const std::size_t at = any(file.size());
  switch (any(5)) {
    case 0:
      file[at] = static_cast<std::byte>(any(256));
      break;
    case 1:
      file[at] ^= static_cast<std::byte>(1U << any(8));
      break;
    case 2: {
      const std::byte extreme = any(2) == 0 ? std::byte{0xFF} : std::byte{0};
      for (std::size_t i = at; i < std::min(at + 1 + any(4), file.size()); ++i) file[i] = extreme;
      break;
    }
    case 3: {
      const std::size_t from = any(file.size()), count = std::min({any(64) + 1, file.size() - at, file.size() - from});
      std::copy_n(
          std::vector(file.begin() + static_cast<long>(from), file.begin() + static_cast<long>(from + count)).begin(),
          count, file.begin() + static_cast<long>(at));
      break;
    }
    default:
      file.resize(at + 1);
  }
}

// What every consumer may rely on, whatever the file holds.
void expect_sound(const CaptureReading& reading) {
  const Capture& c = reading.capture;
  const auto within = [](const OptionalSourced<double>& value, double least, double greatest) {
    EXPECT_TRUE(!value || (value->value >= least && value->value <= greatest))
        << value.value_or(Sourced<double>{}).value;
  };
  within(c.focal_length_mm, 0.5, 20000);
  within(c.f_number, 0.7, 1000);
  within(c.exposure_time_s, 1e-7, 86400);
  within(c.iso_speed, 1, 2e7);
  if (c.focus_distance) {
    const FocusDistance& d = c.focus_distance->value;
    EXPECT_TRUE(d.low_m >= 0 && d.low_m <= d.value_m && d.value_m <= d.high_m) << d.low_m << ' ' << d.value_m;
  }
  if (c.pixel_pitch_um) {
    const CoarseValue& p = c.pixel_pitch_um->value;
    EXPECT_TRUE(p.low > 0 && p.low <= p.value && p.value <= p.high && std::isfinite(p.high));
  }
  for (const FocusArea& area : c.focus_areas) {
    const FractionRect& box = area.box;
    EXPECT_TRUE(std::isfinite(box.x) && std::isfinite(box.y) && box.width >= 0 && box.height >= 0);
    EXPECT_TRUE(box.width <= 1 && box.height <= 1 && box.x <= 1 && box.y <= 1) << box.x << ' ' << box.width;
  }
  EXPECT_TRUE(!c.orientation || (c.orientation->value >= 1 && c.orientation->value <= 8));
}

TEST(ReadCapture, DamagedFilesNeverThrowAndNeverGiveNonsense) {
  ExifFile canon;
  canon.set("Exif.Image.Make", "Canon")
      .set("Exif.Image.Model", "Canon EOS 1300D")
      .set("Exif.Photo.FocalLength", "36/1");
  canon.set("Exif.Photo.FocalPlaneXResolution", "5184000/905").set("Exif.Photo.PixelXDimension", "5184");
  canon.set("Exif.Photo.PixelYDimension", "3456").set("Exif.CanonFi.FocusDistanceUpper", Exiv2::signedShort, "182");
  canon.set("Exif.CanonFi.FocusDistanceLower", Exiv2::signedShort, "113");
  canon.set("Exif.Canon.AFInfo", Exiv2::unsignedShort,
            "44 2 2 2 5184 3456 5184 3456 181 129 117 172 0 64697 0 743 1 1 0 65535 0 0");
  ExifFile olympus;
  olympus.set("Exif.Image.Make", "OLYMPUS CORPORATION").set("Exif.Photo.FocalLength", "17/1");
  olympus.set_bytes("Exif.Photo.MakerNote",
                    olympus_note({{0x2010, {rationals(0x0103, 5, {2160, 100}), text(0x0203, "OLYMPUS M.17mm F1.8")}},
                                  {0x2020, {rationals(0x0305, 10, {0, 0, 255, 510, 252, 510, 255, 510, 252, 510})}},
                                  {0x2050, {rationals(0x0305, 5, {2500, 10})}}}));
  const std::vector<std::byte> originals[] = {full_file().jpeg(), canon.jpeg(), olympus.jpeg()};

  std::mt19937 random(20261201);
  constexpr int kMutations = 20000;
  const auto start = std::chrono::steady_clock::now();
  int changed = 0;
  for (int i = 0; i < kMutations; ++i) {
    std::vector<std::byte> file = originals[i % std::size(originals)];
    const int times = 1 + i % 4;
    for (int k = 0; k < times; ++k) damage(file, random);
    CaptureReading reading;
    ASSERT_NO_THROW(reading = read_capture(file, {4288, 2848})) << "mutation " << i;
    expect_sound(reading);
    if (!reading.remarks.empty() || !reading.capture.camera) ++changed;
  }
  const double seconds = std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
  // Many mutations must reach what is read, else this test tests nothing. Measured: about a third.
  EXPECT_GT(changed, kMutations / 10);
  // Measured: 0.03 ms for each reading. A hundred times that means that a file sends the reader round in circles.
  EXPECT_LT(seconds, 60);
  RecordProperty("seconds", std::to_string(seconds));
}

// The notes of real cameras: npm packages exif 0.6.0 and jpeg-exif 1.1.4, both MIT, fetched by
// tests/fetch_open_data.sh.
TEST(ReadCapture, DamagedCameraFilesNeverThrowAndNeverGiveNonsense) {
  namespace fs = std::filesystem;
  constexpr std::size_t kHead = 64 * 1024;
  std::vector<fs::path> paths;
  std::error_code error;
  for (const char* package : {"exif/test", "jpeg-exif/test"}) {
    for (const auto& entry : fs::directory_iterator(fs::path(FOCUSFALL_OPEN_DATA_FOLDER) / package, error)) {
      const auto extension = entry.path().extension();
      if (extension == ".jpg" || extension == ".JPG") paths.push_back(entry.path());
    }
  }
  if (paths.empty()) GTEST_SKIP() << "The open photographs are not there; tests/fetch_open_data.sh fetches them.";
  std::ranges::sort(paths);

  std::mt19937 random(7);
  constexpr int kMutations = 800;  // of each
  for (const fs::path& path : paths) {
    std::string text(kHead, '\0');
    std::ifstream stream(path, std::ios::binary);
    stream.read(text.data(), static_cast<std::streamsize>(text.size()));
    text.resize(static_cast<std::size_t>(stream.gcount()));
    const std::vector<std::byte> original = bytes_of(text);
    for (int i = 0; i < kMutations; ++i) {
      std::vector<std::byte> file = original;
      for (int k = 0; k <= i % 40; ++k) damage(file, random);
      CaptureReading reading;
      ASSERT_NO_THROW(reading = read_capture(file, {4000, 3000})) << path << ", mutation " << i;
      expect_sound(reading);
    }
  }
}

}  // namespace
}  // namespace focusfall
