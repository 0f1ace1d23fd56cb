// The depth rule: a vertical rule marked in limits of the depth of field. Zero is the plane on which focus fell, the
// band between -1 and +1 is the depth of field, far is up. A mark is read as the record has it: a subject at +1.5 is
// nearer than the plane of focus, which therefore fell 1.5 limits behind it.
import * as Plot from "@observablehq/plot";
import { chart, h, s } from "./dom";
import { acceptablePx, limitsAtAim, type Frame } from "./records";
import { distance, plain, px, signed, um } from "./text";

export interface Place {
  at: number; // signed, in limits
  low: number;
  high: number;
}

// Where the subject may have been: one place, two where the side is not known, none without evidence.
export const places = (frame: Frame): Place[] => {
  const verdict = frame.verdict;
  if (verdict?.defocus_limits !== undefined) {
    const at = verdict.defocus_limits;
    return [{ at, low: verdict.defocus_limits_low ?? at, high: verdict.defocus_limits_high ?? at }];
  }
  const aim = frame.measurement?.aim;
  const limit = acceptablePx(frame);
  const at = limitsAtAim(frame);
  if (at === undefined || !limit || !aim) return [];
  const low = (aim.low ?? aim.blur_disc_px ?? 0) / limit;
  const high = (aim.high ?? aim.blur_disc_px ?? 0) / limit;
  return [{ at, low, high }, { at: -at, low: -high, high: -low }];
};

// Distance at a mark. On the axis 1/distance runs evenly with the blur disc (thin lens); the record's own limits fix
// both halves. Infinity beyond the far end; absent where the focus distance is not known.
export const distanceAt = (frame: Frame, limits: number): number | undefined => {
  const focus = frame.capture?.focus_distance_m;
  const { near_limit_m: near, far_limit_m: far, far_limit_infinite: endless } = frame.prediction ?? {};
  if (!focus || near === undefined) return undefined;
  const atFocus = focus.at_infinity ? 0 : focus.value === undefined ? undefined : 1 / focus.value;
  if (atFocus === undefined) return undefined;
  const nearStep = 1 / near - atFocus;
  const farStep = far !== undefined && !endless ? atFocus - 1 / far : nearStep;
  const vergence = atFocus + limits * (limits > 0 ? nearStep : farStep);
  return vergence <= 1e-9 ? Infinity : 1 / vergence;
};

const limitsText = (value: number): string => `${plain(Math.abs(value), 2)} limits of the depth of field`;

// The defocus in one or two sentences, with its units.
export const ruleWords = (frame: Frame): string => {
  const found = places(frame);
  const first = found[0];
  if (!first) return "There is no evidence of blur at the aim, so the rule stays empty.";
  const verdict = frame.verdict;
  if (found.length === 2) {
    const blur = frame.measurement?.aim?.blur_disc_px;
    const reach = frame.measurement?.aim?.bound === "lower" ? "at least " : "";
    return `The aim is ${reach}${limitsText(first.at)} from the plane of focus` +
      `${blur === undefined ? "" : ` (${px(blur)})`}; the frame does not tell on which side, so both places are drawn.`;
  }
  const side = first.at > 0 ? "behind" : "in front of";
  const offset = verdict?.focus_offset_m;
  const metres = offset === undefined ? "" : `${distance(Math.abs(offset))} ${side} the subject: `;
  const at = verdict?.defocus_um;
  return `Focus fell ${metres || side + " the subject by "}${limitsText(first.at)} ` +
    `(${signed(first.low)} to ${signed(first.high)})` +
    `${at === undefined ? "" : `, ${um(Math.abs(at))} at the sensor`}.`;
};

const height = 400;
const width = 330;
const ruleX = 0.36;

export const depthRule = (frame: Frame): Element => {
  const found = places(frame);
  const words = ruleWords(frame);
  const reach = Math.max(2.35, ...found.map((place) => Math.max(Math.abs(place.low), Math.abs(place.high)) * 1.12));
  const step = reach < 5 ? 1 : reach < 12 ? 2 : reach < 40 ? 10 : 50;
  const ticks = [-2, -1, 0, 1, 2].filter((tick) => step === 1 || Math.abs(tick) < 2);
  for (let tick = Math.max(step, 3); tick < reach; tick += step) ticks.push(-tick, tick);
  const label = (limits: number): string => {
    const at = distanceAt(frame, limits);
    return at === undefined ? "" : distance(at);
  };
  const lower = frame.measurement?.aim?.bound === "lower" && found.length === 2;
  const marks = [
    Plot.rect([{}], { x1: 0.16, x2: 1, y1: -1, y2: 1, className: "rule-band" }),
    Plot.ruleY([-1, 1], { x1: 0.16, x2: 1, className: "rule-edge" }),
    Plot.ruleX([ruleX], { y1: -reach, y2: reach, className: "rule-spine" }),
    Plot.ruleY(ticks, { x1: ruleX - 0.03, x2: ruleX + 0.03, className: "rule-tick" }),
    Plot.text(ticks, { x: ruleX - 0.06, y: (t: number) => t, text: (t: number) => signed(t, 1), textAnchor: "end",
      className: "rule-limit" }),
    Plot.text(ticks.filter((t) => t !== 0), { x: ruleX + 0.06, y: (t: number) => t, text: label, textAnchor: "start",
      className: "rule-distance" }),
    Plot.link(found, { x1: 0.72, x2: 0.72, y1: "low", y2: "high", className: "rule-interval" }),
    Plot.ruleY([0], { x1: 0.16, x2: 1, className: "rule-focus" }),
    Plot.text([0], { x: ruleX + 0.06, y: 0, dy: -9, textAnchor: "start", className: "rule-focus-text",
      text: () => `focus fell here${label(0) ? ", " + label(0) : ""}` }),
    Plot.dot(found, { x: 0.72, y: "at", r: 6, symbol: "diamond", className:
      found.length === 2 ? "rule-subject rule-unsure" : "rule-subject" }),
    Plot.text(found, { x: 0.76, y: "at", dx: 6, textAnchor: "start", className: "rule-subject-text",
      text: () => (found.length === 2 ? (lower ? "subject, or farther" : "subject, or") : "subject") }),
  ];
  const plot = Plot.plot({
    width, height, marginLeft: 8, marginRight: 8, marginTop: 14, marginBottom: 14,
    x: { domain: [0, 1.12], axis: null }, y: { domain: [reach, -reach], axis: null }, marks, className: "depth-rule",
  });
  return h("figure", { class: "rule" },
    h("div", { class: "rule-end" }, "far"),
    chart(plot, `Depth rule. ${words}`),
    h("div", { class: "rule-end" }, "near"),
    h("figcaption", {}, words));
};

// The same rule as a mark of a table row.
export const smallRule = (frame: Frame): SVGSVGElement => {
  const found = places(frame);
  const y = (limits: number): number => 22 + Math.max(-2.2, Math.min(2.2, limits)) * 9;
  const svg = s("svg", { class: "small-rule", viewBox: "0 0 22 44", width: 22, height: 44, "aria-hidden": "true" },
    s("rect", { class: "rule-band", x: 2, y: y(-1), width: 18, height: 18 }),
    s("path", { class: "rule-spine", d: "M11 2V42" }),
    s("path", { class: "rule-focus", d: "M2 22H20" }));
  for (const place of found) {
    svg.append(s("path", { class: "rule-interval", d: `M11 ${y(place.low)}V${y(place.high)}` }));
    svg.append(s("path", { class: found.length === 2 ? "rule-subject rule-unsure" : "rule-subject",
      d: `M11 ${y(place.at) - 3.5}l3.5 3.5l-3.5 3.5l-3.5 -3.5z` }));
  }
  return svg;
};
