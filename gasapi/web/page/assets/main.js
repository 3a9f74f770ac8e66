// The sheet: read the question, ask, draw the answer, keep the address bar in step.

import { clearAnswer, drawAnswer } from "./answer.js";
import { blendIn } from "./blend.js";
import { drawCalls } from "./calls.js";
import { combine, gases, isName } from "./combo.js";
import { historyIn } from "./history.js";
import { jobsIn } from "./jobs.js";
import { leavesIn, writeAddress } from "./leaves.js";
import { pictureIn } from "./picture.js";
import { questionOf, restore } from "./question.js";
import { post, wordsOf } from "./service.js";
import { unitOf } from "./units.js";

const form = document.getElementById("question");
const fault = document.getElementById("fault");
let asking = null;
let current = null;

document.documentElement.classList.add("scripted");
document.getElementById("more-fields").disabled = false;

const picture = pictureIn(move);
const restoreParts = blendIn(form, ask);
restore(form, location.search, restoreParts);
combine(document.getElementById("gas"));
historyIn(() => current);
const jobs = jobsIn(() => current);
leavesIn((leaf) => {
  if (leaf === "stands" && current?.answer) picture.show(current);
  jobs.show(leaf);
});

form.addEventListener("input", ({ target }) => {
  if (target.closest(".combo")) askOnceNamed(target);
  else if (!target.closest(".part") || target.name) ask();
});
form.addEventListener("change", async ({ target }) => {
  if (target.closest(".combo") && !(await isName(target.value))) ask();
});
form.addEventListener("submit", (event) => {
  event.preventDefault();
  ask();
});
for (const select of document.querySelectorAll("select[data-quantity]")) lastUnit(select);

ask();
// the names are fetched when somebody is about to look for one
form.addEventListener("focusin", () => gases().catch(() => {}), { once: true });

/** Half a name is no question yet: it is asked when it is that of a gas, or when the field is left. */
async function askOnceNamed(field) {
  const written = field.value;
  asking?.abort();
  const whole = await isName(written);
  if (field.value !== written) return;
  if (whole) ask();
  else clearAnswer("No answer yet: the name of the gas is being written");
}

/** Ask what the form says and draw the answer. */
async function ask() {
  const started = performance.now();
  asking?.abort();
  const { signal } = (asking = new AbortController());
  let question;
  try {
    question = questionOf(form);
  } catch (unreadable) {
    complain(unreadable.message, [unreadable.field]);
    return;
  }
  writeAddress(question.page);
  drawCalls(document.getElementById("calls"), question);
  try {
    const answer = await post("v1/state", question.body, { signal });
    const units = chosenUnits();
    const ambient = ambientOf(question, answer, units.pressure);
    settle();
    drawAnswer(answer, units, ambient);
    performance.measure("answer drawn", { start: started });
    current = { question, answer, units, ambient };
    document.title = titleOf(question, answer, units);
    document.documentElement.dataset.drawn = question.page;
    if (!document.getElementById("stands").hidden) picture.show(current);
    jobs.changed();
  } catch (error) {
    if (error.name === "AbortError") return;
    complain(wordsOf(error), (error.faults || []).map((one) => one.pointer.slice(1)));
  }
}

/** Say what cannot be answered, at the field that it concerns. */
function complain(words, pointers) {
  fault.textContent = words;
  fault.hidden = false;
  for (const field of form.elements) field.removeAttribute?.("aria-invalid");
  for (const pointer of pointers) {
    const name = pointer.replace(/^units\/(.*)$/, "$1_unit").replace(/^gas\/fractions\//, "fraction.");
    const field = form.elements.namedItem(name);
    if (field instanceof Element) {
      field.setAttribute("aria-invalid", "true");
      field.setAttribute("aria-describedby", "fault");
    }
  }
  clearAnswer("No answer: the question is not complete");
}

function settle() {
  fault.hidden = true;
  for (const field of form.elements) field.removeAttribute?.("aria-invalid");
}

function chosenUnits() {
  return Object.fromEntries([...document.querySelectorAll("select[data-quantity]")].map((select) => [select.dataset.quantity, unitOf(select)]));
}

/** Return the ambient pressure that the service used, in Pa: a site may have one of its own. */
function ambientOf(question, answer, unit) {
  return unit.gauge ? answer.state.pressure - question.body.pressure * unit.scale : (question.body.ambient_pressure ?? 101325);
}

/** Name the tab after the state, since several stand open on a control desk. */
function titleOf({ body }, { gas }, { pressure, temperature }) {
  return `${gas.id || "mixture"}, ${body.pressure} ${pressure.sign}, ${body.temperature} ${temperature.sign}: gasapi`;
}

/** Move the state, as if pressure and temperature had been typed. */
function move(pressure, temperature) {
  form.elements.pressure.value = String(pressure);
  form.elements.temperature.value = String(temperature);
  ask();
}

/** When another unit is chosen, the state stays where it is: its number is written anew, from the service's own factors. */
function lastUnit(select) {
  let before = unitOf(select);
  select.addEventListener("input", () => {
    const after = unitOf(select);
    const field = form.elements.namedItem(select.dataset.quantity);
    if (field && current) {
      const value = Number(field.value.replace(",", "."));
      const si = value * before.scale + before.offset + (before.gauge ? current.ambient : 0);
      const again = (si - after.offset - (after.gauge ? current.ambient : 0)) / after.scale;
      if (Number.isFinite(again)) field.value = String(Number(again.toPrecision(6)));
    }
    before = after;
    // a change inside the form reaches the form by itself
    if (!form.contains(select)) ask();
  });
}
