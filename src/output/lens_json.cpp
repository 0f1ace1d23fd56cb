// `lens` as JSON Lines and CSV.
#include <fmt/format.h>

#include <cmath>
#include <map>

#include "analysis/compare/lens_words.h"
#include "src/output/csv.h"
#include "src/output/frame_json.h"
#include "src/output/lens_report.h"
#include "src/output/names.h"

namespace focusfall {
namespace {

using Json = nlohmann::ordered_json;

constexpr int kCaptureDigits = 7;
constexpr int kMeasuredDigits = 5;

Json number(double value, int digits = kMeasuredDigits) {
  if (!std::isfinite(value)) return nullptr;
  return rounded(value, digits);
}

Json text_or_null(const std::string& text) { return text.empty() ? Json() : Json(text); }

void put_interval(Json& json, const std::string& key, const std::optional<Interval>& interval) {
  json[key] = interval ? number(interval->value) : Json();
  json[key + "_low"] = interval ? number(interval->low) : Json();
  json[key + "_high"] = interval ? number(interval->high) : Json();
}

std::optional<Interval> in_mm(const std::optional<Interval>& m) {
  if (!m) return std::nullopt;
  return Interval{m->value * 1000, m->low * 1000, m->high * 1000};
}

// Frames of the run by lens and body; those left out too, since a group says how many it was given.
using Owner = std::pair<std::string, std::string>;

Json left_out_counts(const LensOutput& output, const std::optional<Owner>& owner) {
  std::map<LeftOut, int> counts;
  for (std::size_t i = 0; i < output.records.size(); ++i) {
    if (!output.input.left_out[i]) continue;
    const auto& capture = output.records[i].capture;
    const Owner own = capture ? Owner(lens_name(*capture), body_name(*capture)) : Owner();
    if (!owner || own == *owner) ++counts[*output.input.left_out[i]];
  }
  Json json = Json::object();
  for (const auto& [reason, count] : counts) json[left_out_name(reason)] = count;
  return json;
}

int total(const Json& counts) {
  int sum = 0;
  for (const auto& count : counts) sum += count.get<int>();
  return sum;
}

Json paths(const LensOutput& output, const std::vector<std::size_t>& frames) {
  Json list = Json::array();
  for (const std::size_t frame : frames) list.push_back(output.records[frame].path);
  return list;
}

Json diaphragm_json(const GroupDiaphragm& diaphragm) {
  Json json;
  json["frames"] = diaphragm.frames;
  const auto& reading = diaphragm.reading;
  put_interval(json, "f_number", reading ? std::optional(reading->f_number) : std::nullopt);
  json["stops_wider"] = reading ? number(reading->stops_wider) : Json();
  json["text"] = diaphragm.text;
  return json;
}

Json focus_series_json(const FocusSeriesResult& series) {
  Json json;
  json["positions_from"] = series.positions_from;
  put_interval(json, "best_position_um", series.best ? std::optional(series.best->position_um) : std::nullopt);
  json["inside"] = series.best ? Json(series.best->inside) : Json();
  json["slope_px_per_um"] = series.best ? number(series.best->slope_px_per_um) : Json();
  json["text"] = series.text;
  return json;
}

Json flat_json(const FlatResult& flat) {
  Json json;
  json["frames"] = flat.frames;
  put_interval(json, "tilt_um", flat.tilt_um);
  json["axis_deg"] = flat.axis_deg ? number(*flat.axis_deg, 4) : Json();
  put_interval(json, "curvature_um", flat.curvature_um);
  json["signed"] = flat.signed_field;
  put_interval(json, "camera_tilt_um", flat.camera_tilt_um);
  json["text"] = flat.text;
  return json;
}

// Groups of one lens and body share the frames that were left out: those cannot be told to belong to any one of them.
Json group_json(const LensOutput& output, std::size_t number_of_group) {
  const LensGroup& group = output.report.groups[number_of_group];
  const ReadingGroup& of = group.of;
  const Json left_out = left_out_counts(output, Owner(of.lens, of.body));
  Json json;
  json["lens"] = text_or_null(of.lens);
  json["body"] = text_or_null(of.body);
  json["focal_length_mm"] = number(of.focal_length_mm, kCaptureDigits);
  json["f_number"] = number(of.f_number, kCaptureDigits);
  json["focus_distance_m"] = of.focus_distance_m ? number(*of.focus_distance_m) : Json();
  json["focus_at_infinity"] = of.focus_distance_m && std::isinf(*of.focus_distance_m);
  json["focus_area"] = focus_area_place_name(of.area);
  json["focus_mode"] = text_or_null(of.focus_mode);
  json["series"] = series_kind_name(group.kind);
  json["frames"] = of.readings.size() + static_cast<std::size_t>(total(left_out));
  json["used"] = of.readings.size();
  json["left_out"] = left_out;
  json["acquisitions"] = of.acquisitions.size();
  json["limit_um"] = number(of.limit_um);
  put_interval(json, "bias_um", group.bias_um);
  put_interval(json, "bias_limits", group.bias_limits);
  put_interval(json, "spread_um", group.spread_um);
  json["within_third"] = number(group.within_third);
  json["within_whole"] = number(group.within_whole);
  json["front_and_back_mixed"] = group.mixed;
  json["p"] = group.bias_um ? number(group.p, 3) : Json();
  json["p_holm"] = group.bias_um ? number(group.p_holm, 3) : Json();
  json["outliers"] = paths(output, group.outliers);
  json["diaphragm"] = output.diaphragms.empty() ? Json() : diaphragm_json(output.diaphragms[number_of_group]);
  json["finding"] = lens_finding_name(group.finding);
  json["text"] = group.text;
  json["next"] = group.next;
  return json;
}

Json trend_json(const LensTrend& trend) {
  Json json;
  json["kind"] = trend_kind_name(trend.kind);
  json["lens"] = text_or_null(trend.lens);
  json["body"] = text_or_null(trend.body);
  json["unit"] = trend_unit(trend.kind);
  put_interval(json, "slope_um", trend.slope_um);
  const bool ranged = trend.kind != TrendKind::approach && trend.acquisitions > 0;
  json["from"] = ranged ? number(trend.low_end, kCaptureDigits) : Json();
  json["to"] = ranged ? number(trend.high_end, kCaptureDigits) : Json();
  json["acquisitions"] = trend.acquisitions;
  json["p"] = trend.slope_um ? number(trend.p, 3) : Json();
  json["p_holm"] = trend.slope_um ? number(trend.p_holm, 3) : Json();
  json["text"] = trend_text(trend);
  return json;
}

Json effects_json(const std::vector<PartEffect>& parts) {
  Json list = Json::array();
  for (const PartEffect& part : parts) {
    Json json;
    json["name"] = part.name;
    put_interval(json, "effect_um", part.effect_um);
    json["p_holm"] = number(part.p_holm, 3);
    list.push_back(json);
  }
  return list;
}

constexpr const char* kColumns[] = {
    "lens",          "body",           "focal_length_mm",  "f_number",      "focus_distance_m", "focus_area",
    "focus_mode",    "series",         "frames",           "used",          "acquisitions",     "limit_um",
    "bias_um",       "bias_um_low",    "bias_um_high",     "bias_limits",   "bias_limits_low",  "bias_limits_high",
    "spread_um",     "spread_um_low",  "spread_um_high",   "within_third",  "within_whole",     "p_holm",
    "finding",       "text"};

std::string cell(const Json& value) {
  if (value.is_null()) return {};
  return value.is_string() ? csv_text_cell(value.get<std::string>()) : value.dump();
}

}  // namespace

const char* left_out_name(LeftOut reason) {
  switch (reason) {
    case LeftOut::not_done: return "not done";
    case LeftOut::manual_focus: return "manual focus";
    case LeftOut::motion: return "motion";
    case LeftOut::no_evidence: return "no evidence";
    case LeftOut::no_plane: return "no plane";
    case LeftOut::aim_not_on_surface: return "aim not on the surface";
    case LeftOut::no_optics: return "focal length, f-number or pixel pitch unknown";
    case LeftOut::copy: return "copy";
  }
  return "";
}

std::vector<std::optional<std::size_t>> groups_of_frames(const LensOutput& output) {
  std::vector<std::optional<std::size_t>> groups(output.records.size());
  for (std::size_t g = 0; g < output.report.groups.size(); ++g) {
    for (const std::size_t reading : output.report.groups[g].of.readings)
      groups[output.input.readings[reading].frame] = g;
  }
  return groups;
}

std::vector<Json> lens_frames_json(const LensOutput& output) {
  const auto groups = groups_of_frames(output);
  std::vector<Json> lines;
  for (std::size_t i = 0; i < output.records.size(); ++i) {
    const FrameRecord& record = output.records[i];
    const auto& why = output.input.left_out[i];
    Json json = {{"schema", kLensSchema}, {"kind", "frame"}, {"path", record.path}};
    FrameRecord nameless;
    nameless.path = record.path;
    const Json named = frame_json(nameless);
    if (named.contains("path_bytes")) json["path_bytes"] = named["path_bytes"];
    json["group"] = groups[i] ? Json(*groups[i]) : Json();
    json["left_out"] = why ? Json(left_out_name(*why)) : Json();
    const bool plane = record.measurement && record.measurement->plane;
    const bool side = plane && record.verdict;
    put_interval(json, "defocus_px", plane ? record.measurement->plane->at_contact_px : std::nullopt);
    put_interval(json, "defocus_um", side ? record.verdict->defocus_um : std::nullopt);
    put_interval(json, "defocus_limits", side ? record.verdict->defocus_limits : std::nullopt);
    put_interval(json, "focus_offset_mm", side ? in_mm(record.verdict->focus_offset_m) : std::nullopt);
    json["near_side"] = plane ? Json(name_of(record.measurement->plane->near_side)) : Json();
    lines.push_back(std::move(json));
  }
  return lines;
}

Json lens_set_json(const LensOutput& output) {
  const LensReport& report = output.report;
  Json json;
  json["schema"] = kLensSchema;
  json["kind"] = "set";
  json["frames"] = output.records.size();
  json["used"] = output.input.readings.size();
  json["left_out"] = left_out_counts(output, std::nullopt);
  json["groups"] = Json::array();
  for (std::size_t g = 0; g < report.groups.size(); ++g) json["groups"].push_back(group_json(output, g));
  json["trends"] = Json::array();
  for (const LensTrend& trend : report.trends) json["trends"].push_back(trend_json(trend));
  json["lens_or_body"] = {{"lenses", effects_json(report.lens_or_body.lenses)},
                          {"bodies", effects_json(report.lens_or_body.bodies)},
                          {"p_interaction", report.lens_or_body.p_interaction
                                                ? number(*report.lens_or_body.p_interaction, 3)
                                                : Json()},
                          {"text", lens_or_body_text(report.lens_or_body)}};
  json["focus_series"] = output.focus_series ? focus_series_json(*output.focus_series) : Json();
  json["flat"] = output.flat ? flat_json(*output.flat) : Json();
  json["finding"] = report.finding ? Json(lens_finding_name(*report.finding)) : Json();
  json["summary"] = report.summary;
  return json;
}

std::string lens_csv_header() {
  std::string line;
  for (const char* column : kColumns) {
    if (!line.empty()) line += ',';
    line += column;
  }
  return line + "\r\n";
}

std::string lens_csv_lines(const LensOutput& output) {
  std::string text;
  for (std::size_t g = 0; g < output.report.groups.size(); ++g) {
    // Through the text of the JSON line, so that invalid UTF-8 is replaced in one place.
    const Json json = Json::parse(json_line(group_json(output, g)));
    std::string line;
    for (const char* column : kColumns) {
      if (column != kColumns[0]) line += ',';
      line += cell(json.at(column));
    }
    text += line + "\r\n";
  }
  return text;
}

}  // namespace focusfall
