// Scales and round tick values.

/** A linear scale from values to places in the picture. */
export function linear([low, high], [from, to]) {
  const place = (value) => from + ((value - low) / (high - low)) * (to - from);
  place.value = (at) => low + ((at - from) / (to - from)) * (high - low);
  place.low = low;
  place.high = high;
  return place;
}

/** Return round values inside a range, about so many of them. */
export function ticks(low, high, wanted) {
  const step = roundStep((high - low) / Math.max(1, wanted));
  const found = [];
  for (let n = Math.ceil(low / step - 1e-9); n * step <= high + step * 1e-9; n += 1) found.push(Number((n * step).toPrecision(12)));
  return found;
}

/** Return the smallest of 1, 2, 5 times a power of ten that is not below a size. */
export function roundStep(size) {
  const power = 10 ** Math.floor(Math.log10(size));
  const ratio = size / power;
  return power * (ratio <= 1.0001 ? 1 : ratio <= 2.0001 ? 2 : ratio <= 5.0001 ? 5 : 10);
}

/** Return a value rounded to a step. */
export function snapped(value, step) {
  return Number((Math.round(value / step) * step).toPrecision(10));
}

/** Move labels apart along one direction, so that none covers another; each keeps its order. */
export function spread(labels, gap, low, high) {
  const sorted = [...labels].sort((a, b) => a.at - b.at);
  let last = low - gap;
  for (const label of sorted) {
    label.at = Math.max(label.at, last + gap);
    last = label.at;
  }
  let next = high + gap;
  for (const label of sorted.reverse()) {
    label.at = Math.min(label.at, next - gap);
    next = label.at;
  }
  return labels;
}
