// Quantities as a person reads them: three significant digits, always a unit.

export const plain = (value: number, significant = 3): string => {
  if (!Number.isFinite(value)) return "infinity";
  if (value === 0) return "0";
  const rounded = Number(value.toPrecision(significant));
  const digits = Math.max(0, significant - 1 - Math.floor(Math.log10(Math.abs(rounded))));
  return rounded.toFixed(Math.min(digits, 6)).replace("-", "−");
};

export const signed = (value: number, significant = 2): string =>
  value > 0 ? "+" + plain(value, significant) : plain(value, significant);

export const distance = (m: number): string => (Number.isFinite(m) ? `${plain(m)} m` : "infinity");
export const px = (value: number): string => `${value >= 99.95 ? plain(value) : value.toFixed(1)} px`;
export const um = (value: number): string => `${plain(value)} µm`;
export const mm = (value: number): string => `${plain(value)} mm`;
export const ev = (value: number): string => `${signed(value)} EV`;
export const fNumber = (value: number): string => `f/${Number(value.toPrecision(2))}`;
export const time = (s: number): string =>
  s < 0.3 ? `1/${plain(Math.round(1 / s), 4)} s` : `${Number(s.toPrecision(3))} s`;
export const percent = (fraction: number): string =>
  fraction > 0 && fraction < 0.001 ? "less than 0.1 %" : `${plain(fraction * 100, 2)} %`;

// "14 June 2026, 10:42:05.10", as recorded: no zone is applied.
const months = ["January", "February", "March", "April", "May", "June", "July", "August", "September", "October",
  "November", "December"];
const isoParts = (iso: string): RegExpMatchArray | null =>
  iso.match(/^(\d{4})-(\d{2})-(\d{2})T(\d{2}:\d{2}:\d{2}(?:\.\d+)?)/);
export const day = (iso: string): string => {
  const parts = isoParts(iso);
  return parts ? `${Number(parts[3])} ${months[Number(parts[2]) - 1] ?? ""} ${parts[1]}` : iso;
};
export const clock = (iso: string): string => isoParts(iso)?.[4] ?? iso;

// Milliseconds of the recorded wall-clock time, read as if it were UTC, so that charts show the recorded hours.
export const wallTime = (iso: string | undefined): number | undefined => {
  const parts = iso ? isoParts(iso) : null;
  if (!parts) return undefined;
  const value = Date.parse(`${parts[1]}-${parts[2]}-${parts[3]}T${parts[4]}Z`);
  return Number.isNaN(value) ? undefined : value;
};

export const counted = (count: number, one: string, many = one + "s"): string => `${count} ${count === 1 ? one : many}`;
