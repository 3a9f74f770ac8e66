// A mixture: its components, and a ruler that shows how full the whole is.

import { combine } from "./combo.js";
import { html, svg } from "./elements.js";
import { brief, parsed } from "./numbers.js";

const WHOLE = { 1: 1, "%": 100, ppm: 1e6 };

/** Let the form hold a mixture in place of one gas. `changed` is called when something was added, removed or renamed. */
export function blendIn(form, changed) {
  const box = document.getElementById("blend");
  const parts = document.getElementById("parts");
  const button = document.getElementById("to-blend");
  const gas = document.getElementById("gas");
  const written = document.getElementById("blend-name");
  const fractionUnit = form.elements.fraction_unit;

  function add(name = "", value = "") {
    const nameField = html("input", { "aria-label": "Component", value: name, spellcheck: "false" });
    // without a name of its own the fraction is no member of the question yet
    const valueField = html("input", { "aria-label": "Fraction", inputmode: "decimal", value, class: "number" });
    const named = () => {
      const called = nameField.value.trim();
      if (called) valueField.name = `fraction.${called}`;
      else valueField.removeAttribute("name");
    };
    const remove = html("button", { type: "button", class: "plain", "aria-label": "Remove this component" }, "Remove");
    const row = html("div", { class: "part" }, html("span", { class: "combo" }, nameField), valueField, remove);
    nameField.addEventListener("input", named);
    remove.addEventListener("click", () => {
      row.remove();
      draw();
      changed();
    });
    named();
    parts.append(row);
    combine(nameField);
    return nameField;
  }

  function open(on) {
    box.hidden = !on;
    gas.disabled = on;
    gas.closest(".combo").hidden = on;
    written.hidden = !on;
    form.elements.basis.disabled = fractionUnit.disabled = !on;
    for (const field of parts.querySelectorAll("input")) field.disabled = !on;
    button.textContent = on ? "Make it one gas" : "Make it a mixture";
    button.setAttribute("aria-expanded", String(on));
    draw();
  }

  function draw() {
    const shares = [...parts.querySelectorAll(".part")].map((row) => {
      const [name, value] = row.querySelectorAll("input");
      return { name: name.value.trim(), value: parsed(value.value) || 0 };
    });
    const whole = WHOLE[fractionUnit.value];
    const sum = shares.reduce((total, share) => total + share.value, 0);
    const ruler = svg("svg", { viewBox: "0 0 100 4", preserveAspectRatio: "none", "aria-hidden": "true" });
    ruler.append(svg("rect", { width: 100, height: 4, fill: "none", stroke: "currentColor", "stroke-width": 0.4 }));
    let from = 0;
    shares.forEach((share, n) => {
      const width = Math.max(0, Math.min(100 - from, (100 * share.value) / whole));
      ruler.append(svg("rect", { x: from, width, height: 4, fill: "currentColor", opacity: n % 2 ? 0.35 : 0.75 }));
      from += width;
    });
    const missing = whole - sum;
    const sign = fractionUnit.value === "1" ? "" : ` ${fractionUnit.value}`;
    const words =
      Math.abs(missing) <= 1e-6 * whole
        ? "The fractions make the whole."
        : `The fractions sum to ${brief(sum, 6)}${sign}: ${brief(Math.abs(missing), 4)}${sign} ${missing > 0 ? "are missing" : "too much"}.`;
    document.getElementById("whole").replaceChildren(ruler, words);
    written.textContent = shares.filter((share) => share.name).length > 1 ? "this mixture" : "a mixture";
  }

  button.addEventListener("click", () => {
    const on = box.hidden;
    if (on && !parts.children.length) {
      const whole = WHOLE[fractionUnit.value];
      add(gas.value, String(0.9 * whole));
      add(gas.value.trim().toLowerCase() === "nitrogen" ? "argon" : "nitrogen", String(0.1 * whole));
    }
    open(on);
    changed();
  });
  document.getElementById("add-part").addEventListener("click", () => {
    add().focus();
    draw();
  });
  box.addEventListener("input", draw);

  return function restoreParts(given) {
    parts.replaceChildren();
    for (const [name, value] of given) add(name, value);
    open(true);
  };
}
