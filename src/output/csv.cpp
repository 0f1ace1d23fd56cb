#include "src/output/csv.h"

#include <span>

#include "src/output/frame_json.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

// JSON pointers into the frame object, in the order of the columns.
constexpr const char* kColumns[] = {
    "/path",
    "/verdict/focus",
    "/verdict/causes",
    "/verdict/defocus_limits",
    "/verdict/defocus_limits_low",
    "/verdict/defocus_limits_high",
    "/verdict/defocus_um",
    "/verdict/defocus_um_low",
    "/verdict/defocus_um_high",
    "/verdict/focus_offset_m",
    "/verdict/exposure",
    "/verdict/exposure_error_ev",
    "/verdict/clipped",
    "/verdict/pull_back_ev",
    "/measurement/aim/blur_disc_px",
    "/measurement/aim/low",
    "/measurement/aim/high",
    "/measurement/aim/edges",
    "/prediction/acceptable_blur_px",
    "/prediction/blur_disc_px",
    "/prediction/near_limit_m",
    "/prediction/far_limit_m",
    "/prediction/far_limit_infinite",
    "/prediction/motion_blur_px",
    "/measurement/motion/length_px",
    "/measurement/motion/angle_deg",
    "/measurement/clipping/any",
    "/measurement/clipping/red",
    "/measurement/clipping/green",
    "/measurement/clipping/blue",
    "/measurement/tone/median_linear",
    "/aim/source",
    "/aim/x",
    "/aim/y",
    "/aim/width",
    "/aim/height",
    "/capture/camera",
    "/capture/lens",
    "/capture/body_serial",
    "/capture/lens_serial",
    "/capture/taken_at",
    "/capture/focal_length_mm",
    "/capture/f_number",
    "/capture/exposure_time_s",
    "/capture/iso_speed",
    "/capture/focus_distance_m/value",
    "/capture/pixel_pitch_um/value",
    "/verdict/summary",
    "/issues",
};

// "/verdict/focus" is headed "verdict.focus".
std::string column_name(std::string_view pointer) {
  std::string name(pointer.substr(1));
  for (char& c : name) {
    if (c == '/') c = '.';
  }
  return name;
}

// Lists become their words with semicolons; an issue is its code.
std::string list_text(const Json& list) {
  std::string text;
  for (const Json& element : list) {
    if (!text.empty()) text += "; ";
    text += element.is_object() ? element.value("code", "") : element.get<std::string>();
  }
  return text;
}

std::string cell(const Json& value) {
  if (value.is_null()) return {};
  if (value.is_string()) return csv_text_cell(value.get<std::string>());
  if (value.is_array()) return csv_text_cell(list_text(value));
  return value.dump();
}

}  // namespace

std::string csv_text_cell(std::string_view text) {
  std::string content;
  constexpr std::string_view kFormulaStarts = "=+-@\t\r";
  if (!text.empty() && kFormulaStarts.find(text.front()) != std::string_view::npos) content += '\'';
  content += text;
  if (content.find_first_of("\",\r\n") == std::string::npos) return content;
  std::string quoted = "\"";
  for (const char c : content) {
    quoted += c;
    if (c == '"') quoted += '"';
  }
  return quoted + '"';
}

std::string csv_header() {
  std::string line;
  for (const char* column : kColumns) {
    if (!line.empty()) line += ',';
    line += column_name(column);
  }
  return line + "\r\n";
}

std::string csv_line(const FrameRecord& record) {
  // Through the text of the JSON line, so that invalid UTF-8 is replaced in one place.
  const Json json = Json::parse(json_line(frame_json(record)));
  std::string line;
  bool first = true;
  for (const char* column : kColumns) {
    if (!first) line += ',';
    first = false;
    const Json::json_pointer pointer(column);
    if (json.contains(pointer)) line += cell(json.at(pointer));
  }
  return line + "\r\n";
}

}  // namespace focusfall
