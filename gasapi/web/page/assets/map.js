// The map: temperature over pressure, so that the margin to the dew line is a height that can be seen.

import { linear, snapped, ticks } from "./axes.js";
import { path, svg } from "./elements.js";
import { brief } from "./numbers.js";
import { differenceSign, fromSi } from "./units.js";

export const LEFT = 56;
export const RIGHT = 64;
const TOP = 14;
const BOTTOM = 34;

/** Draw the map of a scene into a place and return its scales. */
export function drawMap(place, scene) {
  const width = Math.max(240, place.clientWidth);
  const height = place.clientHeight;
  const x = linear(scene.ranges.pressure, [LEFT, width - RIGHT]);
  const y = linear(scene.ranges.temperature, [height - BOTTOM, TOP]);
  const picture = svg("svg", { viewBox: `0 0 ${width} ${height}`, height, "aria-hidden": "true" });
  picture.append(
    svg("defs", {}, svg("clipPath", { id: "map-inside" }, svg("rect", { x: LEFT, y: TOP, width: width - LEFT - RIGHT, height: height - TOP - BOTTOM }))),
  );
  axes(picture, scene, x, y, width, height);
  const inside = svg("g", { "clip-path": "url(#map-inside)" });
  picture.append(inside);
  range(picture, inside, scene, x, y, width);
  design(picture, inside, scene, x, y);
  boundary(picture, inside, scene, x, y, width, height);
  state(picture, scene, x, y, width, height);
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
  picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: height - BOTTOM + 17, "text-anchor": "end" }, units.temperature.sign));
}

/** The published range of the equation as a frame: only those sides of it that the picture holds. */
function range(picture, inside, { answer, units, ambient }, x, y, width) {
  const validity = answer.model?.validity;
  if (!validity) return;
  const [coldest, warmest] = validity.temperature.map((value) => y(fromSi(value, units.temperature, ambient)));
  const highest = x(fromSi(validity.pressure[1], units.pressure, ambient));
  const lowest = x(fromSi(validity.pressure[0], units.pressure, ambient));
  const far = (value) => Math.max(-1e4, Math.min(1e4, value));
  const [left, right, top, bottom] = [far(lowest), far(highest), far(warmest), far(coldest)];
  inside.append(svg("rect", { class: "range", x: left, y: top, width: Math.max(0, right - left), height: Math.max(0, bottom - top) }));
  const [bottomEdge, topEdge] = [y(y.low), y(y.high)];
  const note = (at, words, anchor, level) =>
    picture.append(svg("text", { class: "range-text halo", x: at, y: level, "text-anchor": anchor }, words));
  if (coldest < bottomEdge - 4 && coldest > topEdge) note(width - RIGHT - 6, "published range begins", "end", coldest - 6);
  if (warmest > topEdge + 4 && warmest < bottomEdge) note(width - RIGHT - 6, "published range ends", "end", warmest + 15);
  if (highest > LEFT && highest < width - RIGHT - 4) note(highest - 6, "published range ends", "end", topEdge + 16);
}

function design(picture, inside, { question }, x, y) {
  const window = question.window;
  if (!window) return;
  const [left, right] = [x(window.pressure_low), x(window.pressure_high)].sort((a, b) => a - b);
  const [top, bottom] = [y(window.temperature_low), y(window.temperature_high)].sort((a, b) => a - b);
  inside.append(svg("rect", { class: "design", x: left, y: top, width: right - left, height: bottom - top }));
  inside.append(svg("text", { class: "design-text halo", x: Math.max(left, LEFT) + 6, y: Math.max(top, TOP) + 16 }, "design window"));
}

function boundary(picture, inside, { boundary: line, margin, units, answer, pressure }, x, y, width, height) {
  if (!line?.pressure?.length) {
    const dew = answer.phase.dew_point_temperature;
    if (dew !== null) inside.append(svg("line", { class: "dew", x1: x(pressure) - 14, x2: x(pressure) + 14, y1: y(dew), y2: y(dew) }));
    return;
  }
  const points = line.pressure.map((value, n) => [x(value), y(line.temperature[n])]);
  const floor = height - BOTTOM;
  inside.append(svg("path", { class: "wet", d: `${path([[points[0][0], floor], ...points, [points.at(-1)[0], floor]])}Z` }));
  const shift = y(0) - y(margin / units.temperature.scale);
  inside.append(svg("path", { class: "near", d: path(points.map(([px, py]) => [px, py - shift])) }));
  inside.append(svg("path", { class: "dew", d: path(points) }));
  const nearest = points.findLast(([px, py]) => px > LEFT + 90 && px < width - RIGHT - 4 && py - shift > TOP + 16 && py - shift < floor - 8);
  if (nearest) {
    const words = `warned within ${brief(margin, 3)} K`;
    inside.append(svg("text", { class: "quiet halo", x: nearest[0] - 6, y: nearest[1] - shift - 7, "text-anchor": "end" }, words));
  }
  for (const point of pointsOf(line)) {
    const [px, py] = [x(point.pressure), y(point.temperature)];
    if (px < LEFT || px > width - RIGHT || py < TOP || py > floor) continue;
    picture.append(svg("circle", { class: "critical", cx: px, cy: py, r: 5 }));
    const right = px > width - RIGHT - 150;
    picture.append(
      svg("text", { class: "dew-text halo", x: px + (right ? -9 : 9), y: py + 15, "text-anchor": right ? "end" : "start" }, point.name),
    );
  }
  const shown = points.filter(([px, py]) => px > LEFT + 30 && px < width - RIGHT - 70 && py > TOP + 20 && py < floor - 24);
  const middle = shown[Math.floor(shown.length / 3)];
  if (middle) picture.append(svg("text", { class: "dew-text halo", x: middle[0] + 10, y: middle[1] + 20 }, "dew line, wet below"));
}

/** Return the named points of a boundary: every member, at any depth, that has a pressure and a temperature of its own. */
function pointsOf(members, name = "") {
  if (members === null || typeof members !== "object") return [];
  if (Number.isFinite(members.pressure) && Number.isFinite(members.temperature)) {
    return [{ ...members, name: String(members.name || members.id || name).replaceAll("_", " ") }];
  }
  return Object.entries(members).flatMap(([inner, member]) => pointsOf(member, inner));
}

function state(picture, { answer, units, pressure, temperature }, x, y, width, height) {
  const [px, py] = [x(pressure), y(temperature)];
  picture.append(svg("line", { class: "level", x1: px, x2: px, y1: TOP, y2: height }));
  const { dew_point_temperature: dew, margin_temperature: margin } = answer.phase;
  if (dew !== null) {
    const end = Math.max(TOP, Math.min(height - BOTTOM, y(dew)));
    picture.append(svg("line", { class: "plumb", x1: px, x2: px, y1: py, y2: end }));
    const words = `${brief(margin, 3)} ${differenceSign(units.temperature)}`;
    const right = px > width - RIGHT - 90;
    picture.append(
      svg("text", { class: "plumb-text halo", x: px + (right ? -8 : 8), y: Math.max(TOP + 12, (py + end) / 2 + 4), "text-anchor": right ? "end" : "start" }, words),
    );
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
