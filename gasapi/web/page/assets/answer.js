// The answer in words: figures, quality with its reasons, phase, equation, cautions.

import { html, qualityMark } from "./elements.js";
import { brief, digitsFor, percent, shown } from "./numbers.js";
import { differenceSign, fromSi, pressureDifferenceSign } from "./units.js";
import { LEVELS, basisWords, reasonWords, regionWords } from "./words.js";

const at = (id) => document.getElementById(id);

/** Draw an answer. `units` holds the chosen unit of each quantity, `ambient` the ambient pressure in Pa. */
export function drawAnswer(answer, units, ambient) {
  const { result, model, quality } = answer;
  at("stands").classList.remove("unanswered");
  const digits = digitsFor(model?.relative_uncertainty);
  at("density").textContent = shown(result.density, digits);
  at("density").title = result.density === null ? "" : String(result.density);
  at("factor").textContent = shown(result.compressibility_factor, digits);
  at("volume").textContent = shown(result.molar_volume, digits);
  at("density-band").textContent = band(answer, units);
  drawVerdict(quality);
  at("reasons").replaceChildren(...reasons(quality), phase(answer, units), ...equation(answer, units, ambient), ...slopes(answer, units));
  at("cautions").replaceChildren(...answer.cautions.map((caution) => html("li", {}, caution)));
}

/** Say that there is no answer: figures of an earlier question must not stand beside a new one. */
export function clearAnswer(words) {
  for (const id of ["density", "factor", "volume"]) at(id).textContent = "–";
  at("density-band").textContent = "";
  at("verdict").className = "verdict bad";
  at("verdict").dataset.words = "";
  at("verdict").title = "";
  at("verdict").replaceChildren(qualityMark("bad"), html("span", {}, words));
  at("reasons").replaceChildren();
  at("cautions").replaceChildren();
  // the picture stays in its place, but cannot be taken for that of the new question
  at("stands").classList.add("unanswered");
}

function drawVerdict(quality) {
  const verdict = at("verdict");
  const code = quality.status_code.toString(16).toUpperCase().padStart(8, "0");
  verdict.className = `verdict ${quality.level}`;
  const words = LEVELS[quality.level];
  // the code changes with every reason: a screen reader is told again only when the verdict itself is another
  if (verdict.dataset.words === words) {
    verdict.title = `OPC UA ${quality.symbol}, 0x${code}`;
    return;
  }
  verdict.dataset.words = words;
  verdict.title = `OPC UA ${quality.symbol}, 0x${code}`;
  verdict.replaceChildren(qualityMark(quality.level), html("span", {}, words));
}

function band(answer, units) {
  const { result, model } = answer;
  if (result.density === null) return "no number is given here";
  const sign = units.density.sign;
  const whole = result.density_expanded_uncertainty;
  if (whole !== undefined && whole !== null) return `± ${brief(whole, 2)} ${sign} with the readings' own uncertainty (k = 2)`;
  if (!(model?.relative_uncertainty > 0)) return "no uncertainty is stated for the equation";
  return `± ${brief(model.relative_uncertainty * result.density, 2)} ${sign}, which is ${percent(model.relative_uncertainty)} (k = 2)`;
}

function reasons(quality) {
  if (!quality.reasons.length) return [];
  return [html("ul", { id: "reason-list" }, quality.reasons.map((reason) => html("li", {}, reasonWords(reason))))];
}

function phase(answer, units) {
  const { region, dew_point_temperature: dew, margin_temperature: margin, margin_pressure, warnings } = answer.phase;
  const words = [html("strong", {}, regionWords(region))];
  if (dew !== null && margin !== null) {
    const side = margin >= 0 ? "above" : "below";
    words.push(
      `, ${brief(Math.abs(margin), 3)} ${differenceSign(units.temperature)} ${side} the dew line, which lies at ` +
        `${brief(dew, 4)} ${units.temperature.sign} for this pressure`,
    );
  }
  words.push(".");
  if (margin_pressure !== null && margin_pressure > 0)
    words.push(` At this temperature ${brief(margin_pressure, 3)} ${pressureDifferenceSign(units.pressure)} more would condense it.`);
  const warned = warnings.map((warning) => html("p", { class: "warn", "data-code": warning.code }, warning.message));
  return html("div", { class: "words", id: "phase" }, html("p", {}, ...words), ...warned);
}

function equation(answer, units, ambient) {
  const { model } = answer;
  if (!model) return [];
  const { temperature, pressure } = model.validity || {};
  const range = model.validity
    ? `Published for ${brief(fromSi(temperature[0], units.temperature, ambient), 4)} to ` +
      `${brief(fromSi(temperature[1], units.temperature, ambient), 4)} ${units.temperature.sign} and up to ` +
      `${brief(fromSi(pressure[1], units.pressure, ambient), 4)} ${units.pressure.sign}; the state lies ` +
      `${model.inside_validity ? "inside" : "outside"}.`
    : "";
  const doubt =
    model.relative_uncertainty > 0
      ? `Uncertainty of the density ${percent(model.relative_uncertainty)} (k = 2), ${basisWords(model.uncertainty_basis)}.`
      : "";
  return [
    html("p", { id: "equation" }, html("strong", {}, model.name), `. ${range} ${doubt}`),
    html("p", {}, html("small", {}, `Chosen: ${model.selected_because}. Source: ${model.source}.`)),
  ];
}

function slopes(answer, units) {
  const { density_pressure: byPressure, density_temperature: byTemperature } = answer.sensitivity || {};
  if (byPressure === null || byPressure === undefined) return [];
  const change = (slope) => `${slope < 0 ? "takes" : "adds"} ${brief(Math.abs(slope), 3)} ${units.density.sign}`;
  return [
    html(
      "p",
      {},
      `One ${pressureDifferenceSign(units.pressure)} more ${change(byPressure)}; ` +
        `one ${differenceSign(units.temperature)} warmer ${change(byTemperature)}.`,
    ),
  ];
}
