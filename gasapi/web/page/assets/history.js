// A history of the gas: a file is counted first, then answered in blocks by one equation, so that no step appears in it.

import { asAsked, columnsOf, drawColumns, faultOf } from "./columns.js";
import { fieldsOf, recordOf, recordsOf, separatorOf } from "./csv.js";
import { html } from "./elements.js";
import { parsed } from "./numbers.js";
import { commonOf } from "./scene.js";
import { post, send, wordsOf } from "./service.js";
import { drawTrend, readableTrend, Trend } from "./trend.js";
import { reasonWords } from "./words.js";

const BLOCK = 5000;
const at = (id) => document.getElementById(id);

/** Give the page its history; `current` tells the question, whose gas and units hold for the file. */
export function historyIn(current) {
  let file = null;
  let columns = [];
  let separator = ",";
  let running = null;
  let taken = null;
  let trend = null;

  async function open(chosen) {
    running?.abort();
    file = chosen;
    complain("");
    for (const id of ["run", "stop", "take", "progress", "trend-panel"]) at(id).hidden = true;
    at("history-reasons").replaceChildren();
    const first = await recordsOf(file, 1).next();
    if (!first.value) {
      at("columns").replaceChildren();
      return complain("The file is empty.");
    }
    const [header] = first.value.records;
    separator = separatorOf(header);
    columns = columnsOf(fieldsOf(header, separator));
    drawColumns(at("columns"), columns, check);
    check();
  }

  function check() {
    const fault = faultOf(columns);
    complain(fault);
    at("run").hidden = Boolean(fault);
  }

  async function run() {
    if (!current()) return complain("The line above has no answer yet; complete it first.");
    running = new AbortController();
    const { signal } = running;
    at("run").hidden = at("take").hidden = true;
    at("stop").hidden = at("progress").hidden = false;
    at("bar").removeAttribute("value");
    complain("");
    try {
      const question = current().question;
      const survey = await surveyed(signal);
      if (!survey.rows) throw new Error("The file has a header and no row.");
      const model = question.body.model || (await modelFor(question, survey, signal));
      await answerAll(question, model, survey.rows, signal);
    } catch (error) {
      if (error.name === "AbortError") counted("Stopped.");
      else complain(wordsOf(error));
    } finally {
      at("stop").hidden = true;
      at("run").hidden = false;
    }
  }

  /** Count the rows, and note the extremes by which the equation is chosen. */
  async function surveyed(signal) {
    const [p, t] = ["pressure", "temperature"].map((role) => columns.findIndex((column) => column.role === role));
    const extremes = { pressure: [Infinity, -Infinity], temperature: [Infinity, -Infinity] };
    let rows = -1;
    for await (const { records } of recordsOf(file, BLOCK, signal)) {
      for (const record of records) {
        rows += 1;
        if (rows === 0) continue;
        const fields = fieldsOf(record, separator);
        for (const [name, place] of [["pressure", p], ["temperature", t]]) {
          const value = parsed(fields[place] || "");
          if (value < extremes[name][0]) extremes[name][0] = value;
          if (value > extremes[name][1]) extremes[name][1] = value;
        }
      }
      counted(`${(rows).toLocaleString("en")} rows found`);
      await breath();
    }
    return { rows, extremes };
  }

  /** Ask once which equation serves the whole range of the file: every block is then answered by that one. */
  async function modelFor(question, { extremes }, signal) {
    const [low, high] = extremes.pressure;
    const [cold, warm] = extremes.temperature;
    if (![low, high, cold, warm].every(Number.isFinite)) return null;
    const units = { ...question.body.units };
    for (const role of ["pressure", "temperature"]) {
      const written = columns.find((column) => column.role === role).unit;
      if (written) units[role] = written;
    }
    const corners = { pressure: [low, low, high, high, (low + high) / 2], temperature: [cold, warm, cold, warm, (cold + warm) / 2] };
    const answer = await post("v1/series", { ...commonOf(question.body), units, ...corners }, { signal });
    return answer.model?.id || null;
  }

  async function answerAll(question, model, rows, signal) {
    const { header, places, keep } = asAsked(columns);
    const address = `v1/series?${parametersOf(question, model, keep, columns)}`;
    const decimalComma = separator !== ",";
    const numbers = new Set(places.filter((n) => /^(pressure|temperature|fraction\.)/.test(columns[n].role)));
    trend = new Trend(rows);
    const parts = [];
    const told = new Map();
    const started = performance.now();
    let done = 0;
    let first = true;
    at("trend-panel").hidden = false;
    for await (const block of recordsOf(file, BLOCK, signal)) {
      const [records, lines] = first ? [block.records.slice(1), block.lines.slice(1)] : [block.records, block.lines];
      if (!records.length) continue;
      const rewritten = records.map((record) => {
        const fields = fieldsOf(record, separator);
        return recordOf(places.map((n) => (decimalComma && numbers.has(n) ? (fields[n] || "").trim().replace(",", ".") : (fields[n] ?? ""))));
      });
      const answer = await send(address, {
        method: "POST",
        body: [recordOf(header), ...rewritten, ""].join("\r\n"),
        headers: { "Content-Type": "text/csv; charset=utf-8", Accept: "text/csv" },
        signal,
      });
      const text = await answer.text();
      const [head, ...given] = text.split(/\r?\n/).filter((line) => line !== "");
      // the service counts the lines of the block that it was sent; the reader of the file counts those of the file
      const answered = given.map((line, n) => line.replace(/\bline \d+("?)$/, `line ${lines[n]}$1`));
      // as a blob the block need not stay in memory
      parts.push(new Blob([first ? `${head}\r\n` : "", answered.join("\r\n"), "\r\n"]));
      first = false;
      take(fieldsOf(head, ","), answered, told);
      done += records.length;
      at("bar").value = done / rows;
      const rate = done / ((performance.now() - started) / 1000);
      counted(`${done.toLocaleString("en")} of ${rows.toLocaleString("en")} rows answered${done < rows ? `, ${Math.round((rows - done) / rate)} s to go` : ""}`);
      drawTrend(at("trend"), trend, current().units.density.sign);
      await breath();
    }
    finish(parts, told, model);
  }

  function take(head, answered, told) {
    const place = (name) => head.findIndex((text) => text.replace(/\s*\[.*\]$/, "") === name);
    const [density, factor, status, reasons, time] = ["density", "compressibility_factor", "status_code", "reasons", "timestamps"].map(place);
    for (const record of answered) {
      const fields = fieldsOf(record, ",");
      const number = (text) => (text === undefined || text === "" ? NaN : Number(text));
      trend.add(number(fields[density]), number(fields[factor]), Number(fields[status]), time < 0 ? "" : fields[time]);
      if (reasons >= 0 && fields[reasons]) for (const word of fields[reasons].replace(/ ?line \d+$/, "").split(" ")) told.set(word, (told.get(word) || 0) + 1);
    }
  }

  function finish(parts, told, model) {
    if (taken) URL.revokeObjectURL(taken);
    taken = URL.createObjectURL(new Blob(parts, { type: "text/csv" }));
    const link = at("take");
    link.href = taken;
    link.download = file.name.replace(/(\.[^.]*)?$/, "-answered.csv");
    link.hidden = false;
    const { good, uncertain, bad } = trend.counts;
    const words = `Of ${trend.rows.toLocaleString("en")} rows ${good.toLocaleString("en")} good, ${uncertain.toLocaleString("en")} uncertain, ${bad.toLocaleString("en")} bad${model ? `, by ${model}` : ""}.`;
    const why = [...told].sort((a, b) => b[1] - a[1]).map(([word, count]) => html("li", {}, `${count.toLocaleString("en")} ${count === 1 ? "row" : "rows"}: ${reasonWords(word)}`));
    at("history-reasons").replaceChildren(html("p", { id: "history-counts" }, html("strong", {}, words)), html("ul", {}, why));
  }

  readableTrend(at("trend"), () => ({ trend, sign: current()?.units.density.sign }), (words) => (at("trend-reading").textContent = words));
  at("history-file").addEventListener("change", (event) => event.target.files[0] && open(event.target.files[0]));
  const drop = at("drop");
  drop.addEventListener("dragover", (event) => {
    event.preventDefault();
    drop.classList.add("over");
  });
  drop.addEventListener("dragleave", () => drop.classList.remove("over"));
  drop.addEventListener("drop", (event) => {
    event.preventDefault();
    drop.classList.remove("over");
    if (event.dataTransfer.files[0]) open(event.dataTransfer.files[0]);
  });
  at("run").addEventListener("click", run);
  at("stop").addEventListener("click", () => running?.abort());
  new ResizeObserver(() => trend && current() && drawTrend(at("trend"), trend, current().units.density.sign)).observe(at("trend"));
}

/** Return the query of a series: the question of the sheet without what the columns bring. */
function parametersOf(question, model, keep, columns) {
  const query = new URLSearchParams(question.query);
  for (const name of ["pressure", "temperature", "input_uncertainty.pressure", "input_uncertainty.temperature"]) query.delete(name);
  for (const role of ["pressure", "temperature"]) if (columns.find((column) => column.role === role).unit) query.delete(`${role}_unit`);
  if (columns.some((column) => column.role.startsWith("fraction."))) {
    for (const name of [...query.keys()]) if (name === "gas" || name.startsWith("fraction.")) query.delete(name);
  }
  if (model) query.set("model", model);
  for (const name of keep) query.append("keep", name);
  return query;
}

function counted(words) {
  at("counted").textContent = words;
}

function complain(words) {
  at("history-fault").hidden = !words;
  at("history-fault").textContent = words;
}

/** Let the page draw and take input before the next block. */
function breath() {
  return new Promise((resolve) => setTimeout(resolve));
}
