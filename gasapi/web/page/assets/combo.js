// A field that finds a gas by any of its names while it is typed (the combobox of WAI-ARIA 1.2).

import { html } from "./elements.js";
import { get } from "./service.js";

const MOST = 12;
let catalogue = null;
let known = null;
let count = 0;

/** Return all gases of the service, fetched once. */
export function gases() {
  catalogue ||= get("v1/gases").then(
    (answer) => {
      const all = answer.gases.map((gas) => ({ ...gas, names: [gas.name, gas.id, gas.formula, gas.cas, ...gas.synonyms].filter(Boolean) }));
      known = new Set(all.flatMap((gas) => gas.names.map((name) => name.toLowerCase())));
      return all;
    },
    (error) => {
      catalogue = null;
      throw error;
    },
  );
  return catalogue;
}

/** Return whether a text is the whole name of a gas; true where the names cannot be had, so that the service is asked. */
export async function isName(text) {
  await gases().catch(() => {});
  return !known || known.has(text.trim().toLowerCase());
}

/** Give a text field its list. The field tells a choice with an `input` event, as if it had been typed. */
export function combine(field) {
  count += 1;
  const id = `found-${count}`;
  const list = html("ul", { id, class: "found", role: "listbox", "aria-label": "Gases found", hidden: true });
  field.setAttribute("role", "combobox");
  field.setAttribute("aria-autocomplete", "list");
  field.setAttribute("aria-controls", id);
  field.setAttribute("aria-expanded", "false");
  field.after(list);
  let marked = -1;

  function close() {
    list.hidden = true;
    marked = -1;
    field.setAttribute("aria-expanded", "false");
    field.removeAttribute("aria-activedescendant");
  }

  function mark(n) {
    const options = [...list.children];
    if (!options.length) return;
    marked = (n + options.length) % options.length;
    options.forEach((option, i) => option.setAttribute("aria-selected", String(i === marked)));
    options[marked].scrollIntoView({ block: "nearest" });
    field.setAttribute("aria-activedescendant", options[marked].id);
  }

  function choose(option) {
    field.value = option.dataset.name;
    close();
    field.dispatchEvent(new Event("input", { bubbles: true }));
  }

  async function find() {
    const found = ranked(await gases().catch(() => []), field.value).slice(0, MOST);
    if (document.activeElement !== field) return;
    list.replaceChildren(
      ...found.map((gas, n) =>
        html(
          "li",
          { role: "option", id: `${id}-${n}`, "aria-selected": "false", "data-name": gas.name.toLowerCase() },
          html("span", {}, gas.name),
          html("small", {}, gas.formula || (gas.kind === "site" ? "of this site" : "mixture")),
        ),
      ),
    );
    list.hidden = !found.length;
    field.setAttribute("aria-expanded", String(found.length > 0));
    marked = -1;
  }

  field.addEventListener("input", (event) => event.isTrusted && find());
  field.addEventListener("focus", () => field.select());
  field.addEventListener("blur", close);
  field.addEventListener("keydown", (event) => {
    if (event.key === "ArrowDown" || event.key === "ArrowUp") {
      event.preventDefault();
      if (list.hidden) find();
      else mark(marked + (event.key === "ArrowDown" ? 1 : marked < 0 ? 0 : -1));
    } else if (event.key === "Enter" && !list.hidden && marked >= 0) {
      event.preventDefault();
      choose(list.children[marked]);
    } else if (event.key === "Escape") close();
  });
  list.addEventListener("pointerdown", (event) => {
    event.preventDefault();
    const option = event.target.closest("li");
    if (option) choose(option);
  });
}

/** Return the gases that a text may mean: whole names, then beginnings, then parts of names. */
export function ranked(all, text) {
  const wanted = text.trim().toLowerCase();
  if (!wanted) return all;
  const rank = (gas) => {
    const names = gas.names.map((name) => name.toLowerCase());
    if (names.includes(wanted)) return 0;
    if (names.some((name) => name.startsWith(wanted))) return 1;
    return names.some((name) => name.includes(wanted)) ? 2 : 3;
  };
  return all
    .map((gas, n) => [rank(gas), n, gas])
    .filter(([found]) => found < 3)
    .sort((a, b) => a[0] - b[0] || a[1] - b[1])
    .map(([, , gas]) => gas);
}
