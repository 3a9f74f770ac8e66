// What the short words of an answer mean, in sentences.

export const LEVELS = {
  good: "Good: the number can be used as it stands",
  uncertain: "Uncertain: usable with care, for the reasons below",
  bad: "Bad: no number is given, for the reasons below",
};

const REASONS = {
  ambient_pressure_assumed: "The gauge reading was taken against an ambient of 101 325 Pa, because none was given; the lower the pressure, the more that matters.",
  outside_validity: "The state lies outside the published range of the equation, though inside its extended limits.",
  near_dew_point: "The gas is close to its dew line: a little colder, and it condenses.",
  near_critical: "The state is close to the critical point, where a small error in a reading moves the density far.",
  liquid: "The fluid is a liquid here.",
  fractions_scaled: "The fractions did not quite sum to the whole and were scaled.",
  uncertainty_large: "The stated uncertainty of the equation is large here.",
  phase_unknown: "The phase could not be told with certainty.",
  two_phase: "Gas and liquid exist side by side here, so that one density does not describe the line.",
  interaction_missing: "No published interaction parameter is held for a pair of the components.",
  associating: "The molecules associate, and a generalised equation describes that badly.",
  input_uncertain: "An input was itself marked as uncertain.",
  solid_possible: "A component may freeze here.",
  no_model: "No equation of this service can serve this gas.",
  not_converged: "The equation gave no dependable root here.",
  outside_limits: "The state lies outside all limits of the equation.",
  input_bad: "An input is missing, marked as bad, or out of any physical range.",
  fractions_bad: "The fractions of this row make no mixture.",
};

const REGIONS = {
  gas: "Gas, one phase",
  supercritical: "Supercritical fluid, one phase",
  liquid: "Liquid",
  "two-phase": "Two phases, gas with liquid",
  "solid-possible": "Solid possible",
  unknown: "Phase not known",
};

const BASES = {
  publication: "as the publication of the equation states",
  calibration: "as measured against better equations",
  estimate: "an estimate",
};

export function reasonWords(reason) {
  return REASONS[reason] || `${sentence(reason)}.`;
}

export function regionWords(region) {
  return REGIONS[region] || sentence(region);
}

export function basisWords(basis) {
  return BASES[basis] || sentence(basis).toLowerCase();
}

function sentence(word) {
  const plain = String(word).replaceAll("_", " ").replaceAll("-", " ");
  return plain.charAt(0).toUpperCase() + plain.slice(1);
}
