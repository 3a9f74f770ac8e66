// A small form for a job about the gas in the line, made from a list of fields; the address keeps what is typed in it.

import { combine } from "./combo.js";
import { html } from "./elements.js";
import { fieldsOf, writeAddress } from "./leaves.js";
import { parsed } from "./numbers.js";

let count = 0;

/** A number, with a choice of its unit where `quantity` names one. */
export function number(name, label, value = "", { quantity = null, unit = null, optional = false } = {}) {
  return { kind: "number", name, label, value, quantity, unit, optional };
}

/** A choice of one of [value, words]. */
export function choice(name, label, options) {
  return { kind: "choice", name, label, options };
}

/** A gas by any of its names. */
export function gasName(name, label, value) {
  return { kind: "gas", name, label, value };
}

/** A reference condition, by its name. */
export function reference() {
  return { kind: "template", name: "reference", label: "Reference condition", template: "reference-conditions" };
}

/** The unit of a result. */
export function resultUnit(quantity, label, unit) {
  return { kind: "template", name: `${quantity}_unit`, label, template: `units-${quantity}`, value: unit };
}

/** Build the form of a job in its leaf; `changed` gets a reader of its fields. */
export function jobForm(leaf, { title, intro, fields }, changed) {
  const form = html("form", { class: "leaf-form", autocomplete: "off" });
  const rows = fields.map((group) => html("div", { class: "fields" }, group.map(control)));
  const fault = html("p", { class: "fault", role: "alert", hidden: true });
  const outcome = html("div", { class: "outcome" });
  form.append(html("h2", {}, title), html("p", {}, intro), ...rows, fault);
  leaf.append(form, outcome);
  for (const field of form.querySelectorAll("input[data-gas]")) combine(field);

  const given = fieldsOf(leaf.id);
  for (const [name, value] of given) if (form.elements[name]) form.elements[name].value = value;

  form.addEventListener("submit", (event) => event.preventDefault());
  form.addEventListener("input", () => {
    writeAddress(null, typed(form));
    changed();
  });
  return { form, fault, outcome, read: (name) => read(form, name), suggest: (values) => suggest(form, values) };
}

/** Fill fields that nobody has typed in yet with values that fit the line. */
function suggest(form, values) {
  for (const [name, value] of Object.entries(values)) {
    const field = form.elements[name];
    if (!field.value || field.value === field.dataset.suggested) field.value = field.dataset.suggested = value;
  }
}

function control(field) {
  count += 1;
  const id = `field-${count}`;
  const label = html("label", { for: id }, field.label);
  if (field.kind === "choice") return html("div", {}, label, html("select", { id, name: field.name }, field.options.map(([value, words]) => html("option", { value }, words))));
  if (field.kind === "template") return html("div", {}, label, fromTemplate(field, id));
  if (field.kind === "gas") return html("div", {}, label, html("span", { class: "combo" }, html("input", { id, name: field.name, value: field.value, "data-gas": true, spellcheck: "false" })));
  const input = html("input", { id, name: field.name, value: field.value, class: "number", inputmode: "decimal", placeholder: field.optional ? "none" : null });
  if (!field.quantity) return html("div", {}, label, input);
  const unit = fromTemplate({ template: `units-${field.quantity}`, name: `${field.name}.unit`, value: field.unit }, null);
  unit.setAttribute("aria-label", `Unit of ${field.label}`);
  return html("div", {}, label, html("span", { class: "pair" }, input, unit));
}

function fromTemplate({ template, name, value }, id) {
  const options = document.getElementById(template).content.cloneNode(true);
  const select = html("select", { name, ...(id ? { id } : {}) }, options);
  select.value = value ?? "";
  return select;
}

function typed(form) {
  const fields = new URLSearchParams();
  for (const [name, value] of new FormData(form)) if (value !== "") fields.append(name, value);
  return fields;
}

/** Return a number, undefined where it is left out; a text as it is. */
function read(form, name) {
  const field = form.elements[name];
  const text = field.value.trim();
  if (!field.classList.contains("number")) return text;
  if (!text) return undefined;
  const value = parsed(text);
  if (Number.isNaN(value)) throw new Error(`${form.querySelector(`label[for="${field.id}"]`).textContent}: “${text}” is not a number.`);
  return value;
}

/** Draw named results as a list of terms. */
export function results(rows) {
  return html(
    "dl",
    {},
    rows.filter(Boolean).map(([term, value, note]) => html("div", {}, html("dt", {}, term), html("dd", {}, value), note ? html("dd", { class: "band" }, note) : null)),
  );
}
