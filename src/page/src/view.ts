// What is shown, kept in the address after #, so that a view can be sent and the back button works.
import { causesOf, focusWord, limitsAtAim, type Frame } from "./records";

export interface View {
  text: string;
  focus: string;
  cause: string;
  lens: string;
  body: string;
  decision: string;
  sort: string; // a column, with "-" in front for the largest first
  frame: string; // path of the frame that is open
}

export const emptyView: View = { text: "", focus: "", cause: "", lens: "", body: "", decision: "", sort: "", frame: "" };
const keys = Object.keys(emptyView) as (keyof View)[];

export const viewOfAddress = (address: string): View => {
  const parameters = new URLSearchParams(address.replace(/^#/, ""));
  const view = { ...emptyView };
  for (const key of keys) view[key] = parameters.get(key) ?? "";
  return view;
};

export const addressOfView = (view: View): string => {
  const parameters = new URLSearchParams();
  for (const key of keys) if (view[key]) parameters.set(key, view[key]);
  const text = parameters.toString();
  return text ? "#" + text : "#";
};

const unknown = "not recorded";
export const lensOf = (frame: Frame): string => frame.capture?.lens ?? unknown;
export const bodyOf = (frame: Frame): string => {
  const { camera, body_serial: serial } = frame.capture ?? {};
  return serial ? `${camera ?? "body"}, ${serial}` : camera ?? unknown;
};
export const decisionOf = (frame: Frame): string => frame.decision?.decision ?? "none";

export interface Facet {
  key: keyof View;
  label: string;
  of: (frame: Frame) => string[];
}

export const facets: Facet[] = [
  { key: "focus", label: "Verdict", of: (frame) => [focusWord(frame)] },
  { key: "cause", label: "Cause", of: causesOf },
  { key: "decision", label: "Decision", of: (frame) => [decisionOf(frame)] },
  { key: "lens", label: "Lens", of: (frame) => [lensOf(frame)] },
  { key: "body", label: "Body", of: (frame) => [bodyOf(frame)] },
];

const matchesText = (frame: Frame, words: string[]): boolean => {
  const text = [frame.path, frame.capture?.lens, frame.capture?.camera, frame.verdict?.summary,
    ...(frame.issues ?? []).map((issue) => issue.message)].join("\n").toLowerCase();
  return words.every((word) => text.includes(word));
};

export interface Column {
  key: string;
  label: string;
  of: (frame: Frame) => string | number | undefined;
}

export const columns: Column[] = [
  { key: "name", label: "Frame", of: (frame) => frame.path },
  { key: "time", label: "Taken", of: (frame) => frame.capture?.taken_at },
  { key: "focus", label: "Verdict", of: focusWord },
  { key: "defocus", label: "Defocus", of: (frame) => frame.verdict?.defocus_limits ?? limitsAtAim(frame) },
  { key: "blur", label: "Blur at the aim", of: (frame) => frame.measurement?.aim?.blur_disc_px },
  { key: "decision", label: "Decision", of: (frame) => frame.decision?.decision },
];

// Values that are absent come last in either order.
const compare = (a: string | number | undefined, b: string | number | undefined, sign: number): number => {
  if (a === undefined || b === undefined) return (a === undefined ? 1 : 0) - (b === undefined ? 1 : 0);
  return a < b ? -sign : a > b ? sign : 0;
};

// Indices of the frames that a view shows, in its order.
export const shown = (frames: Frame[], view: View): number[] => {
  const words = view.text.toLowerCase().split(/\s+/).filter(Boolean);
  const wanted = facets.filter((facet) => view[facet.key]);
  const indices = frames.map((_, index) => index).filter((index) => {
    const frame = frames[index]!;
    return wanted.every((facet) => facet.of(frame).includes(view[facet.key])) && matchesText(frame, words);
  });
  const column = columns.find((candidate) => candidate.key === view.sort.replace(/^-/, ""));
  if (!column) return indices;
  const sign = view.sort.startsWith("-") ? -1 : 1;
  return indices.sort((a, b) => compare(column.of(frames[a]!), column.of(frames[b]!), sign) || a - b);
};
