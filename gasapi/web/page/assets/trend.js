// Density and Z over the rows of a history, and three lanes below that say which rows are good, uncertain and bad.

import { linear, ticks } from "./axes.js";
import { path, svg } from "./elements.js";
import { brief, shown } from "./numbers.js";

const LEVELS = ["good", "uncertain", "bad"];
const LEFT = 76;
const RIGHT = 14;
const LANE = 15;

/** What is drawn of a history: numbers and levels by row. */
export class Trend {
  constructor(rows) {
    this.density = new Float64Array(rows);
    this.factor = new Float64Array(rows);
    this.level = new Uint8Array(rows);
    this.rows = rows;
    this.length = 0;
    this.times = new Map();
    this.counts = { good: 0, uncertain: 0, bad: 0 };
  }

  /** Add a row; the two highest bits of an OPC UA status code are its severity. */
  add(density, factor, status, time) {
    const n = this.length;
    if (n >= this.rows) return;
    const level = Math.min(2, Math.floor(status / 0x40000000));
    this.density[n] = density;
    this.factor[n] = factor;
    this.level[n] = level;
    this.counts[LEVELS[level]] += 1;
    if (n === 0 || n === this.rows - 1 || n === Math.floor(this.rows / 2)) this.times.set(n, time);
    this.length = n + 1;
  }
}

/** Draw a trend into a place. */
export function drawTrend(place, trend, densitySign) {
  const width = Math.max(260, place.clientWidth);
  const height = place.clientHeight || 360;
  const x = linear([-0.5, trend.rows - 0.5], [LEFT, width - RIGHT]);
  const lanes = height - 3 * LANE - 26;
  const middle = lanes * 0.6;
  const columns = columnsOf(trend, Math.floor(width - LEFT - RIGHT));
  const picture = svg("svg", { viewBox: `0 0 ${width} ${height}`, height, "aria-hidden": "true" });
  trace(picture, columns, "density", x, [middle - 14, 10], width, `density, ${densitySign}`);
  trace(picture, columns, "factor", x, [lanes - 10, middle + 6], width, "Z");
  LEVELS.forEach((level, n) => {
    const y = lanes + n * LANE;
    picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: y + 11, "text-anchor": "end" }, level));
    picture.append(svg("line", { class: "grid", x1: LEFT, x2: width - RIGHT, y1: y + LANE - 2, y2: y + LANE - 2 }));
    let d = "";
    for (const column of columns) if (column.levels[n]) d += `M${column.left.toFixed(1)} ${y}h${Math.max(1.5, column.width).toFixed(1)}v${LANE - 4}h-${Math.max(1.5, column.width).toFixed(1)}z`;
    picture.append(svg("path", { class: `lane-${level}`, d }));
  });
  for (const [row, time] of trend.times) {
    const anchor = row === 0 ? "start" : row === trend.rows - 1 ? "end" : "middle";
    if (anchor === "middle" && (width < 640 || trend.rows < 3)) continue;
    picture.append(svg("text", { class: "quiet", x: x(row), y: height - 4, "text-anchor": anchor }, time || `row ${row + 1}`));
  }
  place.replaceChildren(picture);
}

function trace(picture, columns, name, x, range, width, words) {
  let [low, high] = [Infinity, -Infinity];
  for (const column of columns) {
    if (column[name].low < low) low = column[name].low;
    if (column[name].high > high) high = column[name].high;
  }
  if (low > high) return;
  const room = (high - low || Math.abs(high) || 1) * 0.05;
  const y = linear([low - room, high + room], range);
  for (const value of ticks(y.low, y.high, Math.abs(range[0] - range[1]) / 30)) {
    picture.append(svg("line", { class: "grid", x1: LEFT, x2: width - RIGHT, y1: y(value), y2: y(value) }));
    picture.append(svg("text", { class: "quiet", x: LEFT - 7, y: y(value) + 4, "text-anchor": "end" }, brief(value, 5)));
  }
  for (const [level, points] of pointsByLevel(columns, name, y)) {
    picture.append(svg("path", { class: `trace trace-${level}`, d: path(points) }));
    // a row with a number between rows without one would be a line of no length: a dot lets it be seen
    points.forEach((point, n) => {
      if (point && !points[n - 1] && !points[n + 1]) picture.append(svg("circle", { class: `lane-${level}`, cx: point[0], cy: point[1], r: 3 }));
    });
  }
  picture.append(svg("text", { class: "halo", x: LEFT + 6, y: range[1] + 12, "font-weight": 600 }, words));
}

/** Return the points of each level: those of uncertain rows are joined to their neighbours, so that no gap hides a step. */
function pointsByLevel(columns, name, y) {
  const found = new Map(LEVELS.slice(0, 2).map((level) => [level, []]));
  let before = null;
  for (const column of columns) {
    const { low, high } = column[name];
    const level = low > high ? null : column.levels[1] ? "uncertain" : "good";
    const points = level === null ? [] : low === high ? [[column.x, y(low)]] : [[column.x, y(low)], [column.x, y(high)]];
    for (const [one, line] of found) {
      if (one !== level) line.push(null);
      else if (before && before.level !== level) line.push(before.last, ...points);
      else line.push(...points);
    }
    before = level === null ? null : { level, last: points.at(-1) };
  }
  return found;
}

/** Let rows be read by pointer and by keyboard; `say` takes the words. */
export function readableTrend(place, current, say) {
  let row = 0;

  function read(wanted) {
    const { trend, sign } = current();
    row = Math.max(0, Math.min(trend.length - 1, wanted));
    const value = (number, unit) => (Number.isNaN(number) ? "no number" : `${shown(number, 5)}${unit}`);
    const words = `Row ${row + 1}: density ${value(trend.density[row], ` ${sign}`)}, Z ${value(trend.factor[row], "")}, ${LEVELS[trend.level[row]]}.`;
    place.setAttribute("aria-valuemin", 1);
    place.setAttribute("aria-valuemax", trend.length);
    place.setAttribute("aria-valuenow", row + 1);
    place.setAttribute("aria-valuetext", words);
    say(words);
  }

  place.addEventListener("pointermove", (event) => {
    const { trend } = current();
    if (!trend?.length) return;
    const box = place.getBoundingClientRect();
    read(Math.floor(((event.clientX - box.left - LEFT) / (box.width - LEFT - RIGHT)) * trend.rows));
  });
  place.addEventListener("keydown", (event) => {
    const { trend } = current();
    if (!trend?.length) return;
    const page = Math.max(1, Math.round(trend.rows / 20));
    const to = { ArrowLeft: row - 1, ArrowDown: row - 1, ArrowRight: row + 1, ArrowUp: row + 1, PageUp: row + page, PageDown: row - page, Home: 0, End: trend.length }[event.key];
    if (to === undefined) return;
    event.preventDefault();
    read(to);
  });
}

/** Return for every column of pixels the lowest and highest values of its rows, and the levels among them. */
function columnsOf(trend, width) {
  const count = Math.min(trend.rows, Math.max(1, width));
  const columns = [];
  for (let n = 0; n < count; n += 1) {
    const from = Math.floor((n * trend.rows) / count);
    const to = Math.min(trend.length, Math.floor(((n + 1) * trend.rows) / count));
    if (from >= to) break;
    const column = { x: LEFT + ((n + 0.5) * width) / count, left: LEFT + (n * width) / count, width: width / count, levels: [false, false, false], density: bounds(trend.density, from, to), factor: bounds(trend.factor, from, to) };
    for (let row = from; row < to; row += 1) column.levels[trend.level[row]] = true;
    columns.push(column);
  }
  return columns;
}

function bounds(values, from, to) {
  let [low, high] = [Infinity, -Infinity];
  for (let n = from; n < to; n += 1) {
    if (values[n] < low) low = values[n];
    if (values[n] > high) high = values[n];
  }
  return { low, high };
}
