// Units as the service lists them; what is asked and answered stays in the caller's units, and only what the service tells
// in SI (the published range of an equation) is converted here, for drawing.

/** Return the chosen unit of a quantity, with how it becomes SI. */
export function unitOf(select) {
  const option = select.selectedOptions[0];
  return {
    name: option.value,
    sign: option.textContent,
    scale: Number(option.dataset.scale),
    offset: Number(option.dataset.offset),
    gauge: "gauge" in option.dataset,
  };
}

export function toSi(value, unit, ambient) {
  return value * unit.scale + unit.offset + (unit.gauge ? ambient : 0);
}

export function fromSi(value, unit, ambient) {
  return (value - unit.offset - (unit.gauge ? ambient : 0)) / unit.scale;
}

/** Return the sign of a difference of temperatures: a margin of 5 °C is 5 K. */
export function differenceSign(unit) {
  return { "°C": "K", "°F": "°F", "°R": "°R" }[unit.sign] || unit.sign;
}

/** Return the unit of a pressure difference: one of 5 barg is 5 bar. */
export function pressureDifferenceSign(unit) {
  return unit.gauge ? unit.sign.replace(/g$/, "") : unit.sign;
}

/** Return a unit as people write it. */
export function signOf(name) {
  return ({ degC: "°C", degF: "°F", degR: "°R" }[name] || name || "").replace(/(^|[^a-z])(m|ft|in|cm)3/g, "$1$2³");
}
