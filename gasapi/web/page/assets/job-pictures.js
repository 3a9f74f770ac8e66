// Pictures of the jobs: a correction over density, a loss with its uncertainty, a density over a share, a table's errors.

import { linear, ticks } from "./axes.js";
import { html, path, svg } from "./elements.js";
import { brief, percent } from "./numbers.js";
import { post } from "./service.js";
import { signOf } from "./units.js";

const HEIGHT = 320;
const BOX = { left: 72, right: 20, top: 28, bottom: 46 };

/** An empty picture with two axes and their words. */
function frame(place, words, across, up, label) {
  const width = Math.max(260, Math.min(900, place.clientWidth));
  const x = linear(across, [BOX.left, width - BOX.right]);
  const y = linear(up, [HEIGHT - BOX.bottom, BOX.top]);
  const picture = svg("svg", { viewBox: `0 0 ${width} ${HEIGHT}`, width, height: HEIGHT, role: "img", "aria-label": label });
  for (const value of ticks(...across, width / 110)) {
    picture.append(svg("line", { class: "grid", x1: x(value), x2: x(value), y1: BOX.top, y2: HEIGHT - BOX.bottom }));
    picture.append(svg("text", { class: "quiet", x: x(value), y: HEIGHT - BOX.bottom + 17, "text-anchor": "middle" }, brief(value, 5)));
  }
  for (const value of ticks(...up, 6)) {
    picture.append(svg("line", { class: "grid", x1: BOX.left, x2: width - BOX.right, y1: y(value), y2: y(value) }));
    picture.append(svg("text", { class: "quiet", x: BOX.left - 7, y: y(value) + 4, "text-anchor": "end" }, brief(value, 4)));
  }
  picture.append(svg("rect", { class: "edge", x: BOX.left, y: BOX.top, width: width - BOX.left - BOX.right, height: HEIGHT - BOX.top - BOX.bottom }));
  picture.append(svg("text", { class: "quiet", x: width - BOX.right, y: HEIGHT - 8, "text-anchor": "end" }, words[0]));
  picture.append(svg("text", { class: "quiet", x: BOX.left, y: BOX.top - 9 }, words[1]));
  place.replaceChildren(html("figure", { class: "panel" }, html("figcaption", {}, label), picture));
  return { picture, x, y, width };
}

/** The correction factor over the density that the meter meets, with the design density where it is 1. */
export function meterPicture(place, { result, units }, context, body) {
  if (result.correction_factor === undefined || result.correction_factor === null) return;
  const design = body.meter.design_density;
  const power = body.meter.principle === "volumetric" ? 1 : 0.5;
  const here = design * result.correction_factor ** (1 / power);
  const high = 1.3 * Math.max(design, here);
  const { picture, x, y } = frame(
    place,
    [`density, ${signOf(units.density)}`, "multiply by"],
    [0, high],
    [0, 1.05 * (high / design) ** power],
    "The correction over the density that flows through the meter",
  );
  const points = Array.from({ length: 81 }, (_, n) => (high * n) / 80).map((density) => [x(density), y((density / design) ** power)]);
  picture.append(svg("path", { class: "curve here", d: path(points) }));
  picture.append(svg("circle", { class: "critical", cx: x(design), cy: y(1), r: 5 }));
  picture.append(svg("text", { class: "dew-text halo", x: x(design) + 9, y: y(1) + 18 }, "design"));
  picture.append(svg("circle", { class: "state-mark", cx: x(here), cy: y(result.correction_factor), r: 6 }));
  picture.append(svg("text", { class: "plumb-text halo", x: x(here) + 9, y: y(result.correction_factor) - 8 }, "now"));
}

/** The loss over the time of the test, with its uncertainty at the end and the line of no loss. */
export function leakPicture(place, { result, units }, context, body) {
  if (result.lost_mass === null) return;
  const doubt = result.lost_mass_expanded_uncertainty || 0;
  const [low, high] = [Math.min(0, result.lost_mass - doubt), Math.max(0, result.lost_mass + doubt)];
  const room = (high - low || 1) * 0.12;
  const { picture, x, y } = frame(
    place,
    [`time, ${signOf(units.duration)}`, `lost, ${signOf(units.mass)}`],
    [0, body.duration],
    [low - room, high + room],
    "Lost mass over the test, with the uncertainty (k = 2) of the difference of the readings",
  );
  const end = x(body.duration);
  picture.append(svg("path", { class: "bandfill", d: `${path([[x(0), y(-doubt)], [x(0), y(doubt)], [end, y(result.lost_mass + doubt)], [end, y(result.lost_mass - doubt)]])}Z` }));
  picture.append(svg("line", { class: "edge", x1: x(0), x2: end, y1: y(0), y2: y(0), "stroke-dasharray": "6 4" }));
  picture.append(svg("path", { class: "curve here", d: path([[x(0), y(0)], [end, y(result.lost_mass)]]) }));
  picture.append(svg("line", { class: "plumb", x1: end - 2, x2: end - 2, y1: y(result.lost_mass - doubt), y2: y(result.lost_mass + doubt) }));
  const middle = (x(0) + end) / 2;
  picture.append(svg("text", { class: "quiet halo", x: middle, y: y(0) - 6, "text-anchor": "middle" }, "no loss"));
}

/** The density of all mixtures of the two gases, and where the reading meets them. */
export async function sharePicture(place, { result, units }, { signal }, body) {
  const shares = Array.from({ length: 11 }, (_, n) => n / 10);
  const [first, second] = body.gases;
  const { gases, density, ...rest } = body;
  const series = await post(
    "v1/series",
    {
      ...rest,
      gas: { fractions: { [first]: shares, [second]: shares.map((value) => 1 - value) } },
      pressure: shares.map(() => body.pressure),
      temperature: body.temperature,
    },
    { signal },
  );
  const densities = series.result.density;
  const known = densities.filter((value) => value !== null);
  if (!known.length) return;
  const { picture, x, y } = frame(
    place,
    [`share of ${first}`, `density, ${signOf(units.density)}`],
    [0, 1],
    [0, 1.1 * Math.max(...known, density)],
    `Density of mixtures of ${first} and ${second} at this state`,
  );
  picture.append(svg("path", { class: "curve here", d: path(shares.map((share, n) => (densities[n] === null ? null : [x(share), y(densities[n])]))) }));
  picture.append(svg("line", { class: "level", x1: x(0), x2: x(1), y1: y(density), y2: y(density) }));
  picture.append(svg("text", { class: "plumb-text halo", x: x(1) - 6, y: y(density) - 6, "text-anchor": "end" }, "the reading"));
  if (result.mole_fraction !== null) picture.append(svg("circle", { class: "state-mark", cx: x(result.mole_fraction), cy: y(density), r: 6 }));
}

/** Where in its range a table errs, and how much: the equation asked again in the middle of cells. */
export async function errorMap(place, { result, model }, { line, units, signal }, body) {
  const [p, t] = [middles(result.pressure), middles(result.temperature)];
  const pressures = t.flatMap(() => p.map((cell) => cell.middle));
  const temperatures = t.flatMap((cell) => p.map(() => cell.middle));
  const exact = await post("v1/series", { ...line, model: model.id, pressure: pressures, temperature: temperatures }, { signal });
  const truth = exact.result[body.property];
  const errors = truth.map((value, n) => {
    const [i, j] = [p[n % p.length].from, t[Math.floor(n / p.length)].from];
    const [a, b] = [result.values[i], result.values[i + 1]];
    return value === null ? 0 : Math.abs((a[j] + a[j + 1] + b[j] + b[j + 1]) / 4 / value - 1);
  });
  const most = Math.max(body.tolerance, ...errors);
  const { picture, x, y } = frame(
    place,
    [`pressure, ${units.pressure.sign}`, `temperature, ${units.temperature.sign}`],
    [result.pressure[0], result.pressure.at(-1)],
    [result.temperature[0], result.temperature.at(-1)],
    `Error in the middle of every cell, up to ${percent(Math.max(...errors), 2)}: the fuller a cell, the nearer to the tolerance of ${percent(body.tolerance, 2)}`,
  );
  picture.classList.add("heat");
  errors.forEach((error, n) => {
    const [cellP, cellT] = [p[n % p.length], t[Math.floor(n / p.length)]];
    const [left, right] = [x(cellP.low), x(cellP.high)];
    const [bottom, top] = [y(cellT.low), y(cellT.high)];
    // the area that is filled says the error, not a colour
    const filled = Math.sqrt(error / most);
    const [width, height] = [(right - left) * filled, (bottom - top) * filled];
    picture.append(svg("rect", { class: "cell", x: (left + right - width) / 2, y: (top + bottom - height) / 2, width, height }, svg("title", {}, percent(error, 2))));
  });
}

/** Return the cells of an axis, thinned where there are more than a picture can hold. */
function middles(axis) {
  const cells = axis.slice(0, -1).map((low, from) => ({ from, low, high: axis[from + 1], middle: (low + axis[from + 1]) / 2 }));
  const every = Math.ceil(cells.length / 48);
  return cells.filter((_, n) => n % every === 0);
}
