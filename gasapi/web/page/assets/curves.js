// The curves: Z or density over the same pressure axis as the map above them, one curve for each temperature.

import { linear, spread, ticks } from "./axes.js";
import { path, svg } from "./elements.js";
import { Labels } from "./labels.js";
import { LEFT, RIGHT } from "./map.js";
import { brief, shown } from "./numbers.js";

const TOP = 10;
const BOTTOM = 34;
const DASHES = ["8 3", "2 3", "10 3 2 3", "5 5", "1 4", "12 4", "3 2 8 2", "6 2 1 2 1 2"];

/** Draw the curves of a scene into a place and return its scales. */
export function drawCurves(place, scene) {
  const width = scene.width || Math.max(240, place.clientWidth);
  const height = scene.width ? scene.width / 2 : place.clientHeight;
  const { quantity, isotherms, others, ranges } = scene;
  const x = linear(ranges.pressure, [LEFT, width - RIGHT]);
  const y = linear(valueRange(scene), [height - BOTTOM, TOP]);
  const picture = svg("svg", { viewBox: `0 0 ${width} ${height}`, height, "aria-hidden": "true" });
  axes(picture, scene, x, y, width, height);
  const labels = [];
  const inside = [];
  for (const curve of [...isotherms].sort((a, b) => Number(a.here) - Number(b.here))) {
    const drawn = curve.here ? "curve here" : "curve";
    for (const liquid of [false, true]) {
      const points = curve.pressure.map((p, n) => {
        const value = curve[quantity][n];
        return value === null || (curve.region[n] === "liquid") !== liquid ? null : [x(p), y(value)];
      });
      picture.append(svg("path", { class: liquid ? `${drawn} liquid` : drawn, d: path(points) }));
    }
    label(labels, inside, curve, quantity, x, y, `${brief(curve.temperature, 5)} ${scene.units.temperature.sign}`);
  }
  others.forEach((curve, n) => {
    const points = curve.pressure.map((p, i) => (curve[quantity][i] === null ? null : [x(p), y(curve[quantity][i])]));
    picture.append(svg("path", { class: "curve other", "stroke-dasharray": DASHES[n % DASHES.length], d: path(points) }));
  });
  if (others.length) namesOfOthers(picture, others, quantity, x, y, width);
  const names = new Labels(picture, { left: LEFT, right: width, top: TOP, bottom: height - BOTTOM });
  for (const { px, py, words, here } of inside.reverse()) {
    names.write(words, [[px + 5, py + 10], [px - 6, py + 18, "end"]], here ? "" : "quiet", { "font-weight": here ? 600 : 400 });
  }
  for (const { at, words, here } of spread(labels, 15, TOP + 6, height - BOTTOM)) {
    picture.append(svg("text", { class: here ? "" : "quiet", "font-weight": here ? 600 : 400, x: width - RIGHT + 6, y: at + 4 }, words));
  }
  state(picture, scene, x, y, height);
  const cursor = svg("g", { id: "cursor" });
  picture.append(cursor);
  place.replaceChildren(picture);
  return { x, y, cursor, height };
}

/** A curve has its name where its gas ends: at the edge of the picture, or where it condenses. */
function label(labels, inside, curve, quantity, x, y, words) {
  const last = curve[quantity].findLastIndex((value, n) => value !== null && curve.region[n] !== "liquid");
  const end = last >= 0 ? last : curve[quantity].findLastIndex((value) => value !== null);
  if (end < 0) return;
  const [px, py] = [x(curve.pressure[end]), y(curve[quantity][end])];
  if (end >= curve.pressure.length - 3) labels.push({ at: py, words, here: curve.here });
  else inside.push({ px, py, words, here: curve.here });
}

/** Names of other equations stand on their curves, at places that differ so that they do not cover each other. */
function namesOfOthers(picture, others, quantity, x, y, width) {
  const labels = others
    .map((curve, n) => {
      const at = Math.floor(curve.pressure.length * (0.3 + (0.5 * n) / others.length));
      const value = curve[quantity][at];
      return value === null ? null : { at: y(value) - 5, px: x(curve.pressure[at]), words: curve.id };
    })
    .filter(Boolean);
  for (const { at, px, words } of spread(labels, 14, TOP + 8, y(y.low) - 4)) {
    picture.append(svg("text", { class: "other-text halo", x: Math.min(px, width - RIGHT - 90), y: at }, words));
  }
}

function axes(picture, { units, quantity, ranges }, x, y, width, height) {
  for (const value of ticks(...ranges.pressure, width / 110)) {
    picture.append(svg("line", { class: "grid", x1: x(value), x2: x(value), y1: TOP, y2: height - BOTTOM }));
    picture.append(svg("text", { class: "quiet", x: x(value), y: height - BOTTOM + 17, "text-anchor": "middle" }, brief(value, 6)));
  }
  for (const value of ticks(y.low, y.high, height / 55)) {
    picture.append(svg("line", { class: "grid", x1: LEFT, x2: width - RIGHT, y1: y(value), y2: y(value) }));
    picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: y(value) + 4, "text-anchor": "end" }, brief(value, 5)));
  }
  picture.append(svg("rect", { class: "edge", x: LEFT, y: TOP, width: width - LEFT - RIGHT, height: height - TOP - BOTTOM }));
  picture.append(svg("text", { class: "quiet", x: width - RIGHT + 6, y: height - BOTTOM + 17 }, units.pressure.sign));
  const sign = quantity === "density" ? units.density.sign : "Z";
  picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: height - 8, "text-anchor": "end" }, sign));
}

function valueRange({ quantity, isotherms, others, answer }) {
  let low = Infinity;
  let high = -Infinity;
  for (const curve of [...isotherms, ...others]) {
    for (const value of curve[quantity]) {
      if (value === null) continue;
      if (value < low) low = value;
      if (value > high) high = value;
    }
  }
  const here = answer.result[quantity];
  if (here !== null) [low, high] = [Math.min(low, here), Math.max(high, here)];
  if (low > high) return quantity === "density" ? [0, 1] : [0, 1.1];
  const room = Math.max((high - low) * 0.06, Math.abs(high) * 1e-4);
  return [quantity === "density" ? 0 : Math.max(0, low - room), high + room];
}

function state(picture, { answer, quantity, pressure }, x, y, height) {
  const px = x(pressure);
  const value = answer.result[quantity];
  picture.append(svg("line", { class: "level", x1: px, x2: px, y1: 0, y2: height - BOTTOM }));
  if (value !== null) picture.append(svg("circle", { class: "state-mark", cx: px, cy: y(value), r: 6 }));
}

/** Let values be read along the curves by pointer and by keyboard; `say` takes the words. */
export function readable(place, current, say) {
  let sample = null;

  function read(n) {
    const scene = current();
    const curves = scene.isotherms;
    if (!curves?.length || !scene.drawn) return;
    sample = Math.max(0, Math.min(curves[0].pressure.length - 1, n));
    const { x, y, cursor, height } = scene.drawn;
    const pressure = curves[0].pressure[sample];
    cursor.replaceChildren(svg("line", { class: "cursor", x1: x(pressure), x2: x(pressure), y1: TOP, y2: height - BOTTOM }));
    const words = [];
    for (const curve of [...curves].sort((a, b) => Number(b.here) - Number(a.here))) {
      const z = curve.compressibility_factor[sample];
      if (z === null) continue;
      cursor.append(svg("circle", { class: "cursor-dot", cx: x(pressure), cy: y(curve[scene.quantity][sample]), r: 4 }));
      const temperature = `${brief(curve.temperature, 5)} ${scene.units.temperature.sign}`;
      if (curve.here) words.push(`${temperature}: Z ${shown(z, 5)}, ${shown(curve.density[sample], 5)} ${scene.units.density.sign}`);
      else words.push(`${temperature}: ${scene.quantity === "density" ? shown(curve.density[sample], 4) : `Z ${shown(z, 4)}`}`);
    }
    const at = `${brief(pressure, 5)} ${scene.units.pressure.sign}`;
    const said = `At ${at}. ${words.join("; ") || "no number here"}.`;
    place.setAttribute("aria-valuemin", scene.ranges.pressure[0]);
    place.setAttribute("aria-valuemax", scene.ranges.pressure[1]);
    place.setAttribute("aria-valuenow", pressure);
    place.setAttribute("aria-valuetext", said);
    say(said);
  }

  place.addEventListener("pointermove", (event) => {
    const scene = current();
    if (!scene.drawn || !scene.isotherms.length) return;
    const pressure = scene.drawn.x.value(event.clientX - place.getBoundingClientRect().left);
    const [low, high] = scene.ranges.pressure;
    read(Math.round(((pressure - low) / (high - low)) * scene.isotherms[0].pressure.length - 0.5));
  });
  place.addEventListener("keydown", (event) => {
    const scene = current();
    if (!scene.isotherms?.length) return;
    const last = scene.isotherms[0].pressure.length - 1;
    const step = { ArrowLeft: -1, ArrowDown: -1, ArrowRight: 1, ArrowUp: 1, PageUp: 8, PageDown: -8 }[event.key];
    if (event.key === "Home") read(0);
    else if (event.key === "End") read(last);
    else if (step) read((sample ?? Math.floor(last / 2)) + step);
    else return;
    event.preventDefault();
  });
  return () => (sample = null);
}
