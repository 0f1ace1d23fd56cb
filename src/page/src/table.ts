// The table of frames. Only the rows in sight, and a screenful around them, are in the document.
import { h, jpeg, quantity } from "./dom";
import { smallRule } from "./depth_rule";
import { acceptablePx, causesOf, fileName, focusWord, limitsAtAim, picturesOf, type Frame } from "./records";
import { clock, px, signed, plain } from "./text";
import { columns, type View } from "./view";

export interface TableActions {
  open: (index: number) => void;
  sort: (column: string) => void;
}

const blurCell = (frame: Frame): HTMLElement => {
  const aim = frame.measurement?.aim;
  const limit = acceptablePx(frame);
  if (aim?.blur_disc_px === undefined) return h("div", { role: "gridcell", class: "cell-blur" }, "no evidence");
  return h("div", { role: "gridcell", class: "cell-blur" },
    aim.bound === "lower" ? "≥ " : "", quantity(aim.blur_disc_px, px) ?? "",
    limit === undefined ? "" : h("small", {}, ` of ${px(limit)}`));
};

const defocusText = (frame: Frame): string => {
  const limits = frame.verdict?.defocus_limits;
  if (limits !== undefined) return `${signed(limits)} limits`;
  const blur = limitsAtAim(frame);
  return blur === undefined ? "" : `± ${plain(blur, 2)} limits`;
};

const row = (frame: Frame, index: number, position: number): HTMLElement => {
  const { whole } = picturesOf(index);
  const decision = frame.decision;
  return h("div", { role: "row", class: "row", tabindex: -1, "aria-rowindex": position + 2, "data-index": index },
    h("div", { role: "gridcell", class: "cell-picture" },
      whole ? h("img", { src: jpeg(whole), alt: "", loading: "eager", decoding: "async" }) : ""),
    h("div", { role: "gridcell", class: "cell-name" }, fileName(frame.path)),
    h("div", { role: "gridcell", class: "cell-time" },
      frame.capture?.taken_at ? clock(frame.capture.taken_at) : "not recorded"),
    h("div", { role: "gridcell", class: "cell-rule" }, smallRule(frame)),
    h("div", { role: "gridcell", class: "cell-focus" }, h("strong", {}, focusWord(frame)),
      h("small", {}, causesOf(frame).join(", "))),
    h("div", { role: "gridcell", class: "cell-defocus" }, defocusText(frame)),
    blurCell(frame),
    h("div", { role: "gridcell", class: "cell-decision" }, decision
      ? `${decision.decision}${decision.by_person ? " (by hand)" : ""}` : ""));
};

export class FrameTable {
  readonly element: HTMLElement;
  private readonly scroller: HTMLElement;
  private readonly body: HTMLElement;
  private readonly head: HTMLElement;
  private indices: number[] = [];
  private rows = new Map<number, HTMLElement>(); // by position
  private current = 0; // position that the keyboard is on
  private rowHeight = 60;
  private printing = false;

  constructor(private readonly frames: Frame[], private readonly actions: TableActions) {
    this.head = h("div", { role: "row", class: "row head", "aria-rowindex": 1 });
    this.body = h("div", { role: "rowgroup", class: "rows" });
    this.scroller = h("div", { class: "scroller", tabindex: -1, scroll: () => this.draw() }, this.body);
    this.element = h("div", { role: "grid", class: "frames", "aria-label": "Frames", "aria-colcount": 8 },
      h("div", { role: "rowgroup" }, this.head), this.scroller);
    this.scroller.setAttribute("role", "presentation");
    this.body.addEventListener("click", (event) => {
      const found = (event.target as Element).closest<HTMLElement>(".row");
      if (found) this.choose(Number(found.dataset["index"]));
    });
    this.body.addEventListener("keydown", (event) => this.key(event));
    new ResizeObserver(() => this.measure()).observe(this.scroller);
    addEventListener("beforeprint", () => this.print(true));
    addEventListener("afterprint", () => this.print(false));
  }

  show(indices: number[], view: View): void {
    this.indices = indices;
    this.element.setAttribute("aria-rowcount", String(indices.length + 1));
    const open = indices.findIndex((index) => this.frames[index]?.path === view.frame);
    this.current = open >= 0 ? open : Math.min(this.current, Math.max(0, indices.length - 1));
    this.drawHead(view.sort);
    this.clear();
    this.measure();
    if (open >= 0) this.reveal(open);
  }

  focus(): void {
    this.reveal(this.current);
    this.rows.get(this.current)?.focus();
  }

  private drawHead(sort: string): void {
    const header = (key: string, extra = ""): HTMLElement => {
      const column = columns.find((candidate) => candidate.key === key)!;
      const active = sort.replace(/^-/, "") === key;
      const down = active && sort.startsWith("-");
      return h("div", { role: "columnheader", class: `cell-${key} ${extra}`,
        "aria-sort": active ? (down ? "descending" : "ascending") : "none" },
        h("button", { type: "button", click: () => this.actions.sort(active && !down ? `-${key}` : active ? "" : key) },
          column.label, h("span", { class: "arrow", "aria-hidden": "true" }, active ? (down ? " ↓" : " ↑") : "")));
    };
    const focused = this.head.contains(document.activeElement)
      ? [...this.head.querySelectorAll("button")].indexOf(document.activeElement as HTMLButtonElement) : -1;
    this.head.replaceChildren(
      h("div", { role: "columnheader", class: "cell-picture" }, h("span", { class: "hidden" }, "Picture")),
      header("name"), header("time"),
      h("div", { role: "columnheader", class: "cell-rule" }, h("span", { class: "hidden" }, "Depth rule")),
      header("focus"), header("defocus"), header("blur"), header("decision"));
    if (focused >= 0) this.head.querySelectorAll("button")[focused]?.focus();
  }

  private clear(): void {
    this.rows.forEach((element) => element.remove());
    this.rows.clear();
  }

  private measure(): void {
    const wanted = getComputedStyle(this.element).getPropertyValue("--row-height");
    const height = parseFloat(wanted) || 60;
    if (height !== this.rowHeight) this.clear();
    this.rowHeight = height;
    this.body.style.height = `${this.indices.length * this.rowHeight}px`;
    this.draw();
  }

  private draw(): void {
    const sight = this.scroller.clientHeight || 600;
    const top = this.scroller.scrollTop;
    const first = this.printing ? 0 : Math.max(0, Math.floor((top - sight) / this.rowHeight));
    const last = this.printing ? this.indices.length
      : Math.min(this.indices.length, Math.ceil((top + 2 * sight) / this.rowHeight));
    for (const [position, element] of this.rows) {
      const keep = (position >= first && position < last) || element === document.activeElement;
      if (!keep) { element.remove(); this.rows.delete(position); }
    }
    for (let position = first; position < last; ++position) this.place(position);
    for (const [position, element] of this.rows) element.tabIndex = position === this.current ? 0 : -1;
    if (!this.rows.has(this.current)) this.rows.get(first)?.setAttribute("tabindex", "0");
  }

  private place(position: number): void {
    if (this.rows.has(position)) return;
    const index = this.indices[position];
    const frame = index === undefined ? undefined : this.frames[index];
    if (index === undefined || !frame) return;
    const element = row(frame, index, position);
    element.style.top = `${position * this.rowHeight}px`;
    this.rows.set(position, element);
    // In document order, so that reading aloud follows the eye.
    const next = [...this.rows].filter(([other]) => other > position).sort(([a], [b]) => a - b)[0];
    this.body.insertBefore(element, next ? next[1] : null);
    this.mark(element, position);
  }

  private mark(element: HTMLElement, position: number): void {
    element.setAttribute("aria-selected", String(position === this.current));
  }

  private reveal(position: number): void {
    const top = position * this.rowHeight;
    const sight = this.scroller.clientHeight;
    if (top < this.scroller.scrollTop) this.scroller.scrollTop = top;
    else if (top + this.rowHeight > this.scroller.scrollTop + sight) this.scroller.scrollTop = top + this.rowHeight - sight;
    this.draw();
    this.rows.forEach((element, other) => this.mark(element, other));
  }

  private choose(index: number): void {
    const position = this.indices.indexOf(index);
    if (position >= 0) this.current = position;
    this.reveal(this.current);
    this.rows.get(this.current)?.focus({ preventScroll: true });
    this.actions.open(index);
  }

  private key(event: KeyboardEvent): void {
    const page = Math.max(1, Math.floor(this.scroller.clientHeight / this.rowHeight) - 1);
    const steps: Record<string, number> = { ArrowDown: 1, ArrowUp: -1, PageDown: page, PageUp: -page,
      Home: -this.indices.length, End: this.indices.length };
    const step = steps[event.key];
    if (step !== undefined) {
      this.current = Math.max(0, Math.min(this.indices.length - 1, this.current + step));
      this.focus();
    } else if (event.key === "Enter" || event.key === " ") {
      const index = this.indices[this.current];
      if (index !== undefined) this.actions.open(index);
    } else {
      return;
    }
    event.preventDefault();
  }

  private print(on: boolean): void {
    this.printing = on;
    this.element.classList.toggle("printing", on);
    this.draw();
  }
}
