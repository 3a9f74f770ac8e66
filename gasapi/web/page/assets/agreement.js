// How far the equations disagree at one state: a strip with every equation's density and the band of its uncertainty.

import { html, svg } from "./elements.js";
import { brief, percent, shown } from "./numbers.js";

/** Draw the answer of a comparison into a place. `chosen` is the id of the equation that told the state. */
export function drawAgreement(place, models, chosen, sign) {
  const known = models.filter((model) => model.density !== null);
  if (!known.length) {
    place.replaceChildren(html("p", {}, "No equation gives a number here."));
    return;
  }
  const reach = 1.2 * Math.max(1e-5, ...known.map((model) => Math.abs(model.relative_difference || 0)));
  // a root scale: the good equations differ by a hundredth of what the poor ones do, and both are to be seen
  const x = (value) => 100 + 100 * Math.sign(value) * Math.sqrt(Math.min(1, Math.abs(value) / reach));
  const marks = [1e-4, 1e-3, 1e-2, 1e-1].filter((value) => value < reach);
  const rows = known.map((model) => {
    const difference = model.relative_difference ?? 0;
    const doubt = model.relative_uncertainty || 0;
    const [from, to] = [x(difference - doubt), x(difference + doubt)];
    const strip = svg("svg", { viewBox: "0 0 200 20", preserveAspectRatio: "none", "aria-hidden": "true" });
    for (const at of [0, ...marks, ...marks.map((value) => -value)]) strip.append(svg("line", { class: "grid", x1: x(at), x2: x(at), y1: at ? 6 : 0, y2: at ? 14 : 20 }));
    if (to > from) strip.append(svg("line", { class: "whisker", x1: from, x2: to, y1: 10, y2: 10 }));
    strip.append(svg("rect", { class: "dot", x: x(difference) - 1.5, y: 2, width: 3, height: 16 }));
    const signed = `${difference > 0 ? "+" : ""}${percent(difference, 3)}`;
    return html(
      "tr",
      { class: model.id === chosen ? "chosen" : "" },
      html("th", { scope: "row" }, model.id, model.inside_validity ? null : html("small", {}, " outside its range")),
      html("td", { class: "nowrap" }, `${shown(model.density, 5)} ${sign}`),
      html("td", { class: "nowrap" }, model.id === chosen ? "chosen" : signed),
      html("td", { class: "strip" }, strip),
    );
  });
  const head = html(
    "tr",
    {},
    ["Equation", "Density", "Difference", `±${brief(100 * reach, 2)} % at the ends, root scale; bars: stated uncertainty`].map((words) =>
      html("th", { scope: "col" }, words),
    ),
  );
  place.replaceChildren(
    html("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": "Equations at this state" }, html("table", {}, html("thead", {}, head), html("tbody", {}, rows))),
  );
}
