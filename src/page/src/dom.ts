// Elements from values. Text is always set as text: nothing that comes from a file is ever parsed as markup.

export type Child = Node | string | undefined | false;
type Attributes = Record<string, string | number | boolean | undefined | ((event: Event) => void)>;

const add = (target: Element, children: Child[]): void => {
  for (const child of children) if (child !== undefined && child !== false) target.append(child);
};

const set = (target: Element, attributes: Attributes): void => {
  for (const [name, value] of Object.entries(attributes)) {
    if (value === undefined || value === false) continue;
    if (typeof value === "function") target.addEventListener(name, value);
    else target.setAttribute(name, value === true ? "" : String(value));
  }
};

export const h = <K extends keyof HTMLElementTagNameMap>(
  tag: K,
  attributes: Attributes = {},
  ...children: Child[]
): HTMLElementTagNameMap[K] => {
  const made = document.createElement(tag);
  set(made, attributes);
  add(made, children);
  return made;
};

export const s = <K extends keyof SVGElementTagNameMap>(
  tag: K,
  attributes: Attributes = {},
  ...children: Child[]
): SVGElementTagNameMap[K] => {
  const made = document.createElementNS("http://www.w3.org/2000/svg", tag);
  set(made, attributes);
  add(made, children);
  return made;
};

// A quantity: what is read, and the record's own number for whoever compares.
export const quantity = (value: number | undefined, text: (value: number) => string): Child =>
  value === undefined ? undefined : h("data", { value: String(value) }, text(value));

// The plotting library brings a style element with each chart; the page's policy allows only its own style, which
// holds the same rules.
export const chart = (plot: Element, description: string): Element => {
  plot.querySelectorAll("style").forEach((style) => style.remove());
  const drawing = plot instanceof SVGSVGElement ? plot : plot.querySelector("svg");
  drawing?.setAttribute("role", "img");
  drawing?.setAttribute("aria-label", description);
  drawing?.classList.add("chart");
  return plot;
};

export const jpeg = (base64: string): string => `data:image/jpeg;base64,${base64}`;
