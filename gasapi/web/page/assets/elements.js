// Elements of the page and of its pictures, made without markup in strings.

const SVG = "http://www.w3.org/2000/svg";

/** Return an HTML element. Attributes that are false or null are left out. */
export function html(name, attributes = {}, ...children) {
  return filled(document.createElement(name), attributes, children);
}

/** Return an SVG element. */
export function svg(name, attributes = {}, ...children) {
  return filled(document.createElementNS(SVG, name), attributes, children);
}

function filled(element, attributes, children) {
  for (const [name, value] of Object.entries(attributes)) {
    if (value !== false && value !== null && value !== undefined) element.setAttribute(name, value === true ? "" : value);
  }
  element.append(...children.flat().filter((child) => child !== null && child !== undefined));
  return element;
}

/** Return a path through points of the picture; a null breaks it. */
export function path(points) {
  let start = true;
  let text = "";
  for (const point of points) {
    if (point === null) start = true;
    else {
      text += `${start ? "M" : "L"}${point[0].toFixed(1)} ${point[1].toFixed(1)}`;
      start = false;
    }
  }
  return text;
}

/** The mark of a quality: a full disc, a half disc, a crossed ring. The shape says it, the colour repeats it. */
export function qualityMark(level) {
  const mark = svg("svg", { viewBox: "0 0 20 20", "aria-hidden": "true", class: "mark" });
  const ring = { cx: 10, cy: 10, r: 8, fill: level === "good" ? "currentColor" : "none", stroke: "currentColor", "stroke-width": 2.5 };
  mark.append(svg("circle", ring));
  if (level === "uncertain") mark.append(svg("path", { d: "M10 2a8 8 0 0 1 0 16z", fill: "currentColor" }));
  if (level === "bad") mark.append(svg("path", { d: "M4.500 4.500l11 11M15.500 4.500l-11 11", stroke: "currentColor", "stroke-width": 2.5 }));
  return mark;
}
