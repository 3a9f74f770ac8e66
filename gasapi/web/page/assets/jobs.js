// The jobs around a density: each is a form, the body that it asks with, and how its answer is told.

import { html, qualityMark } from "./elements.js";
import { jobForm, results } from "./job-form.js";
import { JOBS } from "./job-list.js";
import { commonOf } from "./scene.js";
import { post, wordsOf } from "./service.js";
import { LEVELS, reasonWords } from "./words.js";

/** Give every job its leaf; `current` tells the question that the sheet asks. */
export function jobsIn(current) {
  const open = new Map();
  let shown = "stands";

  function show(leaf) {
    shown = leaf;
    const job = JOBS.find((one) => one.leaf === leaf);
    if (!job) return;
    if (!open.has(leaf)) open.set(leaf, runner(job, current));
    open.get(leaf)();
  }

  return { show, changed: () => shown !== "stands" && show(shown) };
}

function runner(job, current) {
  let asking = null;
  const sheet = jobForm(document.getElementById(job.leaf), job, () => ask());

  async function ask() {
    asking?.abort();
    const { signal } = (asking = new AbortController());
    if (!current()) return;
    const { question, units } = current();
    try {
      const { pressure, temperature, model } = question.body;
      const line = { ...commonOf(question.body), ...(model ? { model } : {}) };
      const context = { line, pressure, temperature, units, read: sheet.read, signal };
      if (job.suggestions) sheet.suggest(job.suggestions(context));
      const body = job.body(context);
      if (body === null) {
        sheet.fault.hidden = true;
        sheet.outcome.replaceChildren(html("p", {}, job.missing));
        return;
      }
      const answer = await post(job.call, body, { signal });
      sheet.fault.hidden = true;
      const picture = html("div", { class: "canvas job-picture" });
      sheet.outcome.replaceChildren(html("div", { class: "results words" }, verdict(answer), results(job.results(answer, context, body)), ...said(answer)), picture);
      await job.picture?.(picture, answer, context, body);
    } catch (error) {
      if (error.name === "AbortError") return;
      sheet.fault.hidden = false;
      sheet.fault.textContent = wordsOf(error);
      sheet.outcome.replaceChildren();
    }
  }
  return ask;
}

function verdict({ quality }) {
  return html("p", { class: `verdict ${quality.level}` }, qualityMark(quality.level), html("span", {}, LEVELS[quality.level]));
}

function said({ quality, phase, cautions }) {
  const lists = [];
  if (quality.reasons.length) lists.push(html("ul", {}, quality.reasons.map((reason) => html("li", {}, reasonWords(reason)))));
  for (const warning of phase?.warnings || []) lists.push(html("p", { class: "warn" }, warning.message));
  if (cautions?.length) lists.push(html("details", {}, html("summary", {}, `Cautions (${cautions.length})`), html("ul", {}, cautions.map((words) => html("li", {}, words)))));
  return lists;
}
