// Which column of a file is which: guessed from its header, corrected by the person who knows the plant.

import { html } from "./elements.js";

const ROLES = [
  ["pressure", "pressure"],
  ["temperature", "temperature"],
  ["timestamps", "time stamp"],
  ["input_status", "status of the inputs"],
  ["keep", "keep as it is"],
  ["drop", "leave out"],
];
const GUESSES = [
  ["timestamps", /time|date|stamp|zeit/i],
  ["input_status", /status|qualit/i],
  ["pressure", /press|druck|^p\b|^pt?[-_ ]?\d|\bp[it]?t?[-_ ]?\d/i],
  ["temperature", /temp|^t\b|^tt?[-_ ]?\d|\bt[it]?t?[-_ ]?\d/i],
];

/** Return the columns of a header: {name, unit in brackets or "", role}. */
export function columnsOf(header) {
  const taken = new Set();
  return header.map((text) => {
    const [, name, unit = ""] = text.trim().match(/^(.*?)\s*(?:\[([^\]]*)\])?$/);
    if (/^fraction\./.test(name)) return { name, unit, role: name };
    const guess = GUESSES.find(([role, pattern]) => !taken.has(role) && (role === name || pattern.test(name)));
    if (guess) taken.add(guess[0]);
    return { name, unit, role: guess ? guess[0] : "keep" };
  });
}

/** Draw a choice for every column; `columns` is changed by what is chosen. */
export function drawColumns(place, columns, changed) {
  const rows = columns.map((column) => {
    const options = column.role.startsWith("fraction.") ? [[column.role, column.role]] : ROLES;
    const select = html("select", { "aria-label": `Column ${column.name} is` }, options.map(([value, words]) => html("option", { value, selected: value === column.role }, words)));
    select.addEventListener("input", () => {
      column.role = select.value;
      changed();
    });
    return html("div", {}, html("label", {}, `${column.name}${column.unit ? ` [${column.unit}]` : ""}`, select));
  });
  place.replaceChildren(html("div", { class: "fields" }, rows));
}

/** Return what is wrong with the choice, or an empty text. */
export function faultOf(columns) {
  for (const role of ["pressure", "temperature"]) {
    const count = columns.filter((column) => column.role === role).length;
    if (count !== 1) return count ? `Two columns are called ${role}; choose one.` : `No column is the ${role}; choose one.`;
  }
  return "";
}

/** Return the header that the service takes, the places of its columns, and the names of those that it only hands back. */
export function asAsked(columns) {
  const places = columns.map((_, n) => n).filter((n) => columns[n].role !== "drop");
  const taken = new Set();
  const keep = [];
  const header = places.map((n) => {
    const { name, unit, role } = columns[n];
    if (role !== "keep") return unit ? `${role} [${unit}]` : role;
    let free = name || `column ${n + 1}`;
    while (taken.has(free) || ROLES.some(([known]) => known === free)) free = `${free} (kept)`;
    taken.add(free);
    keep.push(free);
    return free;
  });
  return { header, places, keep };
}
