// The picture: map, curves and agreement of the equations, drawn anew when the answer or the width of the page changes.

import { drawAgreement } from "./agreement.js";
import { drawCurves, readable } from "./curves.js";
import { html } from "./elements.js";
import { drawMap, movable } from "./map.js";
import { brief, shown } from "./numbers.js";
import { boundaryOf, commonOf, isothermsOf, othersOf, rangesFor } from "./scene.js";
import { post } from "./service.js";

const PRINTED = 560;

/** Give the page its picture. `move` is called with the pressure and temperature to which the state was moved. */
export function pictureIn(move) {
  const places = Object.fromEntries(["map", "curves", "agreement", "numbers", "reading"].map((id) => [id, document.getElementById(id)]));
  let scene = null;
  let asking = null;
  let models = [];

  const dragging = movable(places.map, () => scene || {}, move);
  const forget = readable(places.curves, () => scene || {}, (words) => (places.reading.textContent = words));

  function draw() {
    if (!scene || !places.map.clientWidth) return;
    scene.scales = drawMap(places.map, scene);
    scene.drawn = drawCurves(places.curves, scene);
    forget();
    const named = scene.quantity === "density" ? "Density" : "Compressibility factor Z";
    document.getElementById("curves-caption").textContent = `${named} along the same pressure, at five temperatures`;
    places.map.setAttribute("aria-description", mapWords(scene));
  }

  /** Draw an answer; the curves follow as they arrive, the earlier ones of the same gas stay until then. */
  async function show({ question, answer, units, ambient }) {
    asking?.abort();
    const { signal } = (asking = new AbortController());
    const { pressure, temperature } = question.body;
    const same = scene && scene.question.gasKey === question.gasKey && scene.units.pressure.name === units.pressure.name && scene.units.temperature.name === units.temperature.name && scene.units.density.name === units.density.name;
    const boundary = same ? scene.boundary : null;
    const view = chosen("view");
    const earlier = same ? scene.ranges : null;
    const ranges =
      same && dragging() ? earlier : rangesFor({ pressure, temperature, answer, units, ambient, boundary, view, earlier });
    scene = {
      question,
      answer,
      units,
      ambient,
      pressure,
      temperature,
      boundary,
      ranges,
      margin: question.body.dew_point_margin ?? 5,
      quantity: chosen("quantity"),
      isotherms: same && ranges === earlier ? scene.isotherms : [],
      others: [],
    };
    draw();
    try {
      await Promise.all([fillBoundary(signal), fillCurves(signal), fillAgreement(signal)]);
    } catch (error) {
      if (error.name !== "AbortError") places.reading.textContent = error.message;
    }
  }

  async function fillBoundary(signal) {
    const mine = scene;
    const boundary = await boundaryOf(mine.question);
    if (signal.aborted || mine.boundary === boundary) return;
    mine.boundary = boundary;
    if (chosen("view") === "whole") {
      mine.ranges = rangesFor({ ...mine, view: "whole", earlier: null });
      await fillCurves(signal);
    }
    draw();
  }

  async function fillCurves(signal) {
    const mine = scene;
    const isotherms = await isothermsOf({ ...mine, signal });
    if (signal.aborted) return;
    mine.isotherms = isotherms;
    draw();
    drawNumbers(mine);
    if (!document.getElementById("overlay").checked) return;
    if (!models.length) await fillAgreement(signal);
    const others = await othersOf({ ...mine, models, signal });
    if (signal.aborted) return;
    mine.others = others;
    draw();
  }

  async function fillAgreement(signal) {
    const mine = scene;
    const { question } = mine;
    const asked = { ...commonOf(question.body), pressure: question.body.pressure, temperature: question.body.temperature };
    const { result } = await post("v1/comparison", asked, { signal });
    models = result?.models || [];
    if (!signal.aborted) drawAgreement(places.agreement, models, mine.answer.model?.id, mine.units.density.sign);
  }

  function drawNumbers({ isotherms, units, quantity }) {
    if (!isotherms.length) return;
    const every = Math.ceil(isotherms[0].pressure.length / 16);
    const head = [`${units.pressure.sign}`, ...isotherms.map((curve) => `${brief(curve.temperature, 5)} ${units.temperature.sign}`)];
    const rows = isotherms[0].pressure
      .map((pressure, n) => (n % every ? null : [brief(pressure, 5), ...isotherms.map((curve) => shown(curve[quantity][n], 5))]))
      .filter(Boolean);
    const caption = `${quantity === "density" ? `Density, ${units.density.sign}` : "Z"} by pressure and temperature`;
    places.numbers.replaceChildren(
      html(
        "table",
        {},
        html("caption", { class: "unseen" }, caption),
        html("thead", {}, html("tr", {}, head.map((words) => html("th", { scope: "col" }, words)))),
        html("tbody", {}, rows.map(([first, ...rest]) => html("tr", {}, html("th", { scope: "row" }, first), rest.map((value) => html("td", {}, value))))),
      ),
    );
  }

  function paper(width) {
    if (!scene) return;
    scene.width = width;
    draw();
  }

  function refresh() {
    if (scene) show(scene);
  }

  for (const control of document.querySelectorAll(".picture-tools input")) control.addEventListener("change", refresh);
  // on paper the picture is as wide as the column, and its words keep their size
  addEventListener("beforeprint", () => paper(PRINTED));
  addEventListener("afterprint", () => paper(0));
  new ResizeObserver(() => requestAnimationFrame(draw)).observe(document.getElementById("picture"));
  return { show };
}

function chosen(name) {
  return document.querySelector(`.picture-tools input[name="${name}"]:checked`).value;
}

function mapWords({ answer, units, pressure, temperature }) {
  const { margin_temperature: margin } = answer.phase;
  const state = `State at ${brief(pressure, 6)} ${units.pressure.sign} and ${brief(temperature, 6)} ${units.temperature.sign}.`;
  return margin === null ? state : `${state} ${brief(Math.abs(margin), 3)} kelvin ${margin < 0 ? "below" : "above"} the dew line.`;
}
