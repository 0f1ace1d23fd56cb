// The picture of a frame with what was found in it drawn on top. Everything that a record places in the unrotated
// frame is mapped here, once, to the picture as displayed.
import { contours } from "d3-contour";
import { h, jpeg, s } from "./dom";
import { acceptablePx, blurOfOctet, fileName, octets, picturesOf, type Box, type Frame } from "./records";
import { plain, px } from "./text";

type Point = [number, number];

// Exif orientation 1..8: a point of the unrotated frame, in fractions, as displayed.
export const displayed = ([x, y]: Point, orientation = 1): Point => {
  switch (orientation) {
    case 2: return [1 - x, y];
    case 3: return [1 - x, 1 - y];
    case 4: return [x, 1 - y];
    case 5: return [y, x];
    case 6: return [1 - y, x];
    case 7: return [1 - y, 1 - x];
    case 8: return [y, 1 - x];
    default: return [x, y];
  }
};

class Mapping {
  readonly width: number;
  readonly height: number;
  constructor(frame: Frame) {
    this.orientation = frame.capture?.orientation ?? 1;
    const width = frame.capture?.width_px ?? 3;
    const height = frame.capture?.height_px ?? 2;
    // Drawn 1000 units wide or high, whichever is longer, so that strokes and letters are the same on every frame.
    const turned = this.orientation >= 5;
    const scale = 1000 / Math.max(width, height);
    this.width = (turned ? height : width) * scale;
    this.height = (turned ? width : height) * scale;
  }
  private readonly orientation: number;
  at(point: Point): Point {
    const [x, y] = displayed(point, this.orientation);
    return [x * this.width, y * this.height];
  }
  box(box: Box): Box {
    const [x1, y1] = this.at([box.x, box.y]);
    const [x2, y2] = this.at([box.x + box.width, box.y + box.height]);
    return { x: Math.min(x1, x2), y: Math.min(y1, y2), width: Math.abs(x2 - x1), height: Math.abs(y2 - y1) };
  }
}

const pathOf = (points: Point[]): string =>
  points.map(([x, y], i) => `${i ? "L" : "M"}${x.toFixed(1)} ${y.toFixed(1)}`).join("");

// A line that can be seen on light and on dark: a pale one under a dark one.
const line = (d: string, kind: string): SVGElement[] =>
  [s("path", { d, class: `under ${kind}` }), s("path", { d, class: `over ${kind}` })];
const label = (at: Point, text: string, anchor = "middle"): SVGElement =>
  s("text", { x: at[0], y: at[1], "text-anchor": anchor, class: "label" }, text);

// ---- contours of blur

interface Grid { columns: number; rows: number; values: number[] } // NaN: no evidence

// The median of a tile and its neighbours, where at least three of the nine are known: single tiles scatter.
const smoothed = (grid: Grid): Grid => {
  const { columns, rows, values } = grid;
  const result = values.map((_, index) => {
    const [cx, cy] = [index % columns, Math.floor(index / columns)];
    const near: number[] = [];
    for (let y = Math.max(0, cy - 1); y <= Math.min(rows - 1, cy + 1); ++y) {
      for (let x = Math.max(0, cx - 1); x <= Math.min(columns - 1, cx + 1); ++x) {
        const value = values[y * columns + x]!;
        if (!Number.isNaN(value)) near.push(value);
      }
    }
    if (near.length < 3) return NaN;
    near.sort((a, b) => a - b);
    return near[Math.floor(near.length / 2)]!;
  });
  return { columns, rows, values: result };
};

const gridOf = (frame: Frame): Grid | undefined => {
  if (!frame.tiles) return undefined;
  const values = [...octets(frame.tiles.blur)].map((octet) => blurOfOctet(octet) ?? NaN);
  return smoothed({ columns: frame.tiles.columns, rows: frame.tiles.rows, values });
};

// A contour runs only between tiles that both say something: where it would follow the edge of the evidence it breaks.
const known = (grid: Grid, [x, y]: Point): boolean => {
  const cells: Point[] = [[Math.floor(x - 0.5), Math.floor(y - 0.5)], [Math.ceil(x - 0.5), Math.ceil(y - 0.5)]];
  return cells.every(([cx, cy]) => cx >= 0 && cy >= 0 && cx < grid.columns && cy < grid.rows &&
    !Number.isNaN(grid.values[cy * grid.columns + cx]!));
};

const pieces = (grid: Grid, ring: Point[]): Point[][] => {
  const found: Point[][] = [];
  let piece: Point[] = [];
  for (const point of ring) {
    if (known(grid, point)) piece.push(point);
    else { if (piece.length > 2) found.push(piece); piece = []; }
  }
  if (piece.length > 2) found.push(piece);
  return found;
};

const contourLayer = (frame: Frame, mapping: Mapping): SVGElement[] => {
  const grid = gridOf(frame);
  const limit = acceptablePx(frame);
  if (!grid || !limit) return [];
  const levels = [1, 2, 4, 8].map((factor) => factor * limit);
  const drawn: SVGElement[] = [];
  contours().size([grid.columns, grid.rows]).thresholds(levels)(grid.values).forEach((contour, step) => {
    let longest: Point[] = [];
    for (const polygon of contour.coordinates) {
      for (const ring of polygon) {
        for (const piece of pieces(grid, ring as Point[])) {
          const points = piece.map(([x, y]) => mapping.at([x / grid.columns, y / grid.rows]));
          drawn.push(...line(pathOf(points), `contour-${step}`));
          if (points.length > longest.length) longest = points;
        }
      }
    }
    const middle = longest[Math.floor(longest.length / 2)];
    if (middle) drawn.push(label(middle, px(levels[step]!)));
  });
  return drawn;
};

// ---- aim, line of best focus, motion, clipping

const aimLayer = (frame: Frame, mapping: Mapping): SVGElement[] => {
  if (!frame.aim) return [];
  const { x, y, width, height } = mapping.box(frame.aim);
  const arm = Math.min(width, height) * 0.28;
  // Four corners: the subject inside stays free.
  const corner = (cx: number, cy: number, dx: number, dy: number): string =>
    `M${cx + dx * arm} ${cy}L${cx} ${cy}L${cx} ${cy + dy * arm}`;
  const d = corner(x, y, 1, 1) + corner(x + width, y, -1, 1) + corner(x, y + height, 1, -1) +
    corner(x + width, y + height, -1, -1);
  const blur = frame.measurement?.aim?.blur_disc_px;
  const above = y > 34;
  return [...line(d, "aim"), label([x + width / 2, above ? y - 10 : y + height + 28],
    blur === undefined ? "aim" : `aim ${px(blur)}`)];
};

const focusLineLayer = (frame: Frame, mapping: Mapping): SVGElement[] => {
  const plane = frame.measurement?.plane;
  if (!plane || plane.offset_px === undefined) return [];
  const { x_gradient: a, y_gradient: b, offset_px: g } = plane;
  const ends: Point[] = [];
  const push = (x: number, y: number): void => {
    if (x >= 0 && x <= 1 && y >= 0 && y <= 1) ends.push([x, y]);
  };
  if (b !== 0) { push(0, -g / b); push(1, -(a + g) / b); }
  if (a !== 0) { push(-g / a, 0); push(-(b + g) / a, 1); }
  if (ends.length < 2) return [];
  const [p, q] = [mapping.at(ends[0]!), mapping.at(ends[1]!)];
  const right = p[0] > q[0] ? p : q;
  return [...line(pathOf([p, q]), "focus-line"), label([right[0] - 10, right[1] - 10], "line of best focus", "end")];
};

const motionLayer = (frame: Frame, mapping: Mapping): SVGElement[] => {
  const moves: [string, Point, { length_px?: number; angle_deg?: number } | undefined][] = [
    ["subject", frame.aim ? [frame.aim.x + frame.aim.width / 2, frame.aim.y + frame.aim.height / 2] : [0.5, 0.5],
      frame.measurement?.motion],
    ["background", [0.14, 0.14], frame.measurement?.background_motion]];
  const drawn: SVGElement[] = [];
  const aspect = (frame.capture?.height_px ?? 2) / (frame.capture?.width_px ?? 3);
  for (const [what, centre, motion] of moves) {
    if (motion?.length_px === undefined || motion.angle_deg === undefined) continue;
    const angle = (motion.angle_deg * Math.PI) / 180;
    const half: Point = [0.055 * Math.cos(angle), (0.055 * Math.sin(angle)) / aspect];
    const ends = [mapping.at([centre[0] - half[0], centre[1] - half[1]]),
      mapping.at([centre[0] + half[0], centre[1] + half[1]])] as const;
    const middle = mapping.at(centre);
    drawn.push(...line(pathOf([...ends]), "motion"),
      ...ends.map((end) => s("circle", { cx: end[0], cy: end[1], r: 5, class: "motion-end" })),
      label([middle[0], Math.max(ends[0][1], ends[1][1]) + 26], `${what} ${px(motion.length_px)}`));
  }
  return drawn;
};

const clippedLayer = (frame: Frame, mapping: Mapping): SVGElement[] => {
  const tiles = frame.tiles;
  const clipping = frame.measurement?.clipping;
  if (!tiles || !clipping || !clipping.any) return [];
  const letters = [clipping.red ? "R" : "", clipping.green ? "G" : "", clipping.blue ? "B" : ""].join("");
  const shares = octets(tiles.clipped);
  const drawn: SVGElement[] = [];
  let fullest = -1;
  shares.forEach((share, index) => {
    if (share < 5) return; // 2 % of the tile
    const [x, y] = [index % tiles.columns, Math.floor(index / tiles.columns)];
    const box = mapping.box({ x: x / tiles.columns, y: y / tiles.rows, width: 1 / tiles.columns,
      height: 1 / tiles.rows });
    drawn.push(s("rect", { ...box, class: "hatched", fill: "url(#hatch)" }));
    if (fullest < 0 || share > shares[fullest]!) fullest = index;
  });
  if (fullest < 0) return [];
  const at = mapping.at([((fullest % tiles.columns) + 0.5) / tiles.columns,
    (Math.floor(fullest / tiles.columns) + 0.5) / tiles.rows]);
  drawn.push(label([at[0], at[1] + 7], letters));
  return drawn;
};

// ---- the whole

export interface Layer { key: string; label: string; draw: (frame: Frame, mapping: Mapping) => SVGElement[] }
export const layers: Layer[] = [
  { key: "aim", label: "Aim", draw: aimLayer },
  { key: "contours", label: "Blur contours", draw: contourLayer },
  { key: "focus-line", label: "Line of best focus", draw: focusLineLayer },
  { key: "motion", label: "Motion", draw: motionLayer },
  { key: "clipped", label: "Clipped areas", draw: clippedLayer },
];
const on = new Set(["aim", "contours", "focus-line", "clipped"]); // remembered from frame to frame

const hatch = (): SVGElement => s("defs", {}, s("pattern", { id: "hatch", width: 9, height: 9,
  patternUnits: "userSpaceOnUse", patternTransform: "rotate(45)" },
  s("rect", { width: 9, height: 9, class: "hatch-ground" }), s("rect", { width: 4, height: 9, class: "hatch-line" })));

const description = (frame: Frame): string => {
  const blur = frame.measurement?.aim?.blur_disc_px;
  const clipped = frame.measurement?.clipping?.any;
  return `${fileName(frame.path)}: ${blur === undefined ? "no evidence of blur at the aim" : `blur at the aim ${px(blur)}`}` +
    `${clipped ? `, ${plain(clipped * 100, 2)} % of the frame clipped` : ""}.`;
};

// `source` overrides the small picture that the page carries.
export const picture = (frame: Frame, index: number, source?: string): HTMLElement => {
  const { whole } = picturesOf(index);
  const mapping = new Mapping(frame);
  const href = source ?? (whole ? jpeg(whole) : "");
  const svg = s("svg", { viewBox: `0 0 ${mapping.width} ${mapping.height}`, role: "img",
    "aria-label": description(frame), class: "picture" }, hatch(),
    href ? s("image", { href, width: mapping.width, height: mapping.height, preserveAspectRatio: "none" })
      : s("rect", { width: mapping.width, height: mapping.height, class: "no-picture" }));
  const switches = h("fieldset", { class: "switches" }, h("legend", {}, "Drawn on the picture"));
  for (const layer of layers) {
    const shapes = layer.draw(frame, mapping);
    const group = s("g", { class: `layer layer-${layer.key}`, "data-layer": layer.key }, ...shapes);
    group.classList.toggle("off", !on.has(layer.key));
    svg.append(group);
    const box = h("input", { type: "checkbox", name: layer.key, checked: on.has(layer.key) && shapes.length > 0,
      disabled: shapes.length === 0, change: () => {
        if (box.checked) on.add(layer.key); else on.delete(layer.key);
        group.classList.toggle("off", !box.checked);
      } });
    switches.append(h("label", {}, box, layer.label));
  }
  return h("div", { class: "picture-block" }, svg, switches);
};
