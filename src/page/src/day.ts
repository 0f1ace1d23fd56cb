// The day: how many frames came out how, by lens and body, and over time.
import * as Plot from "@observablehq/plot";
import { chart, h } from "./dom";
import { focusWord, type Frame } from "./records";
import { counted, day, wallTime } from "./text";
import { facets, type View } from "./view";

const verdictOrder = ["on", "unsure", "front", "back", "off", "no evidence", "not done"];

const tally = (frames: Frame[], of: (frame: Frame) => string[]): [string, number][] => {
  const counts = new Map<string, number>();
  for (const frame of frames) for (const value of of(frame)) counts.set(value, (counts.get(value) ?? 0) + 1);
  return [...counts].sort(([a, m], [b, n]) => n - m || (a < b ? -1 : 1));
};

// A list of counts whose rows filter the table.
const tallyList = (frames: Frame[], key: keyof View, label: string, of: (frame: Frame) => string[], view: View,
  choose: (key: keyof View, value: string) => void): HTMLElement | undefined => {
  let counts = tally(frames, of);
  if (key === "focus") {
    counts = counts.sort(([a], [b]) => verdictOrder.indexOf(a) - verdictOrder.indexOf(b));
  }
  if (counts.length === 0 || (key === "decision" && counts.length === 1 && counts[0]![0] === "none")) return undefined;
  const most = Math.max(...counts.map(([, count]) => count));
  const items = counts.slice(0, 12).map(([value, count]) => {
    const bar = h("span", { class: "bar", "aria-hidden": "true" });
    bar.style.width = `${(100 * count) / most}%`;
    const pressed = view[key] === value;
    return h("li", {}, h("button", { type: "button", "aria-pressed": String(pressed), "data-key": key, "data-value": value,
      click: () => choose(key, pressed ? "" : value) },
      h("span", { class: "tally-name" }, value), h("data", { value: String(count) }, String(count)),
      h("span", { class: "track", "aria-hidden": "true" }, bar)));
  });
  return h("section", { class: "tally" }, h("h3", {}, label), h("ul", {}, ...items));
};

const overTime = (frames: Frame[], width: number): HTMLElement | undefined => {
  const points = frames.map((frame) => ({ at: wallTime(frame.capture?.taken_at), focus: focusWord(frame) }))
    .filter((point): point is { at: number; focus: string } => point.at !== undefined);
  if (points.length < 2) return undefined;
  // Days on which nothing was taken would leave the chart empty: one panel a day.
  const days = [...new Set(points.map(({ at }) => new Date(at).toISOString().slice(0, 10)))].sort();
  const data = points.map(({ at, focus }) => ({ focus, day: new Date(at).toISOString().slice(0, 10),
    hour: (at % 86_400_000) / 3_600_000 }));
  const hours = data.map(({ hour }) => hour);
  const [first, last] = [Math.floor(Math.min(...hours)), Math.ceil(Math.max(...hours) + 1e-6)];
  const thresholds = Array.from({ length: (last - first) * 6 + 1 }, (_, i) => first + i / 6);
  const shownDays = days.slice(-8);
  const bars = (kind: string) => ({ x: { thresholds, value: "hour" }, fy: "day", className: kind, insetLeft: 0.5,
    insetRight: 0.5 });
  const plot = Plot.plot({
    width, height: 60 + 70 * shownDays.length, marginLeft: 36, marginRight: 96, marginBottom: 34, className: "over-time",
    x: { label: "time of day, as recorded (h)", domain: [first, last], ticks: Math.min(last - first, 12),
      tickFormat: (hour: number) => `${String(Math.floor(hour)).padStart(2, "0")}:00` },
    y: { label: "frames", grid: true, ticks: 3 },
    fy: { label: null, domain: shownDays, tickFormat: (iso: string) => day(`${iso}T00:00:00`) },
    marks: [
      Plot.rectY(data.filter((d) => shownDays.includes(d.day)), Plot.binX({ y: "count" }, bars("bar-all"))),
      Plot.rectY(data.filter((d) => shownDays.includes(d.day) && d.focus === "on"), Plot.binX({ y: "count" }, bars("bar-on"))),
      Plot.ruleY([0], { className: "axis-line" }),
    ],
  });
  const perDay = days.map((iso) => `${day(`${iso}T00:00:00`)}: ` +
    counted(data.filter((d) => d.day === iso).length, "frame"));
  return h("figure", { class: "over-time-figure" }, h("figcaption", {},
    h("strong", {}, "Over the day"), " Frames in ten minutes; the filled part was on."),
    chart(plot, `Frames over time. ${perDay.join("; ")}.`));
};

export const headline = (frames: Frame[]): string => {
  const counts = new Map(tally(frames, (frame) => [focusWord(frame)]));
  const parts = verdictOrder.filter((word) => counts.has(word)).map((word) => `${counts.get(word)} ${word}`);
  return `${counted(frames.length, "frame")}: ${parts.join(", ")}.`;
};

export const dayView = (frames: Frame[], view: View, width: number,
  choose: (key: keyof View, value: string) => void): HTMLElement[] => {
  const lists = facets.map((facet) => tallyList(frames, facet.key, facet.label, facet.of, view, choose));
  const time = overTime(frames, width);
  return [h("div", { class: "tallies" }, ...lists), ...(time ? [time] : [])];
};
