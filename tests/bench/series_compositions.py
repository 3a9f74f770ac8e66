"""A series of 100,000 rows with 500 distinct compositions of a natural gas of 11 components, in process: seconds in all.

    python tests/bench/series_compositions.py [--rows 100000] [--compositions 500] [--alone]

``--alone`` uses one process.
"""

from __future__ import annotations

import argparse
import time

import numpy as np
from series_throughput import NATURAL_GAS

from gasapi.gases.catalogue import Catalogue
from gasapi.service.context import Context
from gasapi.service.series import Columns, RowComposition, Series, SeriesQuestion, Survey


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--rows", type=int, default=100_000)
    parser.add_argument("--compositions", type=int, default=500)
    parser.add_argument("--alone", action="store_true")
    options = parser.parse_args()
    rng = np.random.default_rng(3)
    base = np.array(list(NATURAL_GAS.values()))
    compositions = base * (1.0 + rng.uniform(-0.1, 0.1, (options.compositions, base.size)))
    compositions /= compositions.sum(axis=1)[:, None]
    rows = compositions[rng.integers(0, options.compositions, options.rows)]
    columns = Columns(rng.uniform(275.0, 320.0, options.rows), rng.uniform(1e6, 9e6, options.rows), None, rows)
    question = SeriesQuestion(RowComposition(tuple(NATURAL_GAS)))
    context = Context(Catalogue.load())
    start = time.perf_counter()
    survey = Survey(question)
    survey.add(columns)
    series = Series(context, question, survey, shares=not options.alone)
    series.answer(columns)
    print(f"{time.perf_counter() - start:.1f} s; {dict(series.summary().counts)}")


if __name__ == "__main__":
    main()
