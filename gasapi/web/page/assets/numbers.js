// Numbers as people write and read them.

/** Return the number that a text means, NaN where it means none; a decimal comma is taken for a point. */
export function parsed(text) {
  const plain = text.trim().replace(/\s/g, "").replace(/^\+/, "").replace(",", ".").replace("−", "-");
  return /^-?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$/.test(plain) ? Number(plain) : NaN;
}

/** Return a number with so many significant digits, large and small ones with a power of ten. */
export function shown(value, digits = 6) {
  if (value === null || value === undefined || !Number.isFinite(value)) return "–";
  if (value === 0) return "0";
  const size = Math.abs(value);
  if (size >= 1e7 || size < 1e-4) return power(value.toExponential(digits - 1));
  const places = Math.max(0, digits - 1 - Math.floor(Math.log10(size)));
  return minus(value.toFixed(Math.min(places, 12)));
}

/** As `shown`, without zeros at the end that say nothing. */
export function brief(value, digits = 4) {
  const text = shown(value, digits);
  return /[.]/.test(text) && !/10/.test(text.slice(text.indexOf("×"))) ? text.replace(/\.?0+$/, "") : text;
}

/** Return how many digits a value carries whose relative uncertainty is known: two beyond the first doubtful one. */
export function digitsFor(relative) {
  if (!(relative > 0)) return 6;
  return Math.min(8, Math.max(3, Math.ceil(-Math.log10(relative)) + 2));
}

/** Return a fraction as a percentage. */
export function percent(fraction, digits = 2) {
  return `${brief(100 * fraction, digits)} %`;
}

function power(text) {
  const [mantissa, exponent] = text.split("e");
  const raised = [...String(Number(exponent))].map((sign) => "⁰¹²³⁴⁵⁶⁷⁸⁹"[sign] ?? "⁻").join("");
  return minus(`${mantissa.replace(/\.?0+$/, "")} × 10${raised}`);
}

function minus(text) {
  return text.replace(/^-/, "−");
}
