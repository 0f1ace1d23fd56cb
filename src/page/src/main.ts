// The page of `report` and `review`.
import { dayView, headline } from "./day";
import { h } from "./dom";
import { frameView } from "./frame";
import { readData, type Frame } from "./records";
import { FrameTable } from "./table";
import { day } from "./text";
import { addressOfView, emptyView, facets, shown, viewOfAddress, type View } from "./view";

class Page {
  private readonly data = readData();
  private readonly frames: Frame[] = this.data.frames;
  private view: View = viewOfAddress(location.hash);
  private order: number[] = [];
  private readonly dayBox = h("div", { class: "day" });
  private readonly count = h("p", { class: "count", role: "status" });
  private readonly search = h("input", { type: "search", id: "text", autocomplete: "off", spellcheck: "false",
    input: () => this.change({ text: this.search.value }, true) });
  private readonly selects = new Map<keyof View, HTMLSelectElement>();
  private readonly detail = h("section", { class: "detail", "aria-label": "The open frame" });
  private readonly table = new FrameTable(this.frames, {
    open: (index) => this.change({ frame: this.frames[index]?.path ?? "" }),
    sort: (sort) => this.change({ sort }),
  });

  start(): void {
    document.title = `${this.data.title}: where focus fell`;
    document.body.replaceChildren(...this.layout());
    addEventListener("hashchange", () => { this.view = viewOfAddress(location.hash); this.draw(); });
    addEventListener("keydown", (event) => this.key(event));
    let width = innerWidth;
    addEventListener("resize", () => { if (innerWidth !== width) { width = innerWidth; this.drawDay(); } });
    this.draw();
    if (document.body.classList.contains("frame-open")) this.table.element.scrollIntoView();
    document.documentElement.dataset["ready"] = "true";
  }

  private layout(): HTMLElement[] {
    return [
      h("a", { class: "skip", href: "#frames-heading", click: (event) => { event.preventDefault(); this.table.focus(); } },
        "To the frames"),
      h("header", { class: "top" },
        h("p", { class: "mark" }, "Focusfall"),
        h("h1", {}, this.data.title),
        h("p", { class: "lead" }, this.dates(), headline(this.frames))),
      h("main", {},
        h("section", { "aria-labelledby": "day-heading" }, h("h2", { id: "day-heading" }, "The day"), this.dayBox),
        h("section", { class: "frames-section", "aria-labelledby": "frames-heading" },
          h("h2", { id: "frames-heading" }, "Frames"), this.filters(), this.count,
          h("div", { class: "split" }, this.table.element, this.detail))),
      h("footer", {}, h("p", {}, `Focusfall ${this.data.version}. Verdicts are evidence, not a repair order. `,
        "Arrow keys move through the frames, Enter opens one, Escape closes it, / goes to the search.")),
    ];
  }

  private dates(): string {
    const days = this.frames.map((frame) => frame.capture?.taken_at?.slice(0, 10)).filter((d): d is string => !!d).sort();
    const [first, last] = [days[0], days[days.length - 1]];
    if (!first || !last) return "";
    return first === last ? `${day(first + "T00:00:00")}. ` : `${day(first + "T00:00:00")} to ${day(last + "T00:00:00")}. `;
  }

  private filters(): HTMLElement {
    const fields = facets.map((facet) => {
      const values = [...new Set(this.frames.flatMap(facet.of))].sort();
      const select = h("select", { id: facet.key, change: () => this.change({ [facet.key]: select.value }) },
        h("option", { value: "" }, "all"), ...values.map((value) => h("option", { value }, value)));
      this.selects.set(facet.key, select);
      const empty = values.length < 2 && facet.key === "decision";
      return empty ? undefined : h("label", { for: facet.key }, facet.label, select);
    });
    return h("form", { class: "filters", role: "search", submit: (event) => event.preventDefault() },
      h("label", { for: "text" }, "Text", this.search), ...fields,
      h("button", { type: "button", click: () => this.change({ ...emptyView, frame: this.view.frame }) }, "Show all"));
  }

  // Typing replaces the entry of the history; choices make a new one.
  private change(part: Partial<View>, replace = false): void {
    this.view = { ...this.view, ...part };
    const address = addressOfView(this.view);
    if (replace) history.replaceState(null, "", address); else history.pushState(null, "", address);
    this.draw(part.frame !== undefined);
  }

  private draw(opened = false): void {
    this.order = shown(this.frames, this.view);
    this.count.textContent = this.order.length === this.frames.length ? `All ${this.frames.length} frames`
      : `${this.order.length} of ${this.frames.length} frames`;
    if (this.search.value !== this.view.text) this.search.value = this.view.text;
    this.selects.forEach((select, key) => { select.value = this.view[key]; });
    if (!opened) { this.drawDay(); this.table.show(this.order, this.view); }
    this.drawDetail(opened);
  }

  private drawDay(): void {
    const focused = document.activeElement as HTMLElement | null;
    const { key, value } = focused && this.dayBox.contains(focused) ? focused.dataset : {};
    const width = Math.min(1180, Math.max(320, document.documentElement.clientWidth - 48));
    this.dayBox.replaceChildren(...dayView(this.frames, this.view, width, (k, v) => this.change({ [k]: v })));
    if (!key) return;
    const again = [...this.dayBox.querySelectorAll<HTMLElement>("button")]
      .find((button) => button.dataset["key"] === key && button.dataset["value"] === value);
    again?.focus();
  }

  private drawDetail(opened: boolean): void {
    const index = this.frames.findIndex((frame) => frame.path === this.view.frame);
    const frame = this.frames[index];
    document.body.classList.toggle("frame-open", frame !== undefined);
    if (!frame) {
      this.detail.replaceChildren(h("p", { class: "nothing" }, this.view.frame
        ? "The frame that the address names is not on this page."
        : "Choose a frame to see where focus fell."));
      return;
    }
    const position = this.order.indexOf(index);
    const step = (by: number): HTMLElement => {
      const next = this.order[position + by];
      return h("button", { type: "button", disabled: position < 0 || next === undefined,
        click: () => { this.change({ frame: this.frames[next!]!.path }); this.table.show(this.order, this.view); } },
        by < 0 ? "Previous" : "Next");
    };
    this.detail.replaceChildren(h("div", { class: "detail-bar" }, step(-1), step(1),
      h("button", { type: "button", class: "close", click: () => this.close() }, "Close")), frameView(frame, index));
    this.detail.scrollTop = 0;
    if (opened && getComputedStyle(this.detail).position === "fixed") {
      this.detail.querySelector<HTMLElement>("h3")?.focus();
    }
  }

  private close(): void {
    this.change({ frame: "" });
    this.table.focus();
  }

  private key(event: KeyboardEvent): void {
    const typing = event.target instanceof HTMLInputElement && event.target.type === "search";
    if (event.key === "Escape" && this.view.frame) this.close();
    else if (event.key === "/" && !typing && !event.ctrlKey && !event.metaKey) this.search.focus();
    else return;
    event.preventDefault();
  }
}

new Page().start();
