"""A long series in parts, and the parts of its answer as one."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

__all__ = ["joined_parts", "series_columns", "series_parts"]

_FRACTION = "fractions/"


def series_columns(members: Mapping[str, Any]) -> tuple[dict[str, Any], dict[str, Any]]:
    """Return the members of a series that are the same for all rows, and its columns by name.

    Sequences become arrays, in which NaN is a missing reading; timestamps become strings where they are times.

    :raises ValueError: columns are not of equal length, or not numbers
    """
    question = dict(members)
    columns: dict[str, Any] = {}
    for name in ("pressure", "temperature", "input_status"):
        if _is_column(question.get(name)):
            columns[name] = _numbers(question.pop(name))
    if question.get("timestamps") is not None:
        columns["timestamps"] = [_time(value) for value in question.pop("timestamps")]
    gas = question["gas"]
    if isinstance(gas, Mapping) and isinstance(gas.get("fractions"), Mapping):
        varying = {name: x for name, x in gas["fractions"].items() if _is_column(x)}
        columns |= {_FRACTION + name: _numbers(x) for name, x in varying.items()}
        question["gas"] = {**gas, "fractions": {n: x for n, x in gas["fractions"].items() if n not in varying}}
    if len({len(column) for column in columns.values()}) > 1:
        told = ", ".join(f"{name} {len(column)}" for name, column in columns.items())
        raise ValueError(f"columns are of equal length: {told}")
    return question, columns


def series_parts(question: Mapping[str, Any], columns: Mapping[str, Any], rows: int) -> list[dict[str, Any]]:
    """Return the questions of parts of a series.

    :param rows: rows of a part at most
    """
    length = max((len(column) for column in columns.values()), default=1)
    parts = []
    for start in range(0, max(1, length), rows):
        part = dict(question)
        fractions = {}
        for name, column in columns.items():
            if name.startswith(_FRACTION):
                fractions[name.removeprefix(_FRACTION)] = column[start : start + rows]
            else:
                part[name] = column[start : start + rows]
        if "input_status" in columns:
            part["input_status"] = [None if math.isnan(x) else int(x) for x in part["input_status"].tolist()]
        if fractions:
            gas = question["gas"]
            part["gas"] = {**gas, "fractions": {**gas["fractions"], **fractions}}
        parts.append(part)
    return parts


def joined_parts(answers: Sequence[dict[str, Any]]) -> dict[str, Any]:
    """Return the answers of parts as the answer of the whole: rows in order, counts added, the largest uncertainty."""
    whole = answers[0]
    start = len(whole["status_code"])
    for part in answers[1:]:
        for name in whole["result"]:
            whole["result"][name] += part["result"][name]
        whole["phase"]["region"] += part["phase"]["region"]
        if "timestamps" in whole:
            whole["timestamps"] += part["timestamps"]
        for level, count in part["counts"].items():
            whole["counts"][level] += count
        whole["reasons"] |= {str(start + int(row)): words for row, words in part["reasons"].items()}
        _join_gas(whole["gas"], part["gas"], start, len(part["status_code"]))
        _join_model(whole["model"], part["model"])
        whole["cautions"] = list(dict.fromkeys([*whole["cautions"], *part["cautions"]]))
        whole["status_code"] += part["status_code"]
        start += len(part["status_code"])
    return whole


def _join_gas(whole: dict[str, Any], part: dict[str, Any], before: int, rows: int) -> None:
    if not isinstance(whole["molar_mass"], list):
        return
    whole["molar_mass"] += part["molar_mass"]
    fractions = whole["fractions"]
    for name in [*fractions, *(name for name in part["fractions"] if name not in fractions)]:
        fractions[name] = fractions.get(name, [0.0] * before) + part["fractions"].get(name, [0.0] * rows)


def _join_model(whole: dict[str, Any], part: dict[str, Any]) -> None:
    whole["inside_validity"] = whole["inside_validity"] and part["inside_validity"]
    other = part["relative_uncertainty"]
    if other is not None and (whole["relative_uncertainty"] is None or other > whole["relative_uncertainty"]):
        whole["relative_uncertainty"], whole["uncertainty_basis"] = other, part["uncertainty_basis"]


def _is_column(value: Any) -> bool:
    return (
        value is not None and not isinstance(value, (str, bytes, Mapping)) and hasattr(value, "__len__") and np.ndim(value) == 1
    )


def _numbers(values: Any) -> Any:
    if hasattr(values, "to_numpy"):
        # a column of a data frame, whose own mark of a missing value NumPy does not know
        return values.to_numpy(dtype=np.float64, na_value=np.nan)
    array = np.asarray(values)
    if array.dtype == object:
        array = np.array([math.nan if value is None else value for value in values])
    if array.dtype.kind not in "iuf":
        raise ValueError("a column of a series holds numbers")
    return array.astype(np.float64)


def _time(value: Any) -> Any:
    if hasattr(value, "isoformat"):
        return value.isoformat()
    if isinstance(value, np.datetime64):
        return str(value)
    return value.item() if isinstance(value, np.generic) else value
