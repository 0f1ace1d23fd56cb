#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "src/output/exposure_report.h"
#include "src/output/names.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"

namespace focusfall {
namespace {

constexpr int kIndent = 2;
constexpr int kWidest = 100;

// "+0.33", "-1.20": stops always with their sign.
std::string ev_text(double ev) { return fmt::format("{:+.2f}", std::abs(ev) < 0.005 ? 0.0 : ev); }

std::string interval_text(const Interval& interval) {
  return fmt::format("{} ({} to {}) stops", ev_text(interval.value), ev_text(interval.low), ev_text(interval.high));
}

std::string setting_text(const FrameRecord& record) {
  if (!record.capture) return "";
  const Capture& c = *record.capture;
  std::string text = c.f_number ? f_number_text(c.f_number->value) : "f/?";
  text += c.exposure_time_s ? "  " + time_text(c.exposure_time_s->value) : "  ? s";
  return text + (c.iso_speed ? fmt::format("  ISO {:g}", c.iso_speed->value) : "  ISO ?");
}

std::string clipped_text(const FrameRecord& record) {
  if (!record.measurement || !record.measurement->clipping) return "clipping not counted";
  const Clipping& c = *record.measurement->clipping;
  if (c.kind == ClippedKind::none) return "nothing clipped";
  std::string channels;
  constexpr double kWorthALetter = 1e-5;   // a few hundred pixels at 24 MP
  if (c.red >= kWorthALetter) channels += 'R';
  if (c.green >= kWorthALetter) channels += 'G';
  if (c.blue >= kWorthALetter) channels += 'B';
  std::string text = fmt::format("clipped {} {} {}", name_of(c.kind), percent_text(c.any), channels);
  if (c.aim_any > 0) text += fmt::format(", aim {}", percent_text(c.aim_any));
  return c.measured_on == ClippedOn::mosaic ? text + ", on the mosaic" : text;
}

std::string pull_back_text(const FrameExposure& e) {
  if (!e.pull_back) return "";
  if (e.pull_back->bound == Bound::lower) {
    return e.pull_back->ev >= 0.05 ? fmt::format("pull back at least {:.1f} stops", e.pull_back->ev)
                                   : "pull back: by how much the frame does not record";
  }
  if (e.pull_back->ev >= 0.05) return fmt::format("pull back {:.1f} stops", e.pull_back->ev);
  return e.room_ev ? fmt::format("room for {:.1f} stops", *e.room_ev) : "";
}

std::string verdict_text(const FrameExposure& e) {
  if (e.verdict == ExposureVerdict::unknown || !e.error_ev) return "unknown";
  std::string text = exposure_verdict_name(e.verdict);
  if (e.verdict != ExposureVerdict::as_predicted) text += fmt::format(" by {:.2f} stops", std::abs(e.error_ev->value));
  switch (e.cause) {
    case ExposureCause::none: break;
    case ExposureCause::single: text += ", this frame alone"; break;
    case ExposureCause::light_flickers: text += ", the light flickers"; break;
    case ExposureCause::iso: text += ", with its ISO setting"; break;
    case ExposureCause::diaphragm: text += ", with its f-number"; break;
    case ExposureCause::shutter: text += ", with its exposure time"; break;
    case ExposureCause::diaphragm_or_shutter: text += ", with its f-number or exposure time"; break;
  }
  return text;
}

std::string frame_line(const ExposureReport& report, std::size_t frame, int path_columns) {
  const FrameRecord& record = report.records[frame];
  const FrameExposure& e = report.audit.frames[frame];
  const std::string name = padded(shortened(visible_text(record.path), path_columns), path_columns);
  std::string line = fmt::format("  {}  {}", name, padded(setting_text(record), 26));
  line += e.measured_ev ? fmt::format("  mid-tone {} stops", ev_text(*e.measured_ev)) : "  mid-tone unknown";
  line += "; " + verdict_text(e) + "; " + clipped_text(record);
  if (const std::string text = pull_back_text(e); !text.empty()) line += "; " + text;
  return line;
}

std::string folded(const std::string& sentence, int columns) {
  return std::string(kIndent, ' ') + wrapped(sentence, std::min(columns, kWidest) - kIndent, kIndent) + "\n";
}

// "f/5.6 lets through 0.33 stops less than the mark says (-0.40 to -0.27), as f/6.3 would"
std::string blame_text(const char* what, const MarkError& m, const std::string& mark, const std::string& effective) {
  return fmt::format("{} {}: {:.2f} stops {} light than the mark says ({} to {}), as {} would.", what, mark,
                     std::abs(m.error_ev), m.error_ev > 0 ? "more" : "less", ev_text(m.low_ev), ev_text(m.high_ev),
                     effective);
}

std::vector<std::string> audit_sentences(const ExposureReport& report, const ExposureSet& set) {
  const SetAudit& audit = *set.audit;
  std::vector<std::string> sentences;
  if (audit.slope) {
    sentences.push_back(fmt::format("Level against exposure has slope {:.3f} ({:.3f} to {:.3f}; 1 is what the settings "
                                    "promise), scatter {:.2f} stops.",
                                    audit.slope->value, audit.slope->low, audit.slope->high, audit.scatter_ev));
  } else {
    sentences.push_back(fmt::format("Too few frames, or exposures too much alike, to tell a slope; scatter {:.2f} stops.",
                                    audit.scatter_ev));
  }
  if (set.curve_bent) {
    sentences.push_back("The picture's tone curve is not the one that its codes are decoded with. Its shape was found from "
                        "the frames themselves and its contrast fitted to their exposures, so only statements relative to "
                        "the other frames hold; the slope is that of every second frame against the others.");
  }
  for (const LightChange& change : audit.light_changes) {
    const std::string from = visible_text(report.records[set.tested[change.from]].path);
    const std::string to = visible_text(report.records[set.tested[change.to]].path);
    sentences.push_back(fmt::format("The light {} {} between {} and {}; this is taken off below.",
                                    change.step ? "jumped by" : "drifted by", interval_text(change.change_ev), from, to));
  }
  if (audit.light_flickers) {
    sentences.push_back("The light flickers: levels scatter at exposures shorter than 1/100 s only. No shutter is blamed.");
  }
  const std::size_t said = sentences.size();
  for (const MarkError& m : audit.diaphragm) {
    if (!m.blamed) continue;
    sentences.push_back(blame_text("Diaphragm,", m, f_number_text(m.mark),
                                   fmt::format("f/{:.3g}", m.mark * std::exp2(-m.error_ev / 2))));
  }
  for (const MarkError& m : audit.shutter) {
    if (!m.blamed) continue;
    sentences.push_back(blame_text("Shutter,", m, time_text(m.mark), time_text(m.mark * std::exp2(m.error_ev))));
  }
  for (const MarkError& m : audit.iso) {
    if (!m.blamed) continue;
    sentences.push_back(blame_text("Sensitivity,", m, fmt::format("ISO {:g}", m.mark),
                                   fmt::format("ISO {:.0f}", m.mark * std::exp2(m.error_ev))));
  }
  if (sentences.size() == said) sentences.push_back("No mark of diaphragm, shutter or ISO stands out.");
  return sentences;
}

std::string bracket_text(const Bracket& bracket, bool curve_unknown) {
  std::string text = fmt::format("Bracket of {} frames in steps of {:.2f} stops; set and measured:", bracket.frames.size(),
                                 bracket.step_ev);
  for (std::size_t k = 0; k < bracket.frames.size(); ++k) {
    text += fmt::format("{} {}/{}", k == 0 ? "" : ",", ev_text(bracket.set_ev[k]),
                        bracket.measured_ev[k] ? ev_text(*bracket.measured_ev[k]) : "unknown");
  }
  return text + (curve_unknown ? ". The tone curve is not known: measured steps are scaled to span what was set." : ".");
}

std::string vignetting_text(const ExposureSet& set) {
  std::string text;
  for (const Vignetting& v : set.vignetting) {
    if (std::abs(v.corner_ev) < 0.05) continue;
    text += fmt::format("{} {} {}", text.empty() ? "" : ",", f_number_text(v.f_number), ev_text(v.corner_ev));
  }
  return text.empty() ? text : "Corners against the smallest opening, stops (vignetting, not exposure):" + text + ".";
}

}  // namespace

std::string exposure_set_text(const ExposureReport& report, std::size_t index, const TextLayout& layout) {
  const ExposureSet& set = report.audit.sets[index];
  std::string text = fmt::format("Set {}: {} {}", index + 1, set.frames.size(), set.frames.size() == 1 ? "frame" : "frames");
  text += set.audit ? fmt::format(", {} tested against one another\n", set.tested.size())
                    : fmt::format(", not testable: {}\n", not_testable_text(set.reason));
  for (const std::size_t frame : set.frames) text += frame_line(report, frame, layout.path_columns) + "\n";
  if (set.audit) {
    for (const std::string& sentence : audit_sentences(report, set)) text += folded(sentence, layout.columns);
  }
  if (const std::string sentence = vignetting_text(set); !sentence.empty()) text += folded(sentence, layout.columns);
  for (const Bracket& bracket : set.brackets) text += folded(bracket_text(bracket, set.curve_bent), layout.columns);
  return text + "\n";
}

}  // namespace focusfall
