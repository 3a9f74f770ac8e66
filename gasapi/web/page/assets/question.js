// The question: the form is where it stands, the address bar repeats it, the interface takes it.

import { parsed } from "./numbers.js";

const NUMBERS = [
  "pressure",
  "temperature",
  "ambient_pressure",
  "dew_point_margin",
  "input_uncertainty.pressure",
  "input_uncertainty.temperature",
];
const WINDOW = ["window.pressure_low", "window.pressure_high", "window.temperature_low", "window.temperature_high"];
const SI = [
  ["pressure", "Pa"],
  ["temperature", "K"],
];
const DEFAULTS = { model: "auto", basis: "mole", fraction_unit: "1", density_unit: "kg/m3" };

/** What the page itself cannot read as a question; `name` is the field. */
export class Unreadable extends Error {
  constructor(name, message) {
    super(message);
    this.name = "Unreadable";
    this.field = name;
  }
}

/**
 * Return what the form asks: `body` for the interface, `query` for its GET form, `page` for the address bar, `window` as
 * numbers or null, and `gasKey`, a text that is the same for the same gas.
 */
export function questionOf(form) {
  const body = {};
  const query = new URLSearchParams();
  const page = new URLSearchParams();
  const window = {};
  for (const [name, raw] of new FormData(form)) {
    const text = raw.trim();
    if (text === "" && name !== "pressure" && name !== "temperature" && name !== "gas") continue;
    if (text === DEFAULTS[name]) continue;
    if (WINDOW.includes(name)) {
      window[name.slice(7)] = number(name, text);
      page.append(name, text);
      continue;
    }
    const value = NUMBERS.includes(name) || name.startsWith("fraction.") ? number(name, text) : name === "accept_two_phase" ? true : text;
    put(body, name, value);
    query.append(name, String(value));
    page.append(name, String(value));
  }
  if (!body.gas) throw new Unreadable("gas", "Name a gas.");
  return { body, query: query.toString(), page: page.toString(), window: whole(window), gasKey: JSON.stringify(body.gas) };
}

function put(body, name, value) {
  if (name.endsWith("_unit") && name !== "fraction_unit") (body.units ||= {})[name.slice(0, -5)] = value;
  else if (name.startsWith("fraction.")) ((body.gas ||= {}).fractions ||= {})[name.slice(9)] = value;
  else if (name === "basis" || name === "fraction_unit") (body.gas ||= {})[name] = value;
  else if (name.startsWith("input_uncertainty.")) (body.input_uncertainty ||= {})[name.slice(18)] = value;
  else body[name] = value;
}

function number(name, text) {
  const value = parsed(text);
  if (Number.isNaN(value)) {
    const words = name.replace(/^(fraction|window|input_uncertainty)\./, "").replaceAll("_", " ");
    throw new Unreadable(name, text ? `${words}: “${text}” is not a number.` : `${words}: give a number.`);
  }
  return value;
}

function whole(window) {
  return Object.keys(window).length === 4 ? window : null;
}

/** Fill the form from the address bar; mixtures are handed to `blend`. */
export function restore(form, search, blend) {
  const given = new URLSearchParams(search);
  // an address that gives a number without its unit means what it means to the interface
  for (const [name, unit] of SI) if (given.has(name) && !given.has(`${name}_unit`)) given.set(`${name}_unit`, unit);
  const parts = [];
  for (const [name, value] of given) {
    if (name.startsWith("fraction.")) {
      parts.push([name.slice(9), value]);
      continue;
    }
    const field = form.elements.namedItem(name);
    if (!field) continue;
    if (field.type === "checkbox") field.checked = value === "true";
    else field.value = value;
    if (field.tagName === "SELECT" && field.selectedIndex < 0) field.selectedIndex = 0;
  }
  if (parts.length) blend(parts);
  const more = document.getElementById("more");
  if ([...given.keys()].some((name) => more.querySelector(`[name="${CSS.escape(name)}"]`))) more.open = true;
}
