"""Measures the uncertainty of the generalised equations, prints it, and writes the file that the package carries.

    python tests/calibration/measure_generalised.py [--print]

needs nothing but the package: its 79 reference equations of pure gases and GERG-2008 are taken for the truth. How:

* **Pure gases.** Deviations at every node of a grid of reduced temperature and p/p_sat (p/pc above Tc), for all gases of a
  class whose equation reaches there; gas and liquid apart. The uncertainty is the 95th percentile of their absolute values,
  or, where larger, the half-width of the interval that holds 95 % of a class with 95 % confidence, normal and around zero
  (the tolerance interval of ISO 16269-6: 1.96 sqrt(n/chi^2) times the root mean square of n gases, chi^2 the 5 % point),
  held to twice the largest: n gases show less of a class than it holds. It is raised to the geometric mean with its
  neighbours in temperature, and does not fall with pressure up to saturation or the critical pressure.
* **Nodes that fewer than two gases reach** take a neighbour times 1.5, see ``filled``.
* **Hydrogen-bonding gases** are four only; their uncertainty is never below that of the polar ones, and where fewer than
  six polar or hydrogen-bonding gases reach a node, it is not below that of the non-polar ones.
* **Where the Lee-Kesler equation refuses** a substance of the catalogue next to a node, that node claims nothing: 1.
  The virial equation is asked itself, state by state.
* **Constants.** Relative changes of density with Tc, pc and omega by the Lee-Kesler equation, root mean square over omega
  of 0, 0.2 and 0.4.
* **Mixtures.** Random mixtures of GERG-2008 components in states that are one gas beyond doubt. What the mole-fraction
  average of the pure uncertainties does not cover, per share of unlike pairs (1 - sum x^2): its 98th
  percentile, since 240 mixtures do not show all that five components of 18 can do (with the 95th, 92 to 94 % of the
  deviations of other mixtures were covered).
  Likewise the change that k_ij makes in Peng-Robinson and Soave-Redlich-Kwong, for pairs that have none.
"""

from __future__ import annotations

import json
import math
import sys
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "support"))

from generalised_deviations import (
    BRANCHES,
    MODELS,
    Array,
    Truth,
    build,
    compressibility,
    deviations,
    mixture_deviations,
    random_mixtures,
    scale_pressure,
    substances,
    truths,
)

from gasapi.engine.models.cubic import GAS_CONSTANT
from gasapi.engine.models.lee_kesler import LeeKesler, PseudoCritical
from gasapi.engine.protocol import Branch
from gasapi.gases.records import Substance
from gasapi.gases.uncertainty_file import CLASSES, ConstantsError
from gasapi.service.generalised_uncertainty import class_of
from gasapi.service.models import GENERALISED

FILE: Final = Path(__file__).resolve().parents[2] / "gasapi" / "gases" / "data" / "generalised_uncertainty.json"

TEMPERATURES: Final = (
    *(0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.95, 0.98, 1.0, 1.02, 1.05, 1.1, 1.2, 1.35, 1.5, 1.75, 2.0, 2.5, 3.0, 4.0, 6.0, 10.0),
    *(16.0, 30.0, 100.0),
)
GAS_PRESSURES: Final = (
    *(0.01, 0.03, 0.1, 0.2, 0.35, 0.5, 0.7, 0.85, 0.95, 1.0),
    *(1.1, 1.3, 1.6, 2.0, 3.0, 5.0, 10.0, 20.0, 40.0, 100.0),
)
LIQUID_TEMPERATURES: Final = tuple(x for x in TEMPERATURES if x <= 1.0)
LIQUID_PRESSURES: Final = (0.01, 0.1, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 40.0, 100.0)

POLAR_FROM: Final = 40.0
# no gas with a reference equation has more than 198; how much more such gases depart is an estimate of ours, from second
# virial coefficients of acetonitrile and hydrogen cyanide two to three times those of corresponding states (from memory)
STRONGLY_POLAR_FROM: Final = 200.0
STRONG_DEPARTURE: Final = 1.5
STRONG_DEPARTURE_WITH_POLAR_TERM: Final = 0.3
# helium to ethanol, with a little to spare
ACENTRIC_FACTORS: Final = (-0.4, 0.7)
# molecules with an O-H or N-H bond, and hydrogen fluoride, cyanide and peroxide: chemical knowledge, no measure
HYDROGEN_BONDING: Final = (
    *("1-butanol", "1-pentanol", "1-propanol", "2-2-2-trifluoroethanol", "2-butanol", "acetic-acid", "acrylic-acid"),
    *("allyl-alcohol", "allylamine", "ammonia", "diethylamine", "diisopropylamine", "dimethylamine", "ethanol"),
    *("ethylamine", "ethylenimine", "formic-acid", "heavy-water", "hexamethyldisilazane", "hydrazine", "hydrogen-cyanide"),
    *("hydrogen-fluoride", "hydrogen-peroxide", "isobutanol", "isopropanol", "isopropylamine", "methanol", "methylamine"),
    *("n-butylamine", "n-propylamine", "nitric-acid", "piperidine", "propionic-acid", "pyrrolidine", "tert-butanol"),
    *("tert-butylamine", "trifluoroacetic-acid", "water"),
)
ASSOCIATION: Final = 3.0
# estimates of ours, k = 2: Tc and pc relative, omega absolute. Reviews of critical points give figures of this size
# (Tc 0.1 to 0.5 %, pc 1 to 3 %) for measured values, and estimation methods about 1 to 2 % and 4 to 8 %
GRADES: Final[Mapping[str, ConstantsError]] = {
    "A": ConstantsError(0.001, 0.005, 0.005),
    "B": ConstantsError(0.004, 0.02, 0.015),
    "C": ConstantsError(0.01, 0.04, 0.03),
    "D": ConstantsError(0.03, 0.08, 0.08),
}

FEWEST: Final = 2
FEW: Final = 6
FILLED: Final = 1.5
LEAST: Final = 1e-7
MIXTURES: Final = 240
MIXING_QUANTILE: Final = 0.98
_CONSTANTS: Final = {
    "ideal-gas": (),
    "van-der-waals": ("critical_temperature", "critical_pressure"),
}
# acentric factors at which the change of density with the constants is taken
_ACENTRIC: Final = (0.0, 0.2, 0.4)


def _class(substance: Substance) -> str:
    return class_of(substance, POLAR_FROM, HYDROGEN_BONDING)


def expanded(values: Array) -> Array:
    """Return the uncertainty that deviations of several gases give, along the first axis; NaN below two gases."""
    sizes = np.abs(values)
    n = np.count_nonzero(~np.isnan(sizes), axis=0)
    result = np.full(sizes.shape[1:], np.nan)
    for index in np.ndindex(*result.shape):
        count = int(n[index])
        if count >= FEWEST:
            d = sizes[(slice(None), *index)]
            d = d[~np.isnan(d)]
            factor = math.sqrt(count / float(chi2.ppf(0.05, count)))
            spread = 1.96 * factor * math.sqrt(float(np.mean(d * d)))
            result[index] = max(float(np.quantile(d, 0.95)), min(spread, 2.0 * float(d.max())))
    return result


def filled(table: Array, temperatures: Sequence[float], pressures: Sequence[float], dilute_below: float) -> Array:
    """Return a table whose empty nodes take a neighbour times 1.5.

    Below the reduced temperature ``dilute_below`` (Tc for a gas, everywhere for the virial equation) a node takes the next less
    dense one, in proportion to pressure; then every node the nearest colder (or else hotter) one, and at last the next less
    dense.
    """
    table = table.copy()
    for i, row in enumerate(table):
        edge = 1.0 if temperatures[i] < 1.0 else math.inf
        known = [j for j in range(row.size) if pressures[j] <= edge and not math.isnan(row[j])]
        if temperatures[i] < dilute_below and known:
            for j in range(known[-1] + 1, row.size):
                row[j] = FILLED * row[known[-1]] * min(pressures[j], edge) / pressures[known[-1]]
    for column in table.T:
        known = np.flatnonzero(~np.isnan(column))
        if known.size:
            for i in np.flatnonzero(np.isnan(column)):
                colder = known[known < i]
                column[i] = FILLED * column[colder[-1] if colder.size else known[0]]
    for row in table:
        known = np.flatnonzero(~np.isnan(row))
        for j in np.flatnonzero(np.isnan(row)):
            below = known[known < j]
            row[j] = FILLED * row[below[-1]] if below.size else row[known[0]]
    return table


def smoothed(table: Array, pressures: Sequence[float], gas: bool) -> Array:
    """Return a table raised to its neighbours' mean in temperature and, for a gas, never falling up to p_sat or pc."""
    logs = np.log(np.maximum(table, LEAST))
    raised = logs.copy()
    raised[1:-1] = np.maximum(logs[1:-1], 0.25 * (logs[:-2] + 2.0 * logs[1:-1] + logs[2:]))
    if gas:
        low = np.asarray(pressures) <= 1.0
        raised[:, low] = np.maximum.accumulate(raised[:, low], axis=1)
    return np.minimum(np.exp(raised), 1.0)


def nodes(temperatures: Sequence[float], pressures: Sequence[float]) -> tuple[Array, Array]:
    """Return all nodes as two flat arrays."""
    t, p = np.meshgrid(np.asarray(temperatures), np.asarray(pressures), indexing="ij")
    return t.ravel(), p.ravel()


def _states(substance: Substance, branch: str, tr: Array, y: Array) -> tuple[Array, Array]:
    scale = scale_pressure(tr, substance.acentric_factor) if branch == "gas" else 1.0
    return tr * substance.critical_temperature, y * scale * substance.critical_pressure


def _shape(branch: str) -> tuple[Sequence[float], Sequence[float]]:
    return (TEMPERATURES, GAS_PRESSURES) if branch == "gas" else (LIQUID_TEMPERATURES, LIQUID_PRESSURES)


def pure_deviations(model: str, gases: Sequence[Truth], branch: str) -> Array:
    """Return deviations at the nodes, shape (gases, temperatures, pressures)."""
    temperatures, pressures = _shape(branch)
    tr, y = nodes(temperatures, pressures)
    used = np.ones(tr.size, dtype=bool) if branch == "liquid" else (tr >= 1.0) | (y <= 1.0)
    found = np.full((len(gases), tr.size), np.nan)
    for i, truth in enumerate(gases):
        t, p = _states(truth.substance, branch, tr[used], y[used])
        found[i, used] = deviations(model, truth, t, p, BRANCHES[branch])
    return found.reshape(len(gases), len(temperatures), len(pressures))


def members(name: str) -> list[int]:
    """Return which of the gases with a reference equation belong to a class."""
    classes = [_class(truth.substance) for truth in truths()]
    if name == "unknown":
        return [i for i, c in enumerate(classes) if c != "quantum"]
    # a gas without a dipole moment in the data counts among all, and as polar or not by no one's guess
    return [i for i, c in enumerate(classes) if c == name]


def refused(model: str, name: str) -> NDArray[np.bool_]:
    """Return the gas nodes beside which an equation refuses a substance of a class."""
    steps = (0.02, 0.25, 0.5, 0.75, 0.98)
    near: NDArray[np.bool_] = np.zeros((len(TEMPERATURES), len(GAS_PRESSURES)), dtype=bool)
    fitting = {name} if name != "unknown" else set(CLASSES) - {"quantum"}
    group = [s for s in substances() if "associating" not in s.flags and _class(s) in fitting]
    fluids = [(s, build(model, [s], [1.0])) for s in group]
    for i in range(len(TEMPERATURES) - 1):
        for j in range(len(GAS_PRESSURES) - 1):
            if TEMPERATURES[i + 1] <= 1.0 and GAS_PRESSURES[j + 1] > 1.1:
                continue
            a, b = np.meshgrid(steps, steps, indexing="ij")
            tr = TEMPERATURES[i] + a.ravel() * (TEMPERATURES[i + 1] - TEMPERATURES[i])
            y = np.exp(np.log(GAS_PRESSURES[j]) + b.ravel() * np.log(GAS_PRESSURES[j + 1] / GAS_PRESSURES[j]))
            for s, fluid in fluids:
                if fluid is not None:
                    t, p = _states(s, "gas", tr, y)
                    if np.any(fluid.density(t, p, Branch.GAS).status != 0):
                        near[i : i + 2, j : j + 2] = True
                        break
    return near


def _lee_kesler_z(tr: Array, pr: Array, omega: float, branch: Branch) -> Array:
    fluid = LeeKesler(PseudoCritical(1.0, 1.0, omega), 1.0, True)
    root = fluid.density(tr, pr, branch)
    return np.where(root.status == 0, pr / (root.density * GAS_CONSTANT * tr), np.nan)


def sensitivities(branch: str) -> dict[str, Array]:
    """Return the relative changes of density with each constant."""
    temperatures, pressures = _shape(branch)
    tr, y = nodes(temperatures, pressures)
    h = 1e-4
    found: dict[str, list[Array]] = {name: [] for name in ConstantsError._fields}
    for omega in _ACENTRIC:
        pr = y * scale_pressure(tr, omega) if branch == "gas" else y
        which = BRANCHES[branch]

        def change(plus: tuple[Array, Array, float], minus: tuple[Array, Array, float], which: Branch = which) -> Array:
            return np.log(_lee_kesler_z(*plus, which) / _lee_kesler_z(*minus, which)) / (2.0 * h)

        found["critical_temperature"].append(change((tr * (1.0 - h), pr, omega), (tr * (1.0 + h), pr, omega)))
        found["critical_pressure"].append(change((tr, pr * (1.0 - h), omega), (tr, pr * (1.0 + h), omega)))
        found["acentric_factor"].append(change((tr, pr, omega + h), (tr, pr, omega - h)))
    result = {}
    for name, changes in found.items():
        squares = np.array(changes) ** 2
        known = ~np.isnan(squares)
        mean = np.where(known, squares, 0.0).sum(axis=0) / np.maximum(known.sum(axis=0), 1)
        table = np.where(known.any(axis=0), np.sqrt(mean), np.nan).reshape(len(temperatures), len(pressures))
        if branch == "gas":
            table[np.ix_(np.asarray(temperatures) < 1.0, np.asarray(pressures) > 1.0)] = np.nan
        result[name] = np.clip(filled(table, temperatures, pressures, float(branch == "gas")), LEAST, 100.0)
    return result


def _dilute_below(model: str, branch: str) -> float:
    if branch == "liquid":
        return 0.0
    return math.inf if model == "virial" else 1.0


def measure_pure(report: Callable[[str], None]) -> dict[str, dict[str, dict[str, Array]]]:
    """Return model, branch and class to the table of uncertainties."""
    result: dict[str, dict[str, dict[str, Array]]] = {}
    for model in MODELS:
        report(f"pure gases: {model}")
        result[model] = {}
        for branch in ("gas",) if GENERALISED[model].gas_only else ("gas", "liquid"):
            all_deviations = pure_deviations(model, truths(), branch)
            tables: dict[str, Array] = {}
            usual = expanded(all_deviations[members("non-polar")])
            for name in CLASSES:
                own = all_deviations[members(name)]
                raw = expanded(own)
                if name in ("polar", "hydrogen-bonding"):
                    few = np.count_nonzero(~np.isnan(own), axis=0) < FEW
                    raw = np.where(few, np.fmax(raw, np.where(np.isnan(raw), np.nan, usual)), raw)
                full = filled(raw, *_shape(branch), _dilute_below(model, branch))
                tables[name] = smoothed(full, _shape(branch)[1], branch == "gas")
            tables["hydrogen-bonding"] = np.maximum(tables["hydrogen-bonding"], tables["polar"])
            if model == "lee-kesler" and branch == "gas":
                for name in CLASSES:
                    tables[name][refused(model, name)] = 1.0
            result[model][branch] = tables
    return result


def measure_mixtures(
    pure: Mapping[str, Mapping[str, Mapping[str, Array]]], report: Callable[[str], None]
) -> tuple[dict[str, Array], dict[str, Array]]:
    """Return model to the part of mixing, and model to the part of missing interaction parameters."""
    tr, y = nodes(TEMPERATURES, GAS_PRESSURES)
    shape = (len(TEMPERATURES), len(GAS_PRESSURES))
    excess: dict[str, list[Array]] = {model: [] for model in MODELS}
    change: dict[str, list[Array]] = {model: [] for model in MODELS if GENERALISED[model].uses_interaction}
    for number, m in enumerate(random_mixtures(MIXTURES, seed=11)):
        if number % 60 == 0:
            report(f"mixtures: {number} of {MIXTURES}")
        t = tr * m.critical_temperature
        p = y * scale_pressure(tr, m.acentric_factor) * m.critical_pressure
        p = np.where((tr < 1.0) & (y > 1.0), np.nan, p)
        used = np.flatnonzero(~np.isnan(p))
        share = m.unlike_share
        if share < 0.15:
            continue
        found = mixture_deviations(MODELS, m, t[used], p[used])
        usable = ~np.isnan(found["peng-robinson"])
        for model in MODELS:
            covered = sum(x * pure[model]["gas"][_class(s)].ravel()[used] for x, s in zip(m.fractions, m.parts, strict=True))
            part = np.full(tr.size, np.nan)
            part[used] = np.sqrt(np.maximum(found[model] ** 2 - covered**2, 0.0)) / share
            excess[model].append(part)
        for model in change:
            part = np.full(tr.size, np.nan)
            rows = used[usable]
            pair = [build(model, m.parts, m.fractions, known) for known in (True, False)]
            with_pairs, without = (compressibility(f, t[rows], p[rows], Branch.GAS) for f in pair if f is not None)
            part[rows] = np.abs(without / with_pairs - 1.0) / share
            change[model].append(part)

    def table(parts: list[Array]) -> Array:
        values = np.array(parts)
        enough = np.count_nonzero(~np.isnan(values), axis=0) >= 20
        result = np.full(tr.size, np.nan)
        result[enough] = np.nanquantile(values[:, enough], MIXING_QUANTILE, axis=0)
        full = filled(result.reshape(shape), TEMPERATURES, GAS_PRESSURES, 1.0)
        return smoothed(full, GAS_PRESSURES, gas=True)

    return {m: table(v) for m, v in excess.items()}, {m: table(v) for m, v in change.items()}


def molar_mass_part() -> float:
    """Return the 95th percentile of abs((M/R of the reference equation)/(M/R here) - 1)."""
    parts = [abs(t.fluid.molar_mass / t.fluid.gas_constant / (t.substance.molar_mass / GAS_CONSTANT) - 1.0) for t in truths()]
    return float(np.quantile(parts, 0.95))


def _rows(table: Array) -> list[list[float]]:
    return [[float(f"{value:.3g}") for value in row] for row in table]


def document(report: Callable[[str], None]) -> dict[str, Any]:
    """Return the whole file, measured afresh."""
    pure = measure_pure(report)
    mixing, missing = measure_mixtures(pure, report)
    models = {}
    for model in MODELS:
        models[model] = {
            "constants": list(_CONSTANTS.get(model, ConstantsError._fields)),
            "gas": {name: _rows(pure[model]["gas"][name]) for name in CLASSES},
            "liquid": {name: _rows(pure[model]["liquid"][name]) for name in CLASSES} if "liquid" in pure[model] else None,
            "mixing": _rows(mixing[model]),
            "missing_interaction": _rows(missing[model]) if model in missing else None,
        }
    return {
        "title": "Relative expanded uncertainty (k = 2) of the density by generalised equations",
        "notes": [
            "measured by tests/calibration/measure_generalised.py, which tells how; never to be edited by hand",
            "rows: reduced temperature; columns: p/p_sat below the critical temperature and p/pc above it, for the liquid p/pc",
            "an entry of 1 makes no claim",
            "grades and association are estimates, not measured",
        ],
        "grid": {
            "temperatures": TEMPERATURES,
            "gas_pressures": GAS_PRESSURES,
            "liquid_temperatures": LIQUID_TEMPERATURES,
            "liquid_pressures": LIQUID_PRESSURES,
        },
        "classes": {
            "polar_from_reduced_dipole": POLAR_FROM,
            "strongly_polar_from_reduced_dipole": STRONGLY_POLAR_FROM,
            "strong_departure": STRONG_DEPARTURE,
            "strong_departure_with_polar_term": STRONG_DEPARTURE_WITH_POLAR_TERM,
            "acentric_factors": ACENTRIC_FACTORS,
            "hydrogen_bonding": HYDROGEN_BONDING,
        },
        "molar_mass": float(f"{molar_mass_part():.2g}"),
        "association": ASSOCIATION,
        "grades": {grade: error._asdict() for grade, error in GRADES.items()},
        "sensitivity": {b: {name: _rows(v) for name, v in sensitivities(b).items()} for b in BRANCHES},
        "models": models,
    }


def text_of(value: Any, depth: int = 0) -> str:
    """Return JSON with one row of numbers on a line."""
    pad = " " * (depth + 1)
    if isinstance(value, Mapping):
        items = [f"{pad}{json.dumps(key)}: {text_of(item, depth + 1)}" for key, item in value.items()]
        return "{\n" + ",\n".join(items) + "\n" + " " * depth + "}"
    if isinstance(value, list | tuple) and value and isinstance(value[0], list):
        return "[\n" + ",\n".join(pad + json.dumps(row) for row in value) + "\n" + " " * depth + "]"
    return json.dumps(value)


def print_table(data: Mapping[str, Any]) -> None:
    """Print uncertainties in per cent at some states."""
    states = [(0.6, 1.0), (0.75, 0.2), (0.8, 0.5), (0.95, 0.85), (1.05, 0.1), (1.1, 1.0), (1.2, 3.0), (1.5, 1.0), (2.0, 5.0)]
    states += [(6.0, 0.3), (30.0, 1.0), (100.0, 100.0)]
    nearest = [
        (int(np.argmin([abs(t - a) for a in TEMPERATURES])), int(np.argmin([abs(p - b) for b in GAS_PRESSURES])))
        for t, p in states
    ]
    head = " ".join(f"{TEMPERATURES[i]:g};{GAS_PRESSURES[j]:g}".rjust(9) for i, j in nearest)
    print("uncertainty in % (k = 2) at reduced temperature; p/p_sat (p/pc from 1 on)\n")
    print(f"{'':34}{head}")
    for model, tables in data["models"].items():
        kinds = [*((c, tables["gas"][c]) for c in CLASSES), ("mixing", tables["mixing"])]
        if tables["missing_interaction"] is not None:
            kinds.append(("missing k_ij", tables["missing_interaction"]))
        for name, table in kinds:
            print(f"{model:16}{name:18}" + " ".join(f"{100.0 * table[i][j]:9.3g}" for i, j in nearest))
    print("\nliquid at p/pc = 1")
    for model, tables in data["models"].items():
        if tables["liquid"] is not None:
            for name in CLASSES:
                row = [tables["liquid"][name][i][3] for i in range(len(LIQUID_TEMPERATURES))]
                print(
                    f"{model:16}{name:18}"
                    + " ".join(f"{t:g}: {100.0 * u:.3g}" for t, u in zip(LIQUID_TEMPERATURES, row, strict=True))
                )
    counts = {name: len(members(name)) for name in CLASSES}
    print(f"\ngases: {counts}; molar mass and gas constant: {data['molar_mass']}")


def main() -> None:
    """Measure, print, and write unless told otherwise."""
    data = document(lambda words: print(words, file=sys.stderr, flush=True))
    print_table(data)
    if "--print" not in sys.argv:
        FILE.write_text(text_of(data) + "\n", encoding="ascii")


if __name__ == "__main__":
    main()
