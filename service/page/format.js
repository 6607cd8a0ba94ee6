// Numbers as people read them: significant digits that the data support, true minus signs, units.

const SUPERSCRIPT = { "-": "⁻", 0: "⁰", 1: "¹", 2: "²", 3: "³", 4: "⁴", 5: "⁵", 6: "⁶", 7: "⁷", 8: "⁸", 9: "⁹" };
export const UNKNOWN = "–";

const known = (value) => typeof value === "number" && Number.isFinite(value);
const exponent = (value) => (value === 0 ? 0 : Math.floor(Math.log10(Math.abs(value))));
const minus = (text) => text.replace("-", "\u2212");

function scientific(value, digits) {
  const [mantissa, power] = value.toExponential(digits).split("e");
  return `${minus(mantissa)} × 10${[...String(Number(power))].map((c) => SUPERSCRIPT[c]).join("")}`;
}

/** With so many significant digits; far from 1 as a power of ten. */
export function significant(value, digits = 4) {
  if (!known(value)) return UNKNOWN;
  if (value === 0) return "0";
  if (Math.abs(value) < 1e-4 || Math.abs(value) >= 1e7) return scientific(value, digits - 1);
  // Digits before the point are never replaced by zeros.
  const rounded = Math.abs(value) >= 10 ** digits ? value : Number(value.toPrecision(digits));
  return minus(rounded.toFixed(Math.max(0, digits - 1 - exponent(rounded))));
}

/** A number that is exact as it stands (a setting asked for, a sample time): no digits added. */
export function exact(value) {
  return known(value) ? minus(String(Number(value.toPrecision(6)))) : UNKNOWN;
}

/** With so many decimals. */
export function fixed(value, decimals) {
  return known(value) ? minus(value.toFixed(decimals)) : UNKNOWN;
}

/** {value, std, low, high} as text to the same decimals: two digits of the standard deviation. */
export function estimate({ value, std, ci95 }) {
  const scale = known(std) && std > 0 ? std : null;
  const decimals = scale === null ? null : 1 - exponent(Number(scale.toPrecision(2)));
  // More decimals than a double holds, or a value too far from 1 for plain digits.
  const plain = decimals !== null && decimals <= 7 && Math.abs(value) < 1e7;
  const show = (x) => (plain ? fixed(x, Math.max(0, decimals)) : significant(x, 4));
  return { value: show(value), std: known(std) ? show(std) : UNKNOWN, low: show(ci95[0]), high: show(ci95[1]) };
}

/** "14.54 to 14.63", or which side the log leaves open. */
export function interval(shown) {
  if (shown.low === UNKNOWN && shown.high === UNKNOWN) return "not bounded by this log";
  if (shown.low === UNKNOWN) return `up to ${shown.high}`;
  if (shown.high === UNKNOWN) return `${shown.low} or more`;
  return `${shown.low} to ${shown.high}`;
}

/** A p-value: never 0, never more digits than it deserves. */
export function probability(p) {
  if (!known(p)) return UNKNOWN;
  return p < 0.001 ? "< 0.001" : p.toFixed(p < 0.1 ? 3 : 2);
}

/** A duration in s as the eye wants it. */
export function duration(seconds) {
  if (!known(seconds)) return UNKNOWN;
  if (seconds < 120) return `${significant(seconds, 4)} s`;
  const whole = Math.round(seconds);
  const parts = [[Math.floor(whole / 3600), "h"], [Math.floor((whole % 3600) / 60), "min"], [whole % 60, "s"]];
  return parts.filter(([n]) => n > 0).map(([n, unit]) => `${n} ${unit}`).join(" ");
}

/** RFC 3339 to "2026-11-17 05:40:00 UTC". */
export function instant(text) {
  return text ? text.replace("T", " ").replace(/(\.\d*?)0*Z$/, "$1Z").replace(/\.?Z$|\+00:00$/, " UTC") : null;
}

/** With its unit after a space that does not break; degrees stand close. */
export function withUnit(text, unit) {
  if (unit === "°") return text === UNKNOWN ? text : `${text}°`;
  return unit && text !== UNKNOWN ? `${text}\u00a0${unit}` : text;
}

/** Unit of a quotient: "%" per "rpm" is "%/rpm"; empty where neither is known. */
export function per(numerator, denominator) {
  if (!numerator && !denominator) return "";
  return `${numerator || "1"}/${denominator || "1"}`;
}
