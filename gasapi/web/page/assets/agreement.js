// How far the equations disagree at one state: a strip with every equation's density and the band of its uncertainty.

import { linear } from "./axes.js";
import { html, svg } from "./elements.js";
import { brief, percent, shown } from "./numbers.js";

/** Draw the answer of a comparison into a place. `chosen` is the id of the equation that told the state. */
export function drawAgreement(place, models, chosen, sign) {
  const known = models.filter((model) => model.density !== null);
  if (!known.length) {
    place.replaceChildren(html("p", {}, "No equation gives a number here."));
    return;
  }
  const ends = known.flatMap((model) => {
    const doubt = Math.min(model.relative_uncertainty || 0, 0.5);
    return [Math.abs(model.relative_difference || 0), Math.min(doubt, 4 * Math.abs(model.relative_difference || 0) + 1e-4)];
  });
  const reach = Math.max(1e-5, ...ends) * 1.1;
  const x = linear([-reach, reach], [0, 200]);
  const rows = known.map((model) => {
    const difference = model.relative_difference ?? 0;
    const doubt = model.relative_uncertainty || 0;
    const [from, to] = [Math.max(0, x(difference - doubt)), Math.min(200, x(difference + doubt))];
    const strip = svg("svg", { viewBox: "0 0 200 20", preserveAspectRatio: "none", "aria-hidden": "true" });
    strip.append(svg("line", { class: "grid", x1: 100, x2: 100, y1: 0, y2: 20 }));
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
    ["Equation", "Density", "Difference", `From −${brief(100 * reach, 2)} % to +${brief(100 * reach, 2)} %, bars: stated uncertainty`].map((words) =>
      html("th", { scope: "col" }, words),
    ),
  );
  place.replaceChildren(
    html("div", { class: "scroll", tabindex: "0", role: "region", "aria-label": "Equations at this state" }, html("table", {}, html("thead", {}, head), html("tbody", {}, rows))),
  );
}
