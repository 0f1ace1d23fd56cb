// One frame: the picture, the depth rule, and capture -> predicted -> measured -> verdict side by side.
import { depthRule } from "./depth_rule";
import { h, jpeg, quantity, type Child } from "./dom";
import { picture } from "./picture";
import { causesOf, fileName, focusWord, picturesOf, type Frame, type Motion, type Valued } from "./records";
import { clock, counted, day, distance, ev, fNumber, mm, percent, plain, px, signed, time, um } from "./text";

type Item = [label: string, value: Child | Child[], source?: string];

const range = (low: number | undefined, high: number | undefined, text: (value: number) => string): Child =>
  low === undefined || high === undefined ? undefined
    : h("small", {}, " (", quantity(low, text) ?? "", " to ", quantity(high, text) ?? "", ")");

const list = (title: string, items: Item[], nothing: string): HTMLElement => {
  const present = items.filter(([, value]) => (Array.isArray(value) ? value[0] : value) !== undefined);
  const terms = present.flatMap(([label, value, source]) => [h("dt", {}, label),
    h("dd", {}, ...(Array.isArray(value) ? value : [value]), source ? h("span", { class: "source" }, source) : "")]);
  return h("section", { class: "stage" }, h("h4", {}, title),
    present.length ? h("dl", {}, ...terms) : h("p", { class: "nothing" }, nothing));
};

const focusDistance = (value: Valued | undefined): Child[] => {
  if (!value) return [undefined];
  if (value.at_infinity) return [h("data", { value: "infinity" }, "infinity")];
  return [quantity(value.value, distance), range(value.low, value.high ?? Infinity, distance),
    value.stale ? h("small", {}, " may be older than the frame") : undefined];
};

const captureList = (frame: Frame): HTMLElement => {
  const c = frame.capture ?? {};
  const source = (key: string): string | undefined => c.source?.[key];
  return list("Capture", [
    ["Taken", c.taken_at && `${day(c.taken_at)}, ${clock(c.taken_at)}`, source("taken_at")],
    ["Camera", c.camera, source("camera")],
    ["Body serial", c.body_serial, source("body_serial")],
    ["Lens", c.lens, source("lens")],
    ["Lens serial", c.lens_serial, source("lens_serial")],
    ["Focal length", quantity(c.focal_length_mm, mm), source("focal_length_mm")],
    ["f-number", quantity(c.f_number, fNumber), source("f_number")],
    ["Exposure time", quantity(c.exposure_time_s, time), source("exposure_time_s")],
    ["ISO speed", quantity(c.iso_speed, (value) => `ISO ${plain(value, 4)}`), source("iso_speed")],
    ["Exposure bias", quantity(c.exposure_bias_ev, ev), source("exposure_bias_ev")],
    ["Focus distance", focusDistance(c.focus_distance_m), source("focus_distance_m")],
    ["Pixel pitch", [quantity(c.pixel_pitch_um?.value, um)], source("pixel_pitch_um")],
    ["Size", c.width_px && c.height_px ? `${c.width_px} × ${c.height_px} px` : undefined],
    ["Aim", frame.aim?.source, frame.aim?.grown ? "grown to the least size" : undefined],
  ], "Nothing was read.");
};

const predictionList = (frame: Frame): HTMLElement => {
  const p = frame.prediction ?? {};
  const model = "thin lens";
  const far: Child = p.far_limit_infinite ? h("data", { value: "infinity" }, "infinity")
    : quantity(p.far_limit_m, distance);
  return list("Predicted", [
    ["Near limit", quantity(p.near_limit_m, distance), model],
    ["Far limit", far, model],
    ["Acceptable blur", [quantity(p.acceptable_blur_px, px),
      p.acceptable_blur_um === undefined ? undefined : h("small", {}, " ", quantity(p.acceptable_blur_um, um) ?? "")],
      "delivered picture"],
    ["Blur exactly in focus", quantity(p.blur_disc_px, px), "diffraction, pixel, baseline"],
    ["Airy disc", quantity(p.airy_diameter_px, px), "diffraction"],
    ["Depth of focus", quantity(p.depth_of_focus_um, um), "both sides"],
    ["Working f-number", quantity(p.working_f_number, fNumber), model],
    ["Hyperfocal distance", quantity(p.hyperfocal_m, distance), model],
    ["Motion blur", quantity(p.motion_blur_px, px), "as said"],
    ["Exposure value", quantity(p.exposure_value, (value) => `${plain(value)} EV`), "exposure"],
  ], "Focal length or f-number is not known, so nothing is predicted.");
};

const motionItem = (label: string, motion: Motion | undefined): Item => [label, [quantity(motion?.length_px, px),
  range(motion?.length_low, motion?.length_high, px),
  motion?.angle_deg === undefined ? undefined : h("small", {}, ` at ${plain(motion.angle_deg, 3)}°`)], "spread of edges"];

const measurementList = (frame: Frame): HTMLElement => {
  const m = frame.measurement ?? {};
  const aim = m.aim ?? {};
  const edges = (count: number | undefined): string | undefined =>
    count === undefined ? undefined : counted(count, "edge");
  const bound = aim.bound === "lower" ? "at least " : aim.bound === "upper" ? "at most " : undefined;
  return list("Measured", [
    ["Blur at the aim", aim.blur_disc_px === undefined ? "no evidence"
      : [quantity(aim.blur_disc_px, (value) => `${bound ?? ""}${px(value)}`), range(aim.low, aim.high, px)],
      edges(aim.edges)],
    ["Edge rise", quantity(aim.edge_rise_px, px), "10 to 90 %"],
    ["MTF50", quantity(aim.mtf50_cycles_per_px, (value) => `${plain(value, 2)} cycles/px`), "from the blur"],
    ["Sharpest region", [quantity(m.best?.blur_disc_px, px), range(m.best?.low, m.best?.high, px)],
      edges(m.best?.edges)],
    motionItem("Motion at the aim", m.motion),
    motionItem("Motion behind", m.background_motion),
    ["Surface at the subject", [quantity(m.plane?.at_contact_px, (value) => `${signed(value)} px`),
      range(m.plane?.at_contact_low, m.plane?.at_contact_high, (value) => `${signed(value)} px`)], m.plane?.contact],
    ["Clipped", quantity(m.clipping?.any, percent), m.clipping?.measured_on],
    ["Red, green, blue", m.clipping?.any ? [quantity(m.clipping.red, percent), ", ",
      quantity(m.clipping.green, percent), ", ", quantity(m.clipping.blue, percent)] : undefined, "of the frame"],
    ["Mean level", quantity(m.tone?.mean_linear, (value) => plain(value, 2)), "linear, 1 = clipping"],
  ], "Nothing could be measured.");
};

const verdictList = (frame: Frame): HTMLElement => {
  const v = frame.verdict ?? {};
  return list("Verdict", [
    ["Focus", v.focus],
    ["Causes", causesOf(frame).join(", ") || undefined],
    ["Defocus at the sensor", [quantity(v.defocus_um, (value) => `${signed(value, 3)} µm`),
      range(v.defocus_um_low, v.defocus_um_high, (value) => `${signed(value, 3)} µm`)], "+ is behind the subject"],
    ["Defocus", [quantity(v.defocus_limits, (value) => `${signed(value)} limits`),
      range(v.defocus_limits_low, v.defocus_limits_high, (value) => signed(value))], "of the depth of field"],
    ["Focus beyond the subject", [quantity(v.focus_offset_m, (value) => `${signed(value, 3)} m`),
      range(v.focus_offset_m_low, v.focus_offset_m_high, (value) => `${signed(value, 3)} m`)], "focus − subject"],
    ["Exposure", v.exposure],
    ["Exposure error", [quantity(v.exposure_error_ev, ev), range(v.exposure_error_ev_low, v.exposure_error_ev_high, ev)]],
    ["Pull back", quantity(v.pull_back_ev, ev), "to hold the highlights"],
  ], "No verdict.");
};

const issueList = (frame: Frame): HTMLElement | undefined => {
  if (!frame.issues?.length) return undefined;
  return h("section", { class: "issues" }, h("h4", {}, "Remarks"),
    h("ul", {}, ...frame.issues.map((issue) => h("li", {}, issue.message, " ",
      h("span", { class: "source" }, `${issue.stage}: ${issue.code}`)))));
};

export interface FrameExtras {
  source?: string; // of a larger picture
  parts?: Child[]; // put under the picture: burst, overruling
}

export const frameView = (frame: Frame, index: number, extras: FrameExtras = {}): HTMLElement => {
  const { aim } = picturesOf(index);
  const aimSource = aim ? jpeg(aim) : undefined;
  return h("div", { class: "frame-view" },
    h("header", { class: "frame-head" },
      h("h3", { tabindex: -1 }, fileName(frame.path)),
      h("p", { class: "path" }, frame.path),
      h("p", { class: "summary" }, h("strong", {}, focusWord(frame)), " ",
        frame.verdict?.summary ?? frame.issues?.[0]?.message ?? "")),
    h("div", { class: "frame-look" },
      h("div", {}, picture(frame, index, extras.source),
        aimSource ? h("figure", { class: "aim-crop" },
          h("img", { src: aimSource, alt: "The aim at one picture pixel for one pixel." }),
          h("figcaption", {}, "The aim, 1:1")) : undefined),
      depthRule(frame)),
    ...(extras.parts ?? []),
    h("div", { class: "chain" }, captureList(frame), predictionList(frame), measurementList(frame), verdictList(frame)),
    issueList(frame));
};
