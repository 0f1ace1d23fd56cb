// ExifTool (Debian package libimage-exiftool-perl), an implementation of its own, reads the same files: every value
// that both give must agree. Each set prints how often each field agreed.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <memory>
#include <nlohmann/json.hpp>
#include <sstream>

#include "metadata/read_capture.h"
#include "tests/metadata/exif_file.h"

namespace focusfall {
namespace {

namespace fs = std::filesystem;
using Json = nlohmann::json;

// ---- ExifTool -------------------------------------------------------------------------------------------------------

std::string output_of(const std::string& command) {
  const std::unique_ptr<FILE, int (*)(FILE*)> pipe(::popen(command.c_str(), "r"), ::pclose);
  std::string output;
  std::array<char, 65536> part{};
  for (std::size_t n = 0; pipe && (n = std::fread(part.data(), 1, part.size(), pipe.get())) > 0;)
    output.append(part.data(), n);
  return output;
}

std::string quoted(const std::string& text) {
  std::string result = "'";
  for (const char c : text) result += c == '\'' ? std::string("'\\''") : std::string(1, c);
  return result + "'";
}

// What ExifTool says about files: numbers as they are, and the words that it shows for codes.
struct OtherReading {
  Json numbers;
  Json words;
};

std::vector<OtherReading> read_with_exiftool(const std::vector<fs::path>& files) {
  std::string names;
  for (const fs::path& file : files) names += fmt::format(" {}", quoted(file.string()));
  const auto run = [&](const char* form) {
    return Json::parse(output_of(fmt::format("exiftool -q -q -G1 -json {}{} 2>/dev/null", form, names)), nullptr,
                       false);
  };
  const Json numbers = run("-n"), words = run("");
  std::vector<OtherReading> readings;
  for (std::size_t i = 0; numbers.is_array() && words.is_array() && i < std::min(numbers.size(), words.size()); ++i) {
    readings.push_back({numbers[i], words[i]});
  }
  return readings;
}

// The first of the tags that is there and is not empty.
const Json* first_of(const Json& tags, std::initializer_list<const char*> names) {
  for (const char* name : names) {
    const auto found = tags.find(name);
    if (found != tags.end() && !(found->is_string() && found->get<std::string>().empty())) return &*found;
  }
  return nullptr;
}

std::optional<double> number(const Json& tags, std::initializer_list<const char*> names) {
  const Json* tag = first_of(tags, names);
  if (tag == nullptr) return std::nullopt;
  if (tag->is_number()) return tag->get<double>();
  if (!tag->is_string()) return std::nullopt;
  // ExifTool writes n/0 as "inf" and 0/0 as "undef".
  char* end = nullptr;
  const std::string text = tag->get<std::string>();
  const double value = std::strtod(text.c_str(), &end);
  return end == text.c_str() || !std::isfinite(value) ? std::nullopt : std::optional(value);
}

std::optional<std::string> words(const Json& tags, std::initializer_list<const char*> names) {
  const Json* tag = first_of(tags, names);
  if (tag == nullptr) return std::nullopt;
  std::string text = tag->is_string() ? tag->get<std::string>() : tag->dump();
  const auto last = text.find_last_not_of(' ');
  text.resize(last == std::string::npos ? 0 : last + 1);
  return text.empty() ? std::nullopt : std::optional(text);
}

// ---- comparison -----------------------------------------------------------------------------------------------------

struct Tally {
  int agree = 0, differ = 0, ours_only = 0, theirs_only = 0;
};

class Table {
 public:
  // `agrees` is asked where both give a value.
  template <class Ours, class Theirs, class Agrees>
  void compare(const std::string& field, const Ours& ours, const Theirs& theirs, Agrees agrees, const fs::path& file) {
    Tally& tally = row(field);
    if (ours && theirs) {
      if (agrees(*ours, *theirs)) {
        ++tally.agree;
      } else {
        ++tally.differ;
        complaints.push_back(field + " differs in " + file.filename().string());
      }
    } else if (ours) {
      ++tally.ours_only;
    } else if (theirs) {
      ++tally.theirs_only;
      missing.push_back(field + " of " + file.filename().string());
    }
  }

  void print(const std::string& title) const {
    std::cout << fmt::format("\n{}\n{:<18}{:>7}{:>8}{:>11}{:>15}\n", title, "field", "agree", "differ", "only here",
                             "only ExifTool");
    for (const auto& [field, t] : rows_) {
      std::cout << fmt::format("{:<18}{:>7}{:>8}{:>11}{:>15}\n", field, t.agree, t.differ, t.ours_only, t.theirs_only);
    }
    for (const std::string& complaint : complaints) std::cout << "  " << complaint << '\n';
    for (const std::string& one : missing) std::cout << "  only ExifTool: " << one << '\n';
  }

  int agreements(const std::string& field) const {
    for (const auto& [name, tally] : rows_) {
      if (name == field) return tally.agree;
    }
    return 0;
  }

  std::vector<std::string> complaints;
  std::vector<std::string> missing;

 private:
  Tally& row(const std::string& field) {
    for (auto& [name, tally] : rows_) {
      if (name == field) return tally;
    }
    return rows_.emplace_back(field, Tally{}).second;
  }
  std::vector<std::pair<std::string, Tally>> rows_;
};

// Rationals go through decimal text of ten digits in ExifTool, and the f-numbers of the first raw files through
// fractions of half a millionth in Exiv2.
bool same_number(double a, double b) {
  return std::abs(a - b) <= 2e-7 * std::max(std::abs(a), std::abs(b));
}

template <class T>
std::optional<T> plain(const OptionalSourced<T>& value) {
  return value ? std::optional<T>(value->value) : std::nullopt;
}

// A value of 0 is how files say "not known".
std::optional<double> above_zero(std::optional<double> value) {
  return value && *value > 0 ? value : std::nullopt;
}

// Both ends of what ExifTool knows of the focus distance, m; infinity as infinity.
struct Distance {
  double low = 0;
  double high = 0;
};

std::optional<Distance> exiftool_distance(const Json& tags) {
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  const auto one = [&](std::optional<double> value) -> std::optional<Distance> {
    if (!above_zero(value)) return std::nullopt;
    return *value >= 4294967295.0 ? Distance{kInfinity, kInfinity} : Distance{*value, *value};
  };
  // Compacts of 2001 write their own note in mm and ExifTool reads cm: Exif SubjectDistance has it right.
  if (const auto subject = one(number(tags, {"ExifIFD:SubjectDistance", "IFD0:SubjectDistance"}))) return subject;
  if (const auto upper = above_zero(number(tags, {"Canon:FocusDistanceUpper"}))) {
    const double lower = above_zero(number(tags, {"Canon:FocusDistanceLower"})).value_or(*upper);
    return Distance{std::min(lower, *upper), std::max(lower, *upper)};
  }
  if (const auto range = words(tags, {"Apple:FocusDistanceRange"})) {
    double a = 0, b = 0;
    if (std::istringstream(*range) >> a >> b) return Distance{std::min(a, b), std::max(a, b)};
  }
  return one(number(tags, {"Nikon:FocusDistance", "Olympus:FocusDistance", "Minolta:FocusDistance",
                           "Casio:ObjectDistance", "Composite:FocusDistance2", "XMP-aux:ApproximateFocusDistance"}));
}

std::optional<FocusMode> exiftool_focus_mode(const Json& tags, bool& says_nothing) {
  const std::string mode = words(tags, {"Canon:FocusMode", "Nikon:FocusMode", "Sony:FocusMode", "Olympus:FocusMode",
                                        "Panasonic:FocusMode", "FujiFilm:FocusMode", "Pentax:FocusMode"})
                               .value_or("");
  says_nothing = mode.empty();
  const auto starts = [&](const char* text) { return mode.starts_with(text); };
  if (starts("Manual") || starts("MF")) return FocusMode::manual;
  if (starts("One-shot") || starts("Single") || starts("AF-S")) return FocusMode::single;
  if (starts("AI Servo") || starts("Continuous") || starts("AF-C")) return FocusMode::continuous;
  return std::nullopt;
}

std::optional<bool> exiftool_stabiliser(const Json& tags) {
  const auto text = words(tags, {"Canon:ImageStabilization", "Nikon:VibrationReduction", "Sony:ImageStabilization",
                                 "Sony:Anti-Blur", "Olympus:ImageStabilization", "Panasonic:ImageStabilization"});
  if (!text) return std::nullopt;
  if (text->starts_with("Off")) return false;
  return text->starts_with("On") ? std::optional(true) : std::nullopt;
}

// "2026:06:20 14:03:07" and the like, as far as the second.
std::optional<std::string> exiftool_time(const Json& tags) {
  auto time = words(
      tags, {"ExifIFD:DateTimeOriginal", "IFD0:DateTimeOriginal", "ExifIFD:CreateDate", "XMP-exif:DateTimeOriginal"});
  if (!time || time->size() < 19 || time->find_first_of("123456789") == std::string::npos) return std::nullopt;
  std::string iso = time->substr(0, 19);
  iso[4] = iso[7] = '-';
  iso[10] = 'T';
  return iso;
}

// Centre of the area, in fractions of the frame, where ExifTool's words give it without ambiguity.
struct Centre {
  double x = 0;
  double y = 0;
};

std::vector<double> numbers_in(std::string text) {
  std::ranges::replace_if(
      text, [](char c) { return std::strchr("0123456789.-", c) == nullptr; }, ' ');
  std::istringstream stream(text);
  std::vector<double> values;
  for (double value = 0; stream >> value;) values.push_back(value);
  return values;
}

std::optional<Centre> canon_centre(const Json& tags) {
  const auto in_focus = numbers_in(words(tags, {"Canon:AFPointsInFocus"}).value_or(""));
  const auto x = numbers_in(words(tags, {"Canon:AFAreaXPositions"}).value_or(""));
  const auto y = numbers_in(words(tags, {"Canon:AFAreaYPositions"}).value_or(""));
  const auto width = number(tags, {"Canon:AFImageWidth"}), height = number(tags, {"Canon:AFImageHeight"});
  if (in_focus.size() != 1 || x.size() != y.size() || in_focus[0] < 0 || in_focus[0] >= static_cast<double>(x.size())) {
    return std::nullopt;
  }
  const auto i = static_cast<std::size_t>(in_focus[0]);
  const bool upwards = words(tags, {"IFD0:Model"}).value_or("").find("EOS") != std::string::npos;
  return Centre{0.5 + x[i] / *width, 0.5 + (upwards ? -1 : 1) * y[i] / *height};
}

std::optional<Centre> exiftool_centre(const Json& tags) {
  if (const auto canon = canon_centre(tags)) return canon;
  const auto panasonic = numbers_in(words(tags, {"Panasonic:AFPointPosition"}).value_or(""));
  if (panasonic.size() == 2 && panasonic[0] <= 1) return Centre{panasonic[0], panasonic[1]};
  const auto point = numbers_in(words(tags, {"FujiFilm:FocusPixel"}).value_or(""));
  const auto width = number(tags, {"ExifIFD:ExifImageWidth"}), height = number(tags, {"ExifIFD:ExifImageHeight"});
  if (point.size() == 2 && width && height) return Centre{point[0] / *width, point[1] / *height};
  const auto olympus = numbers_in(words(tags, {"Olympus:AFPointSelected"}).value_or(""));
  if (olympus.size() == 4) return Centre{(olympus[0] + olympus[2]) / 200, (olympus[1] + olympus[3]) / 200};
  return std::nullopt;
}

std::optional<Centre> our_centre(const Capture& c) {
  if (c.focus_areas.empty() || c.focus_areas.front().kind != FocusAreaKind::focus_area) return std::nullopt;
  const FractionRect& box = c.focus_areas.front().box;
  return Centre{box.x + box.width / 2, box.y + box.height / 2};
}

// ---- one file -------------------------------------------------------------------------------------------------------

std::string small_extension(const fs::path& file) {
  std::string extension = file.extension().string();
  std::ranges::transform(extension, extension.begin(),
                         [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
  return extension;
}

bool is_jpeg(const fs::path& file) {
  return small_extension(file) == ".jpg" || small_extension(file) == ".jpeg";
}

Capture our_reading(const fs::path& file, const Json& tags) {
  // The first 256 KB of a JPEG hold its capture data; raw files keep them anywhere.
  constexpr std::size_t kHead = 256 * 1024;
  std::ifstream stream(file, std::ios::binary);
  std::vector<char> bytes(is_jpeg(file) ? kHead : static_cast<std::size_t>(fs::file_size(file)));
  stream.read(bytes.data(), static_cast<std::streamsize>(bytes.size()));
  bytes.resize(static_cast<std::size_t>(stream.gcount()));
  const DecodedSize size{static_cast<int>(number(tags, {"File:ImageWidth", "IFD0:ImageWidth"}).value_or(0)),
                         static_cast<int>(number(tags, {"File:ImageHeight", "IFD0:ImageHeight"}).value_or(0))};
  return read_capture(std::as_bytes(std::span(bytes)), size).capture;
}

void compare_numbers(const Capture& c, const Json& t, const fs::path& file, Table& table) {
  const auto compare = [&](const char* field, std::optional<double> ours, std::optional<double> theirs) {
    table.compare(field, ours, theirs, same_number, file);
  };
  compare("focal length", plain(c.focal_length_mm),
          above_zero(number(t, {"ExifIFD:FocalLength", "IFD0:FocalLength", "XMP-exif:FocalLength"})));
  compare("f-number", plain(c.f_number),
          above_zero(number(t, {"ExifIFD:FNumber", "IFD0:FNumber", "XMP-exif:FNumber", "Composite:Aperture"})));
  compare("exposure time", plain(c.exposure_time_s),
          above_zero(number(
              t, {"ExifIFD:ExposureTime", "IFD0:ExposureTime", "XMP-exif:ExposureTime", "Composite:ShutterSpeed"})));
  compare("ISO speed", plain(c.iso_speed),
          above_zero(number(t, {"ExifIFD:ISO", "IFD0:ISO", "XMP-exif:ISO", "Composite:ISO"})));
  compare("exposure bias", plain(c.exposure_bias_ev),
          number(t, {"ExifIFD:ExposureCompensation", "IFD0:ExposureCompensation", "XMP-exif:ExposureCompensation"}));
  compare("brightness", plain(c.brightness_apex), number(t, {"ExifIFD:BrightnessValue", "IFD0:BrightnessValue"}));
  const auto flash = number(t, {"ExifIFD:Flash", "IFD0:Flash"});
  const std::optional<double> fired = flash ? std::optional(static_cast<double>(static_cast<int>(*flash) & 1)) : flash;
  compare("flash fired", plain(c.flash_fired), fired);
  const auto orientation = plain(c.orientation);
  compare("orientation", orientation ? std::optional<double>(*orientation) : std::nullopt,
          above_zero(number(t, {"IFD0:Orientation"})));
  const auto sequence = plain(c.sequence);
  compare("sequence", sequence ? std::optional<double>(static_cast<double>(*sequence)) : std::nullopt,
          above_zero(number(t, {"Nikon:ShutterCount", "Sony:SequenceNumber", "Panasonic:SequenceNumber",
                                "FujiFilm:SequenceNumber"})));
}

void compare_texts(const Capture& c, const OtherReading& other, const fs::path& file, Table& table) {
  const Json& t = other.words;
  const auto same = [](const std::string& a, const std::string& b) { return a == b; };
  table.compare(
      "time taken", plain(c.taken_at), exiftool_time(other.numbers),
      [](const std::string& a, const std::string& b) { return a.substr(0, 19) == b; }, file);
  table.compare(
      "camera", plain(c.camera), words(t, {"IFD0:Model"}),
      [](const std::string& a, const std::string& b) { return a.ends_with(b); }, file);
  table.compare("lens", plain(c.lens),
                words(t, {"ExifIFD:LensModel", "Canon:LensModel", "Olympus:LensModel", "XMP-aux:Lens"}), same, file);
  table.compare("body serial", plain(c.body_serial),
                words(t, {"ExifIFD:SerialNumber", "Canon:SerialNumber", "Nikon:SerialNumber", "Olympus:SerialNumber",
                          "XMP-aux:SerialNumber"}),
                same, file);
  table.compare("lens serial", plain(c.lens_serial), words(t, {"ExifIFD:LensSerialNumber", "Olympus:LensSerialNumber"}),
                same, file);
}

void compare_focus(const Capture& c, const OtherReading& other, const fs::path& file, Table& table) {
  // ExifTool's value must lie in our interval, which holds half a step of the coarse scales.
  table.compare(
      "focus distance", plain(c.focus_distance), exiftool_distance(other.numbers),
      [](const FocusDistance& ours, const Distance& theirs) {
        constexpr double kRounding = 1e-6;
        return theirs.low >= ours.low_m * (1 - kRounding) && theirs.high <= ours.high_m * (1 + kRounding);
      },
      file);
  // Whole percents, as ExifTool prints some of them.
  table.compare(
      "focus area", our_centre(c), exiftool_centre(other.words),
      [](const Centre& a, const Centre& b) { return std::abs(a.x - b.x) < 0.01 && std::abs(a.y - b.y) < 0.01; }, file);
  bool says_nothing = false;
  const auto mode = exiftool_focus_mode(other.words, says_nothing);
  if (mode || says_nothing) {
    table.compare("focus mode", plain(c.focus_mode), mode, std::equal_to<>(), file);
  } else if (c.focus_mode) {
    table.complaints.push_back("focus mode differs in " + file.filename().string());
  }
  table.compare("stabiliser", plain(c.stabiliser_on), exiftool_stabiliser(other.words), std::equal_to<>(), file);
}

Table agreement(const std::vector<fs::path>& files, const std::string& title) {
  Table table;
  const auto readings = read_with_exiftool(files);
  EXPECT_EQ(readings.size(), files.size()) << "ExifTool did not read every file";
  for (const OtherReading& other : readings) {
    const fs::path file = other.numbers.at("SourceFile").get<std::string>();
    const Capture capture = our_reading(file, other.numbers);
    compare_numbers(capture, other.numbers, file, table);
    compare_texts(capture, other, file, table);
    compare_focus(capture, other, file, table);
  }
  table.print(fmt::format("{}: {} files", title, files.size()));
  return table;
}

std::vector<fs::path> photographs_below(const fs::path& folder) {
  constexpr std::array kOthers = {".tif", ".tiff", ".heic", ".dng", ".crw", ".cr2", ".cr3",
                                  ".kdc", ".nef",  ".arw",  ".orf", ".rw2", ".raf", ".pef"};
  std::vector<fs::path> files;
  std::error_code error;
  for (fs::recursive_directory_iterator it(folder, error), end; !error && it != end; it.increment(error)) {
    const std::string extension = small_extension(it->path());
    const bool other = std::ranges::any_of(kOthers, [&](const char* o) { return extension == o; });
    if (it->is_regular_file() && (is_jpeg(it->path()) || other)) files.push_back(it->path());
  }
  std::ranges::sort(files);
  return files;
}

bool has_exiftool() {
  return std::system("exiftool -ver >/dev/null 2>&1") == 0;
}

void expect_agreement(const Table& table) {
  EXPECT_TRUE(table.complaints.empty()) << table.complaints.size();
}

TEST(ExifToolAgreement, OverTheSampleImages) {
  if (!has_exiftool()) GTEST_SKIP() << "exiftool is not installed (Debian package libimage-exiftool-perl).";
  const auto files = photographs_below(FOCUSFALL_SAMPLE_IMAGES);
  ASSERT_FALSE(files.empty());
  const Table table = agreement(files, "Sample images");
  expect_agreement(table);
  EXPECT_TRUE(table.missing.empty()) << "ExifTool reads values that are missed here";
  for (const char* field : {"focal length", "f-number", "exposure time", "ISO speed", "time taken", "camera"}) {
    EXPECT_EQ(table.agreements(field), static_cast<int>(files.size())) << field;
  }
}

// npm packages exif 0.6.0 and jpeg-exif 1.1.4, both MIT, fetched by tests/fetch_open_data.sh.
TEST(ExifToolAgreement, OverTheCameraFilesOfOpenPackages) {
  if (!has_exiftool()) GTEST_SKIP() << "exiftool is not installed (Debian package libimage-exiftool-perl).";
  const char* folder = std::getenv("FOCUSFALL_OPEN_DATA");
  const fs::path root = folder != nullptr ? folder : FOCUSFALL_OPEN_DATA_FOLDER;
  std::vector<fs::path> files = photographs_below(root / "exif");
  const auto more = photographs_below(root / "jpeg-exif");
  files.insert(files.end(), more.begin(), more.end());
  if (files.empty()) GTEST_SKIP() << "The open photographs are not there; tests/fetch_open_data.sh fetches them.";
  expect_agreement(agreement(files, "Camera files of open packages"));
}

TEST(ExifToolAgreement, OverAFolderOfOnesOwn) {
  if (!has_exiftool()) GTEST_SKIP() << "exiftool is not installed (Debian package libimage-exiftool-perl).";
  const char* folder = std::getenv("FOCUSFALL_CAMERA_FILES");
  if (folder == nullptr) GTEST_SKIP() << "FOCUSFALL_CAMERA_FILES names no folder of camera files.";
  const auto files = photographs_below(folder);
  if (files.empty()) GTEST_SKIP() << "No photographs below " << folder << ".";
  expect_agreement(agreement(files, "Camera files of one's own"));
}

}  // namespace
}  // namespace focusfall
