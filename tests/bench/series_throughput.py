"""Rows per second of a series: ours through HTTP and in process, against general libraries called from Python, in one run.

    python tests/bench/series_throughput.py [--rows 100000] [--rounds 5]

Ours: ``POST /v1/series`` in JSON on loopback, from the first byte sent to the last one received; the same rows through the
service in process, phase and quality included; densities alone, and alone from a certified table that is built anew each
time. Nitrogen, carbon dioxide (outside and near its critical region) and a natural gas of 11 components.
Libraries: CoolProp's call for whole arrays (its reference equations of the pure gases), and GERG-2008 point by point by
pyaga8 and teqp (the natural gas). The sides take turns, and medians are printed with the ratio to the library: for the
natural gas, the faster one. Every side computes the same densities, which is checked first.

The server is ours with one worker. A library's figures are those of calling it, without any transport.
"""

from __future__ import annotations

import argparse
import http.client
import os
import socket
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import orjson

from gasapi.engine.certified import CertifiedFluid
from gasapi.engine.models.helmholtz_fluid import HelmholtzFluid
from gasapi.engine.protocol import Branch
from gasapi.gases.catalogue import Catalogue
from gasapi.service.context import Context
from gasapi.service.questions import GasSpec
from gasapi.service.series import Columns, Series, SeriesQuestion, Survey

ROOT = Path(__file__).resolve().parents[2]

# mole fractions of a natural gas, invented for this measurement
NATURAL_GAS = {
    "methane": 0.78,
    "nitrogen": 0.02,
    "carbon-dioxide": 0.06,
    "ethane": 0.082,
    "propane": 0.03,
    "isobutane": 0.0075,
    "n-butane": 0.011,
    "isopentane": 0.0025,
    "n-pentane": 0.003,
    "n-hexane": 0.0025,
    "n-heptane": 0.0015,
}
PYAGA8_NAMES = {
    "methane": "methane",
    "nitrogen": "nitrogen",
    "carbon-dioxide": "carbon_dioxide",
    "ethane": "ethane",
    "propane": "propane",
    "isobutane": "isobutane",
    "n-butane": "n_butane",
    "isopentane": "isopentane",
    "n-pentane": "n_pentane",
    "n-hexane": "hexane",
    "n-heptane": "heptane",
}

Columns2 = tuple[np.ndarray, np.ndarray]


def cases(rows: int) -> dict[str, tuple[Any, Columns2]]:
    """Return gas, temperatures and pressures by case: states of a plant, and carbon dioxide close to its critical point."""
    rng = np.random.default_rng(20)
    return {
        "nitrogen": ("nitrogen", (rng.uniform(250.0, 350.0, rows), rng.uniform(1e5, 2e7, rows))),
        "carbon dioxide": ("carbon-dioxide", (rng.uniform(310.0, 400.0, rows), rng.uniform(1e5, 2e7, rows))),
        "carbon dioxide, near critical": ("carbon-dioxide", (rng.uniform(304.2, 306.0, rows), rng.uniform(7.2e6, 8e6, rows))),
        "natural gas": ({"fractions": NATURAL_GAS}, (rng.uniform(270.0, 340.0, rows), rng.uniform(1e5, 1.2e7, rows))),
    }


def in_process(context: Context, gas: Any, columns: Columns2, accuracy: float | None = None) -> np.ndarray:
    """Return mass densities by the service."""
    spec = GasSpec(gas) if isinstance(gas, str) else GasSpec(None, tuple(gas["fractions"].items()))
    question = SeriesQuestion(spec, accuracy=accuracy)
    survey = Survey(question)
    survey.add(Columns(*columns))
    return Series(context, question, survey).answer(Columns(*columns)).density


class Server:
    """Our service on a free port of loopback, one worker."""

    def __init__(self) -> None:
        with socket.socket() as free:
            free.bind(("127.0.0.1", 0))
            self.port = free.getsockname()[1]
        command = [sys.executable, "-c", "from gasapi.cli import main; raise SystemExit(main())", "serve"]
        self.process = subprocess.Popen(
            [*command, "--port", str(self.port), "--workers", "1"],
            env={**os.environ, "PYTHONPATH": str(ROOT)},
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        for _ in range(200):
            try:
                self.connection = http.client.HTTPConnection("127.0.0.1", self.port, timeout=120)
                self.ask("GET", "/readyz", b"")
            except OSError:
                time.sleep(0.1)
            else:
                return
        raise TimeoutError("the server does not answer")

    def ask(self, method: str, path: str, body: bytes) -> bytes:
        headers = {"Content-Type": "application/json"} if body else {}
        self.connection.request(method, path, body or None, headers)
        answer = self.connection.getresponse()
        content = answer.read()
        if answer.status != 200:
            raise ValueError(content[:600].decode())
        return content

    def stop(self) -> None:
        self.connection.close()
        self.process.terminate()
        self.process.wait(30)


def model_of(context: Context, gas: Any) -> HelmholtzFluid:
    """Return the equation that the service chooses for a gas."""
    mixture = not isinstance(gas, str)
    spec = GasSpec(None, tuple(gas["fractions"].items())) if mixture else GasSpec(gas)
    fluid = context.models(context.gas(spec)).prepared("gerg-2008" if mixture else "reference").fluid
    assert isinstance(fluid, HelmholtzFluid)
    return fluid


def question(gas: Any, columns: Columns2, accuracy: float | None = None) -> bytes:
    members = {"gas": gas, "temperature": columns[0], "pressure": columns[1]}
    if accuracy is not None:
        members["accuracy"] = accuracy
    return orjson.dumps(members, option=orjson.OPT_SERIALIZE_NUMPY)


def coolprop(fluid: str, columns: Columns2) -> np.ndarray:
    from CoolProp.CoolProp import PropsSI

    return PropsSI("Dmass", "T", columns[0], "P", columns[1], fluid)


def pyaga8_loop(columns: Columns2) -> list[float]:
    import pyaga8

    composition = pyaga8.Composition()
    for id, x in NATURAL_GAS.items():
        setattr(composition, PYAGA8_NAMES[id], x)
    gas = pyaga8.Gerg2008()
    gas.set_composition(composition)
    found = []
    for t, p in zip(columns[0].tolist(), (columns[1] / 1000.0).tolist(), strict=True):
        gas.temperature, gas.pressure = t, p
        gas.calc_density(0)
        found.append(gas.d)
    return found


def teqp_loop(columns: Columns2) -> list[float]:
    """Newton's method on teqp's own derivatives of GERG-2008, started at the ideal gas."""
    import teqp

    names = {"carbon-dioxide": "carbondioxide"}
    model = teqp.make_model({"kind": "GERG2008resid", "model": {"names": [names.get(id, id) for id in NATURAL_GAS]}})
    x = np.array(list(NATURAL_GAS.values()))
    r = model.get_R(x)
    found = []
    for t, p in zip(columns[0].tolist(), columns[1].tolist(), strict=True):
        rho = p / (r * t)
        for _ in range(50):
            _, first, second = model.get_Ar02n(t, rho, x)
            step = (rho * r * t * (1.0 + first) - p) / (r * t * (1.0 + 2.0 * first + second))
            rho -= step
            if abs(step) < 1e-12 * rho:
                break
        found.append(rho / 1000.0)
    return found


def check(name: str, ours: np.ndarray, library: np.ndarray) -> None:
    """Stop where the two do not compute the same thing."""
    deviation = float(np.nanmax(np.abs(ours / library - 1.0)))
    print(f"  {name}: largest deviation of density {deviation:.1e}")
    if not deviation < 1e-5:
        raise ValueError("the two do not compute the same")


def measured(sides: dict[str, tuple[Callable[[], Any], int]], rounds: int) -> dict[str, float]:
    """Return the median of rows per second of each side, the sides taking turns."""
    times: dict[str, list[float]] = {name: [] for name in sides}
    for _ in range(rounds):
        for name, (call, rows) in sides.items():
            start = time.perf_counter()
            call()
            times[name].append(rows / (time.perf_counter() - start))
    return {name: statistics.median(found) for name, found in times.items()}


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--rows", type=int, default=100_000)
    parser.add_argument("--rounds", type=int, default=5)
    options = parser.parse_args()
    context = Context(Catalogue.load())
    server = Server()
    library_rows = min(options.rows, 20_000)
    try:
        for name, (gas, columns) in cases(options.rows).items():
            some = (columns[0][:library_rows], columns[1][:library_rows])
            print(name)
            ours = in_process(context, gas, some)
            body, table = question(gas, columns), question(gas, columns, 1e-6)
            fluid = model_of(context, gas)
            sides: dict[str, tuple[Callable[[], Any], int]] = {
                "ours, density alone": (lambda f=fluid, c=columns: f.density(*c, Branch.GAS), options.rows),
                "ours, table and density alone": (
                    lambda f=fluid, c=columns: CertifiedFluid(f, 1e-6).density(*c, Branch.GAS),
                    options.rows,
                ),
                "ours, HTTP and JSON": (lambda b=body: server.ask("POST", "/v1/series", b), options.rows),
                "ours, in process": (lambda g=gas, c=columns: in_process(context, g, c), options.rows),
                "ours, certified table, HTTP": (lambda b=table: server.ask("POST", "/v1/series", b), options.rows),
                "ours, certified table": (lambda g=gas, c=columns: in_process(context, g, c, 1e-6), options.rows),
            }
            if isinstance(gas, str):
                name = {"nitrogen": "Nitrogen", "carbon-dioxide": "CarbonDioxide"}[gas]
                check("CoolProp", ours, coolprop(name, some))
                sides["CoolProp, whole arrays"] = (lambda f=name, c=some: coolprop(f, c), library_rows)
            else:
                molar_mass = fluid.molar_mass
                check("pyaga8", ours, np.array(pyaga8_loop(some)) * 1000.0 * molar_mass)
                sides["pyaga8, point by point"] = (lambda c=some: pyaga8_loop(c), library_rows)
                few = (some[0][:2000], some[1][:2000])
                check("teqp", ours[:2000], np.array(teqp_loop(few)) * 1000.0 * molar_mass)
                sides["teqp, point by point"] = (lambda c=few: teqp_loop(c), 2000)
            for call, _ in sides.values():
                call()
            found = measured(sides, options.rounds)
            library = max(rate for side, rate in found.items() if not side.startswith("ours"))
            for side, rate in found.items():
                print(f"  {side:30s} {rate:12,.0f} rows/s  {rate / library:6.1f} x the library")
    finally:
        server.stop()


if __name__ == "__main__":
    main()
