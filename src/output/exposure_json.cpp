#include <array>
#include <cmath>

#include "src/output/csv.h"
#include "src/output/exposure_report.h"
#include "src/output/frame_json.h"
#include "src/output/names.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

constexpr int kDigits = 4;   // a level is known to a hundredth of a stop at best

Json number(double value, int digits = kDigits) {
  if (!std::isfinite(value)) return nullptr;
  return rounded(value, digits);
}
Json number(const std::optional<double>& value, int digits = kDigits) {
  return value ? number(*value, digits) : Json(nullptr);
}

// Stops are rounded to a thousandth: significant digits would make much of a zero.
Json stops(double value) {
  if (!std::isfinite(value)) return nullptr;
  const double at = std::round(1000 * value) / 1000;
  return at == 0 ? 0.0 : at;
}
Json stops(const std::optional<double>& value) { return value ? stops(*value) : Json(nullptr); }

template <class T>
Json plain(const OptionalSourced<T>& sourced) {
  return sourced ? Json(sourced->value) : Json(nullptr);
}

Json clipped_json(const std::optional<Clipping>& clipping) {
  if (!clipping) return nullptr;
  const Clipping& c = *clipping;
  return {{"red", number(c.red)},
          {"green", number(c.green)},
          {"blue", number(c.blue)},
          {"any", number(c.any)},
          {"aim_any", number(c.aim_any)},
          {"largest_patch", number(c.largest_patch)},
          {"kind", name_of(c.kind)},
          {"measured_on", name_of(c.measured_on)},
          {"shadows_any", number(c.shadows_any)}};
}

std::string path_text(const ExposureReport& report, std::size_t frame) { return report.records[frame].path; }

// One row per mark; `mark` is a function that writes what the mark is called.
template <class Mark>
Json marks_json(const std::vector<MarkError>& marks, Mark mark) {
  Json list = Json::array();
  for (const MarkError& m : marks) {
    Json row = mark(m);
    row["frames"] = m.frames;
    row["error_ev"] = stops(m.error_ev);
    row["low_ev"] = stops(m.low_ev);
    row["high_ev"] = stops(m.high_ev);
    row["reference"] = m.reference;
    row["blamed"] = m.blamed;
    list.push_back(std::move(row));
  }
  return list;
}

Json light_changes_json(const ExposureReport& report, const ExposureSet& set) {
  Json list = Json::array();
  if (!set.audit) return list;
  for (const LightChange& change : set.audit->light_changes) {
    list.push_back({{"kind", change.step ? "step" : "drift"},
                    {"from", path_text(report, set.tested[change.from])},
                    {"to", path_text(report, set.tested[change.to])},
                    {"change_ev", stops(change.change_ev.value)},
                    {"low_ev", stops(change.change_ev.low)},
                    {"high_ev", stops(change.change_ev.high)}});
  }
  return list;
}

Json brackets_json(const ExposureReport& report, const ExposureSet& set) {
  Json list = Json::array();
  for (const Bracket& bracket : set.brackets) {
    Json frames = Json::array();
    for (std::size_t k = 0; k < bracket.frames.size(); ++k) {
      frames.push_back({{"path", path_text(report, bracket.frames[k])},
                        {"set_ev", stops(bracket.set_ev[k])},
                        {"measured_ev", stops(bracket.measured_ev[k])}});
    }
    list.push_back({{"step_ev", stops(bracket.step_ev)}, {"frames", std::move(frames)}});
  }
  return list;
}

Json vignetting_json(const ExposureSet& set) {
  Json list = Json::array();
  for (const Vignetting& v : set.vignetting) {
    list.push_back({{"f_number", number(v.f_number)}, {"corner_ev", stops(v.corner_ev)}, {"frames", v.frames}});
  }
  return list;
}

// Pointers into the frame object, in the order of the columns.
constexpr std::array kColumns = {
    "/path", "/set", "/exposure", "/predicted_ev", "/measured_ev", "/error_ev", "/error_low_ev", "/error_high_ev",
    "/predicted_by", "/cause", "/clipped/kind", "/clipped/red", "/clipped/green", "/clipped/blue", "/clipped/any",
    "/clipped/aim_any", "/clipped/largest_patch", "/clipped/measured_on", "/clipped/shadows_any", "/pull_back_ev",
    "/pull_back_bound", "/room_ev", "/taken_at", "/f_number", "/exposure_time_s", "/iso_speed", "/exposure_ev",
    "/luminance_cd_m2",
};

}  // namespace

Json exposure_frame_json(const ExposureReport& report, std::size_t frame) {
  const FrameRecord& record = report.records[frame];
  const FrameExposure& e = report.audit.frames[frame];
  const Capture capture = record.capture.value_or(Capture{});
  Json json = {{"schema", kExposureSchema}, {"kind", "frame"}, {"path", record.path}};
  const Json whole = frame_json(record);
  if (whole.contains("path_bytes")) json["path_bytes"] = whole["path_bytes"];
  json["set"] = record.done ? Json(e.set + 1) : Json(nullptr);
  json["taken_at"] = plain(capture.taken_at);
  json["f_number"] = plain(capture.f_number);
  json["exposure_time_s"] = plain(capture.exposure_time_s);
  json["iso_speed"] = plain(capture.iso_speed);
  json["exposure_ev"] = stops(e.exposure_ev);
  json["predicted_ev"] = stops(e.predicted_ev);
  json["predicted_by"] = e.basis == ExposureBasis::none ? Json(nullptr) : Json(exposure_basis_name(e.basis));
  json["measured_ev"] = stops(e.measured_ev);
  json["error_ev"] = e.error_ev ? stops(e.error_ev->value) : Json(nullptr);
  json["error_low_ev"] = e.error_ev ? stops(e.error_ev->low) : Json(nullptr);
  json["error_high_ev"] = e.error_ev ? stops(e.error_ev->high) : Json(nullptr);
  json["exposure"] = exposure_verdict_name(e.verdict);
  json["cause"] = e.cause == ExposureCause::none ? Json(nullptr) : Json(exposure_cause_name(e.cause));
  json["luminance_cd_m2"] = number(e.implied_luminance_cd_m2);
  json["clipped"] = clipped_json(record.measurement ? record.measurement->clipping : std::nullopt);
  json["pull_back_ev"] = e.pull_back ? stops(e.pull_back->ev) : Json(nullptr);
  json["pull_back_bound"] = e.pull_back ? Json(name_of(e.pull_back->bound)) : Json(nullptr);
  json["room_ev"] = stops(e.room_ev);
  json["issues"] = whole["issues"];
  return json;
}

Json exposure_set_json(const ExposureReport& report, std::size_t index) {
  const ExposureSet& set = report.audit.sets[index];
  Json frames = Json::array();
  for (const std::size_t frame : set.frames) frames.push_back(path_text(report, frame));
  const bool tested = set.audit.has_value();
  const SetAudit audit = set.audit.value_or(SetAudit{});
  Json json = {{"schema", kExposureSchema}, {"kind", "set"}, {"set", index + 1}, {"frames", std::move(frames)}};
  json["testable"] = tested;
  json["reason"] = tested ? Json(nullptr) : Json(not_testable_text(set.reason));
  json["tested_frames"] = set.tested.size();
  json["tone_curve"] = set.curve_bent ? "fitted" : "as decoded";
  json["slope"] = audit.slope ? stops(audit.slope->value) : Json(nullptr);
  json["slope_low"] = audit.slope ? stops(audit.slope->low) : Json(nullptr);
  json["slope_high"] = audit.slope ? stops(audit.slope->high) : Json(nullptr);
  json["scatter_ev"] = tested ? stops(audit.scatter_ev) : Json(nullptr);
  json["diaphragm"] = marks_json(audit.diaphragm, [](const MarkError& m) {
    return Json{{"f_number", number(m.mark)}, {"effective_f_number", number(m.mark * std::exp2(-m.error_ev / 2))}};
  });
  json["shutter"] = marks_json(audit.shutter, [](const MarkError& m) {
    return Json{{"exposure_time_s", number(m.mark, 6)},
                {"effective_exposure_time_s", number(m.mark * std::exp2(m.error_ev), 6)}};
  });
  json["iso"] = marks_json(audit.iso, [](const MarkError& m) { return Json{{"iso_speed", number(m.mark)}}; });
  json["light_changes"] = light_changes_json(report, set);
  json["light_flickers"] = tested ? Json(audit.light_flickers) : Json(nullptr);
  json["vignetting"] = vignetting_json(set);
  json["brackets"] = brackets_json(report, set);
  return json;
}

std::string exposure_csv_header() {
  std::string line;
  for (const std::string_view column : kColumns) {
    if (!line.empty()) line += ',';
    std::string name(column.substr(1));
    for (char& c : name) {
      if (c == '/') c = '.';
    }
    line += name;
  }
  return line + "\r\n";
}

std::string exposure_csv_line(const ExposureReport& report, std::size_t frame) {
  // Through the text of the JSON line, so that invalid UTF-8 is replaced in one place.
  const Json json = Json::parse(json_line(exposure_frame_json(report, frame)));
  std::string line;
  bool first = true;
  for (const char* column : kColumns) {
    if (!first) line += ',';
    first = false;
    const Json::json_pointer pointer(column);
    if (!json.contains(pointer) || json.at(pointer).is_null()) continue;
    const Json& value = json.at(pointer);
    line += value.is_string() ? csv_text_cell(value.get<std::string>()) : value.dump();
  }
  return line + "\r\n";
}

}  // namespace focusfall
