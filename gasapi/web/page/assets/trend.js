// Density and Z over the rows of a history, and three lanes below that say which rows are good, uncertain and bad.

import { linear, ticks } from "./axes.js";
import { path, svg } from "./elements.js";
import { brief } from "./numbers.js";

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
  const x = linear([0, Math.max(1, trend.rows - 1)], [LEFT, width - RIGHT]);
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
    for (const column of columns) if (column.levels[n]) d += `M${column.x.toFixed(1)} ${y}h${Math.max(1.5, column.width).toFixed(1)}v${LANE - 4}h-${Math.max(1.5, column.width).toFixed(1)}z`;
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
  const points = columns.flatMap((column) => {
    const { low: from, high: to } = column[name];
    if (from > to) return [null];
    return from === to ? [[column.x, y(from)]] : [[column.x, y(from)], [column.x, y(to)]];
  });
  picture.append(svg("path", { class: "trace", d: path(points) }));
  // a row with a number between rows without one is a line of no length: a dot lets it be seen
  points.forEach((point, n) => {
    if (point && !points[n - 1] && !points[n + 1]) picture.append(svg("circle", { cx: point[0], cy: point[1], r: 2, fill: "currentColor" }));
  });
  picture.append(svg("text", { class: "halo", x: LEFT + 6, y: range[1] + 12, "font-weight": 600 }, words));
}

/** Return for every column of pixels the lowest and highest values of its rows, and the levels among them. */
function columnsOf(trend, width) {
  const count = Math.min(trend.rows, Math.max(1, width));
  const columns = [];
  for (let n = 0; n < count; n += 1) {
    const from = Math.floor((n * trend.rows) / count);
    const to = Math.min(trend.length, Math.floor(((n + 1) * trend.rows) / count));
    if (from >= to) break;
    const column = { x: LEFT + (n * width) / count, width: width / count, levels: [false, false, false], density: bounds(trend.density, from, to), factor: bounds(trend.factor, from, to) };
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
