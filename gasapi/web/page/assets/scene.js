// What the picture shows: the ranges of its axes, and the numbers of the service that fill it.

import { roundStep, snapped } from "./axes.js";
import { post } from "./service.js";
import { fromSi, toSi } from "./units.js";

const CURVE_POINTS = 64;
const boundaries = new Map();

/** Return the members of a question that every call about the same line repeats. */
export function commonOf(body) {
  const { gas, units, ambient_pressure } = body;
  return { gas, units, ...(ambient_pressure === undefined ? {} : { ambient_pressure }) };
}

/** Return the dew or saturation boundary in the units of the question; null where the service has none for this gas. */
export async function boundaryOf(question) {
  const asked = commonOf(question.body);
  const key = JSON.stringify(asked);
  if (!boundaries.has(key)) {
    if (boundaries.size > 20) boundaries.clear();
    const found = post("v1/phase-boundary", asked).then(
      ({ result }) => result,
      (refusal) => {
        if (refusal.status !== 422 && refusal.status !== 404) boundaries.delete(key);
        return null;
      },
    );
    boundaries.set(key, found);
  }
  return boundaries.get(key);
}

/** Return the ranges of the axes for a state, the earlier ones where they still show it well. */
export function rangesFor({ pressure, temperature, answer, units, ambient, boundary, view, earlier }) {
  const zero = fromSi(0, units.pressure, ambient);
  const coldest = fromSi(1, units.temperature, ambient);
  if (view === "whole" && boundary?.temperature?.length) return wholeRanges({ pressure, temperature, boundary, zero, coldest });
  if (earlier?.view === "near" && holds(earlier.pressure, pressure) && holds(earlier.temperature, temperature)) return earlier;
  const absolute = pressure - zero;
  const step = roundStep(absolute / 4);
  const high = zero + Math.ceil((1.6 * absolute) / step) * step;
  const kelvin = 1 / units.temperature.scale;
  const dew = answer.phase.dew_point_temperature;
  const gap = dew === null ? 0 : temperature - dew;
  const reach = Math.max(40 * kelvin, Math.min(Math.abs(gap), 120 * kelvin) * 1.3);
  const low = Math.max(coldest, temperature - reach);
  return { view, pressure: [zero, high], temperature: [low, temperature + reach] };
}

function holds([low, high], value) {
  const place = (value - low) / (high - low);
  return place > 0.08 && place < 0.92;
}

function wholeRanges({ pressure, temperature, boundary, zero, coldest }) {
  const highest = Math.max(...boundary.pressure, pressure) - zero;
  const temperatures = [...boundary.temperature, temperature];
  const [low, high] = [Math.min(...temperatures), Math.max(...temperatures)];
  return {
    view: "whole",
    pressure: [zero, zero + 1.15 * highest],
    temperature: [Math.max(coldest, low - 0.08 * (high - low)), high + 0.12 * (high - low)],
  };
}

/** Return isotherms of the answer's own equation: the one of the state, two warmer and two colder ones. */
export async function isothermsOf({ question, answer, temperature, ranges, units, ambient, signal }) {
  if (!answer.model) return [];
  const step = snapStep((ranges.temperature[1] - ranges.temperature[0]) / 6);
  const coldest = toSi(temperature, units.temperature, ambient);
  const steps = [-2, -1, 0, 1, 2].filter((n) => coldest + n * step * units.temperature.scale > 1);
  const pressures = pressuresOf(ranges);
  const wanted = steps.map((n) => ({ temperature: Number((temperature + n * step).toPrecision(12)), here: n === 0 }));
  const answered = await post(
    "v1/series",
    {
      ...commonOf(question.body),
      model: answer.model.id,
      pressure: wanted.flatMap(() => pressures),
      temperature: wanted.flatMap((curve) => pressures.map(() => curve.temperature)),
    },
    { signal },
  );
  return wanted.map((curve, n) => ({ ...curve, ...cut(answered, n * pressures.length, pressures) }));
}

/** Return the curves of other equations at the temperature of the state. */
export async function othersOf({ question, answer, temperature, ranges, models, signal }) {
  const pressures = pressuresOf(ranges);
  const others = models.filter((model) => model.id !== answer.model?.id);
  const answers = await Promise.all(
    others.map((model) =>
      post("v1/series", { ...commonOf(question.body), model: model.id, pressure: pressures, temperature }, { signal }).catch((error) => {
        if (error.name === "AbortError") throw error;
        return null;
      }),
    ),
  );
  return others.map((model, n) => (answers[n] ? { id: model.id, ...cut(answers[n], 0, pressures) } : null)).filter(Boolean);
}

function cut({ result, phase }, from, pressures) {
  const to = from + pressures.length;
  return {
    pressure: pressures,
    compressibility_factor: result.compressibility_factor.slice(from, to),
    density: result.density.slice(from, to),
    region: phase.region.slice(from, to),
  };
}

function pressuresOf({ pressure: [low, high] }) {
  const width = high - low;
  return Array.from({ length: CURVE_POINTS }, (_, n) => Number((low + (width * (n + 0.5)) / CURVE_POINTS).toPrecision(7)));
}

function snapStep(size) {
  return snapped(roundStep(size * 0.75), 1e-9);
}
