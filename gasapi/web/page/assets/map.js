// The map: temperature over pressure, so that the margin to the dew line is a height that can be seen.

import { linear, snapped, ticks } from "./axes.js";
import { path, svg } from "./elements.js";
import { Labels } from "./labels.js";
import { brief } from "./numbers.js";
import { differenceSign, fromSi } from "./units.js";

export const LEFT = 56;
export const RIGHT = 64;
const TOP = 14;
const BOTTOM = 34;

/** Draw the map of a scene into a place and return its scales. */
export function drawMap(place, scene) {
  const width = scene.width || Math.max(240, place.clientWidth);
  const height = scene.width ? scene.width / 2 : place.clientHeight;
  const x = linear(scene.ranges.pressure, [LEFT, width - RIGHT]);
  const y = linear(scene.ranges.temperature, [height - BOTTOM, TOP]);
  const picture = svg("svg", { viewBox: `0 0 ${width} ${height}`, height, "aria-hidden": "true" });
  picture.append(
    svg("defs", {}, svg("clipPath", { id: "map-inside" }, svg("rect", { x: LEFT, y: TOP, width: width - LEFT - RIGHT, height: height - TOP - BOTTOM }))),
  );
  axes(picture, scene, x, y, width, height);
  const inside = svg("g", { "clip-path": "url(#map-inside)" });
  picture.append(inside);
  const labels = new Labels(picture, { left: LEFT + 2, right: width - RIGHT - 2, top: TOP + 1, bottom: height - BOTTOM - 1 });
  const [px, py] = [x(scene.pressure), y(scene.temperature)];
  labels.keep(px - 11, py - 18, px + 11, py + 2);
  range(inside, scene, x, y);
  design(inside, scene, x, y);
  boundary(inside, scene, x, y);
  state(picture, labels, scene, x, y, height);
  named(labels, picture, scene, x, y);
  place.replaceChildren(picture);
  return { x, y };
}

function axes(picture, { units, ranges }, x, y, width, height) {
  for (const value of ticks(...ranges.pressure, width / 110)) {
    picture.append(svg("line", { class: "grid", x1: x(value), x2: x(value), y1: TOP, y2: height - BOTTOM }));
    picture.append(svg("text", { class: "quiet", x: x(value), y: height - BOTTOM + 17, "text-anchor": "middle" }, brief(value, 6)));
  }
  for (const value of ticks(...ranges.temperature, height / 60)) {
    picture.append(svg("line", { class: "grid", x1: LEFT, x2: width - RIGHT, y1: y(value), y2: y(value) }));
    picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: y(value) + 4, "text-anchor": "end" }, brief(value, 6)));
  }
  picture.append(svg("rect", { class: "edge", x: LEFT, y: TOP, width: width - LEFT - RIGHT, height: height - TOP - BOTTOM }));
  picture.append(svg("text", { class: "quiet", x: width - RIGHT + 6, y: height - BOTTOM + 17 }, units.pressure.sign));
  picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: height - 8, "text-anchor": "end" }, units.temperature.sign));
}

/** The published range of the equation as a frame: only those sides of it that the picture holds. */
function range(inside, { answer, units, ambient }, x, y) {
  const validity = answer.model?.validity;
  if (!validity) return;
  const far = (value) => Math.max(-1e4, Math.min(1e4, value));
  const [bottom, top] = validity.temperature.map((value) => far(y(fromSi(value, units.temperature, ambient))));
  const [left, right] = validity.pressure.map((value) => far(x(fromSi(value, units.pressure, ambient))));
  inside.append(svg("rect", { class: "range", x: left, y: top, width: Math.max(0, right - left), height: Math.max(0, bottom - top) }));
}

function design(inside, { question }, x, y) {
  const window = question.window;
  if (!window) return;
  const [left, right] = [x(window.pressure_low), x(window.pressure_high)].sort((a, b) => a - b);
  const [top, bottom] = [y(window.temperature_low), y(window.temperature_high)].sort((a, b) => a - b);
  inside.append(svg("rect", { class: "design", x: left, y: top, width: right - left, height: bottom - top }));
}

function boundary(inside, { boundary: line, margin, units, answer, pressure }, x, y) {
  if (!line?.pressure?.length) {
    const dew = answer.phase.dew_point_temperature;
    if (dew !== null) inside.append(svg("line", { class: "dew", x1: x(pressure) - 14, x2: x(pressure) + 14, y1: y(dew), y2: y(dew) }));
    return;
  }
  const points = line.pressure.map((value, n) => [x(value), y(line.temperature[n])]);
  const floor = y(y.low);
  inside.append(svg("path", { class: "wet", d: `${path([[points[0][0], floor], ...points, [points.at(-1)[0], floor]])}Z` }));
  inside.append(svg("path", { class: "near", d: path(points.map(([px, py]) => [px, py - marginHeight(y, margin, units)])) }));
  inside.append(svg("path", { class: "dew", d: path(points) }));
}

function marginHeight(y, margin, units) {
  return y(0) - y(margin / units.temperature.scale);
}

/** Say what the lines are, the most telling words first, each where there is room. */
function named(labels, picture, scene, x, y) {
  const { boundary: line, margin, units, ambient, answer, question } = scene;
  const { left, right, top, bottom } = labels.inside;
  if (question.window) {
    const at = [Math.max(left, Math.min(x(question.window.pressure_low), x(question.window.pressure_high))) + 6, Math.max(top, Math.min(y(question.window.temperature_low), y(question.window.temperature_high))) + 16];
    labels.write("design window", [at, [at[0], at[1] + 18]], "design-text");
  }
  if (line?.pressure?.length) {
    const points = line.pressure.map((value, n) => [x(value), y(line.temperature[n])]);
    for (const point of pointsOf(line)) {
      const [px, py] = [x(point.pressure), y(point.temperature)];
      if (px < left || px > right || py < top || py > bottom) continue;
      picture.append(svg("circle", { class: "critical", cx: px, cy: py, r: 5 }));
      labels.write(point.name, [[px + 9, py + 17], [px - 9, py + 17, "end"], [px + 9, py - 9], [px - 9, py - 9, "end"]], "dew-text");
    }
    const shown = points.filter(([px, py]) => px > left && px < right && py > top && py < bottom);
    const along = [0.35, 0.5, 0.2, 0.65, 0.8].map((share) => shown[Math.floor(shown.length * share)]).filter(Boolean);
    if (!shown.length) labels.write("the dew line lies outside this view", [[left + 8, bottom - 8]], "quiet");
    const below = along.map(([px, py]) => [px + 8, py + 22]);
    if (!labels.write("dew line, wet below", below, "dew-text")) labels.write("dew line", below, "dew-text");
    const shift = marginHeight(y, margin, units);
    if (shown.length) labels.write(`warned within ${brief(margin, 3)} K`, along.map(([px, py]) => [px - 8, py - shift - 8, "end"]), "quiet");
  }
  const validity = answer.model?.validity;
  if (!validity) return;
  const [coldest, warmest] = validity.temperature.map((value) => y(fromSi(value, units.temperature, ambient)));
  const highest = x(fromSi(validity.pressure[1], units.pressure, ambient));
  if (coldest < bottom && coldest > top) labels.write("published range begins", [[right - 6, coldest - 6, "end"], [left + 6, coldest - 6]], "range-text");
  if (warmest < bottom && warmest > top) labels.write("published range ends", [[right - 6, warmest + 16, "end"], [left + 6, warmest + 16]], "range-text");
  if (highest > left && highest < right) labels.write("published range ends", [[highest - 6, top + 16, "end"], [highest - 6, bottom - 8, "end"]], "range-text");
}

/** Return the named points of a boundary: every member, at any depth, that has a pressure and a temperature of its own. */
function pointsOf(members, name = "") {
  if (members === null || typeof members !== "object") return [];
  if (Number.isFinite(members.pressure) && Number.isFinite(members.temperature)) {
    return [{ ...members, name: String(members.name || members.id || name).replaceAll("_", " ") }];
  }
  return Object.entries(members).flatMap(([inner, member]) => pointsOf(member, inner));
}

function state(picture, labels, { answer, units, pressure, temperature }, x, y, height) {
  const [px, py] = [x(pressure), y(temperature)];
  const { top, bottom } = labels.inside;
  for (const [from, to] of [[TOP, height - BOTTOM], [height - 12, height]]) picture.append(svg("line", { class: "level", x1: px, x2: px, y1: from, y2: to }));
  const { dew_point_temperature: dew, margin_temperature: margin } = answer.phase;
  if (dew !== null) {
    const end = Math.max(top, Math.min(bottom, y(dew)));
    picture.append(svg("line", { class: "plumb", x1: px, x2: px, y1: py, y2: end }));
    const middle = (py + end) / 2 + 5;
    const words = `${brief(margin, 3)} ${differenceSign(units.temperature)}`;
    labels.write(words, [[px + 12, middle], [px - 12, middle, "end"], [px + 12, py - 8], [px - 12, py - 8, "end"]], "plumb-text");
  }
  // a pointer whose tip stands on the state, as on a level gauge
  const mark = svg("path", { class: "state-mark", d: `M${px} ${py}l-9 -16h18z` });
  const handle = svg("circle", { id: "handle", cx: px, cy: py - 6, r: 26, fill: "transparent" });
  picture.append(mark, handle);
}

/** Let the state be moved on the map by pointer and by keyboard; `move` takes pressure and temperature. */
export function movable(place, current, move) {
  let dragged = null;

  function moveTo(event) {
    const { x, y } = current().scales;
    const box = place.getBoundingClientRect();
    const fine = (scale, from, to) => 10 ** Math.floor(Math.log10(Math.abs(scale.value(to) - scale.value(from))));
    const at = (scale, value) => Math.min(scale.high, Math.max(scale.low, value));
    const pressure = snapped(at(x, x.value(event.clientX - box.left)), fine(x, 0, 4));
    const temperature = snapped(at(y, y.value(event.clientY - box.top)), fine(y, 4, 0));
    move(pressure, temperature);
  }

  place.addEventListener("pointerdown", (event) => {
    const mine = event.pointerType === "mouse" ? event.button === 0 : event.target.id === "handle";
    if (!mine || !current().scales) return;
    dragged = event.pointerId;
    place.setPointerCapture(dragged);
    moveTo(event);
  });
  place.addEventListener("pointermove", (event) => event.pointerId === dragged && moveTo(event));
  for (const name of ["pointerup", "pointercancel"]) place.addEventListener(name, () => (dragged = null));
  place.addEventListener("click", (event) => event.pointerType === "touch" && current().scales && moveTo(event));

  place.addEventListener("keydown", (event) => {
    const [right, up] = { ArrowRight: [1, 0], ArrowLeft: [-1, 0], ArrowUp: [0, 1], ArrowDown: [0, -1] }[event.key] || [];
    const scene = current();
    if (right === undefined || !scene.scales) return;
    event.preventDefault();
    const steps = event.shiftKey ? 10 : 1;
    const step = (scale) => 10 ** Math.floor(Math.log10((scale.high - scale.low) / 40));
    const { x, y } = scene.scales;
    move(
      snapped(scene.pressure + right * steps * step(x), step(x) / 1000),
      snapped(scene.temperature + up * steps * step(y), step(y) / 1000),
    );
  });
  return () => dragged !== null;
}
