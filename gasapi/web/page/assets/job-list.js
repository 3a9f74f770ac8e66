// The table of jobs. A job is a leaf, a call, its fields, the body made of them, its results in words and perhaps a picture.

import { choice, gasName, number, reference, resultUnit } from "./job-form.js";
import { errorMap, leakPicture, meterPicture, sharePicture } from "./job-pictures.js";
import { brief, percent, shown } from "./numbers.js";
import { download } from "./save.js";
import { address, send } from "./service.js";
import { html } from "./elements.js";
import { signOf } from "./units.js";

const FLOW_UNITS = { actual_volume: "volume_flow", reference_volume: "volume_flow", mass: "mass_flow", amount: "amount_flow" };

const valued = (value, unit, digits = 5) => (value === null || value === undefined ? "–" : `${shown(value, digits)} ${signOf(unit)}`);

const rounded = (value) => String(Number(value.toPrecision(4)));

const meter = {
  leaf: "meter",
  call: "v1/flow",
  title: "Through a meter",
  intro: "A flow in one measure, told in all of them, and the factor that corrects a meter which was made for another density.",
  fields: [
    [
      choice("kind", "The flow is known as", [
        ["actual_volume", "volume at line conditions"],
        ["reference_volume", "volume at reference condition"],
        ["mass", "mass"],
        ["amount", "amount of substance"],
      ]),
      number("value", "Flow", "120"),
      resultUnit("volume_flow", "Volume flow in", "m3/h"),
      resultUnit("mass_flow", "Mass flow in", "kg/h"),
      resultUnit("amount_flow", "Amount flow in", "kmol/h"),
      reference(),
    ],
    [
      choice("principle", "Meter", [
        ["", "no meter to correct"],
        ["differential_pressure", "orifice, nozzle or another differential pressure"],
        ["volumetric", "turbine, vortex, ultrasonic: volume"],
      ]),
      number("design_density", "Its design density, in the unit of density above", "", { optional: true }),
    ],
  ],
  body({ line, pressure, temperature, read }) {
    const kind = read("kind");
    const quantities = ["volume_flow", "mass_flow", "amount_flow"];
    const units = { ...line.units, ...Object.fromEntries(quantities.map((quantity) => [quantity, read(`${quantity}_unit`)])) };
    const [principle, design] = [read("principle"), read("design_density")];
    return {
      ...line,
      units,
      pressure,
      temperature,
      flow: { kind, value: read("value"), unit: units[FLOW_UNITS[kind]] },
      ...(read("reference") ? { reference: read("reference") } : {}),
      ...(principle && design ? { meter: { principle, design_density: design } } : {}),
    };
  },
  results({ result, units }) {
    return [
      ["Volume at line conditions", valued(result.actual_volume, units.volume_flow)],
      ["Volume at the reference condition", result.reference_volume === null ? "choose a reference condition" : valued(result.reference_volume, units.volume_flow)],
      ["Mass", valued(result.mass, units.mass_flow)],
      ["Amount", valued(result.amount, units.amount_flow)],
      result.correction_factor !== undefined && ["Multiply the reading by", shown(result.correction_factor, 6), "a reading in mass or reference volume, made with the design density"],
    ];
  },
  picture: meterPicture,
};

const vessel = {
  leaf: "vessel",
  call: "v1/vessel",
  title: "In a vessel",
  intro: "How much of this gas a closed vessel holds at the pressure and temperature above, and what is used when it falls to a later state.",
  fields: [
    [number("volume", "Inner (water) volume", "50", { quantity: "volume", unit: "L" }), resultUnit("mass", "Mass in", "kg"), resultUnit("amount", "Amount in", "mol"), reference()],
    [number("later_pressure", "Later pressure, in the unit above", "", { optional: true }), number("later_temperature", "Later temperature, in the unit above", "", { optional: true })],
  ],
  body({ line, pressure, temperature, read }) {
    const later = [read("later_pressure"), read("later_temperature")];
    return {
      ...line,
      units: { ...line.units, volume: read("volume.unit"), mass: read("mass_unit"), amount: read("amount_unit") },
      volume: read("volume"),
      pressure,
      temperature,
      ...(read("reference") ? { reference: read("reference") } : {}),
      ...(later[0] === undefined ? {} : { later: { pressure: later[0], temperature: later[1] ?? temperature } }),
    };
  },
  results({ result, units }) {
    const rows = (prefix, word) => [
      [`Mass ${word}`, valued(result[`${prefix}mass`], units.mass)],
      [`Amount ${word}`, valued(result[`${prefix}amount`], units.amount)],
      [`Volume ${word}, at the reference condition`, result[`${prefix}reference_volume`] === null ? "choose a reference condition" : valued(result[`${prefix}reference_volume`], units.volume)],
    ];
    return [...rows("", "held"), ...(result.used_mass === undefined ? [] : rows("used_", "used"))];
  },
};

const leak = {
  leaf: "leak",
  call: "v1/pressure-decay",
  title: "Leak test",
  intro:
    "A closed volume, read at the start and at the end. The start is the line above; the end is read below. " +
    "With the uncertainty of the readings the answer says whether the loss can be told from none.",
  fields: [
    [number("volume", "Closed volume", "2", { quantity: "volume", unit: "m3" }), number("duration", "Time between the readings", "24", { quantity: "duration", unit: "h" })],
    [number("end_pressure", "Pressure at the end"), number("end_temperature", "Temperature at the end")],
    [
      number("start_ambient", "Ambient pressure at the start, Pa", "", { optional: true }),
      number("end_ambient", "Ambient pressure at the end, Pa", "", { optional: true }),
      number("u_pressure", "Standard uncertainty of a pressure reading", "0.02", { optional: true }),
      number("u_temperature", "Standard uncertainty of a temperature reading", "0.1", { optional: true }),
      resultUnit("mass", "Mass in", "kg"),
      resultUnit("mass_flow", "Leak rate in", "g/h"),
    ],
  ],
  suggestions: ({ pressure, temperature }) => ({ end_pressure: rounded(pressure - 0.01 * Math.abs(pressure)), end_temperature: rounded(temperature) }),
  body({ line, pressure, temperature, read }) {
    const doubt = { pressure: read("u_pressure"), temperature: read("u_temperature") };
    const ambient = (value) => (value === undefined ? {} : { ambient_pressure: value });
    return {
      ...line,
      units: { ...line.units, volume: read("volume.unit"), duration: read("duration.unit"), mass: read("mass_unit"), mass_flow: read("mass_flow_unit") },
      volume: read("volume"),
      duration: read("duration"),
      start: { pressure, temperature, ...ambient(read("start_ambient")) },
      end: { pressure: read("end_pressure"), temperature: read("end_temperature"), ...ambient(read("end_ambient")) },
      ...(doubt.pressure === undefined && doubt.temperature === undefined ? {} : { input_uncertainty: { pressure: doubt.pressure ?? 0, temperature: doubt.temperature ?? 0 } }),
    };
  },
  results({ result, units }) {
    const doubt = (value, unit) => (value === null ? "no uncertainty of the readings is given" : `± ${brief(value, 2)} ${signOf(unit)} (k = 2)`);
    const resolved = { true: "Yes: larger than its uncertainty", false: "No: it cannot be told from none" }[result.resolved] ?? "not known without the uncertainty of the readings";
    return [
      ["Lost mass", valued(result.lost_mass, units.mass, 4), doubt(result.lost_mass_expanded_uncertainty, units.mass)],
      ["Leak rate", valued(result.leak_rate, units.mass_flow, 4), doubt(result.leak_rate_expanded_uncertainty, units.mass_flow)],
      ["Is the loss resolved?", resolved],
    ];
  },
  picture: leakPicture,
};

const share = {
  leaf: "share",
  call: "v1/fraction-from-density",
  title: "Share of two gases",
  intro: "Two gases are in the line and a density meter reads: how much of the first is there? Pressure, temperature and the unit of density are those above.",
  fields: [[gasName("first", "First gas", "hydrogen"), gasName("second", "Second gas", "nitrogen"), number("density", "Density as read, in the unit above")]],
  missing: "Give the density that the meter reads.",
  body({ line, pressure, temperature, read }) {
    const { gas, ...rest } = line;
    const density = read("density");
    if (density === undefined) return null;
    return { ...rest, gases: [read("first"), read("second")], density, pressure, temperature };
  },
  results({ result, units }, { read }) {
    if (!result.explained) return [["Share of the first", "no mixture of the two explains this reading"]];
    return [
      [`Share of ${read("first")}`, percent(result.mole_fraction, 5), "of the molecules"],
      ["Molar mass", valued(result.molar_mass, units.molar_mass)],
    ];
  },
  picture: sharePicture,
};

const table = {
  leaf: "table",
  call: "v1/lookup-table",
  title: "Table for a PLC",
  intro: "A small table for bilinear interpolation in a controller. Its largest error is looked for with the equation itself, in 32-bit arithmetic.",
  fields: [
    [
      number("pressure_low", "Pressure from"),
      number("pressure_high", "to"),
      number("temperature_low", "Temperature from"),
      number("temperature_high", "to"),
    ],
    [
      choice("property", "The table holds", [
        ["density", "density"],
        ["compressibility_factor", "compressibility factor Z"],
        ["molar_volume", "molar volume"],
      ]),
      choice("tolerance", "Largest relative error", [
        ["0.001", "0.1 %"],
        ["0.0005", "0.05 %"],
        ["0.0001", "0.01 %"],
        ["0.005", "0.5 %"],
        ["0.01", "1 %"],
      ]),
    ],
  ],
  suggestions: ({ pressure, temperature }) => ({
    pressure_low: rounded(pressure - 0.5 * Math.abs(pressure)),
    pressure_high: rounded(pressure + 0.1 * Math.abs(pressure)),
    temperature_low: rounded(temperature),
    temperature_high: rounded(temperature + 40),
  }),
  body({ line, read }) {
    return {
      ...line,
      pressure: [read("pressure_low"), read("pressure_high")],
      temperature: [read("temperature_low"), read("temperature_high")],
      property: read("property"),
      tolerance: Number(read("tolerance")),
      format: "json",
    };
  },
  results({ result }, context, body) {
    const take = (format, words, name) => {
      const button = html("button", { type: "button" }, words);
      button.addEventListener("click", async () => {
        const accept = format === "csv" ? "text/csv, */*" : "*/*";
        const answer = await send("v1/lookup-table", {
          method: "POST",
          body: JSON.stringify({ ...body, format }),
          headers: { "Content-Type": "application/json", Accept: accept },
        });
        download(await answer.blob(), name);
      });
      return button;
    };
    return [
      ["Size", `${result.pressure.length} pressures by ${result.temperature.length} temperatures`],
      ["Largest error found", percent(result.max_relative_error, 2)],
      ["Take it", html("span", { class: "row" }, take("csv", "CSV", "table.csv"), take("st", "Structured Text", "table.st")), `or ask ${address("v1/lookup-table")}`],
    ];
  },
  picture: errorMap,
};

export const JOBS = [meter, vessel, leak, share, table];
