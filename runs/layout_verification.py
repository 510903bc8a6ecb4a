"""Layout of what ``verify`` found: its tables as named arrays beside the whole record as JSON."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import numpy as np

from ..models.units import SI_NAMES
from .layout_parts import Variable, strings


def verification_groups(found: Mapping[str, Any]) -> list[tuple[str, tuple[Variable, ...]]]:
    """Return (name, variables) of each table in ``found``; the JSON beside them holds everything, these the numbers."""
    groups = []
    checks = found.get("second_path", {}).get("checks", [])
    if checks:
        groups.append(("second_path", _checks(checks)))
    scatter = found.get("scatter", {})
    if scatter.get("requirements"):
        groups.append(("scatter", _scatter(scatter["requirements"])))
    if scatter.get("force_band"):
        groups.append(("force_band", _band(scatter["force_band"])))
    return groups


def _checks(checks: Sequence[Mapping[str, Any]]) -> tuple[Variable, ...]:
    per_row = "per check, see unit"
    return (
        Variable("check", strings(str(check["what"]) for check in checks), ("check",)),
        Variable("unit", strings(SI_NAMES[check["unit"]] for check in checks), ("check",)),
        Variable("gap", _numbers(check["gap"] for check in checks), ("check",), "m"),
        *(
            Variable(name, _numbers(check[name] for check in checks), ("check",), per_row)
            for name in ("kernel", "second", "difference")
        ),
    )


def _scatter(rows: Sequence[Mapping[str, Any]]) -> tuple[Variable, ...]:
    counts = [len(row["p5"]) for row in rows]
    element = np.arange(sum(counts), dtype=np.int64)
    per_row = "per requirement, see unit"
    return (
        Variable("requirement", strings(str(row["label"]) for row in rows), ("requirement",)),
        Variable("element", element, ("element",), "1"),
        Variable("unit", strings(SI_NAMES[row["unit"]] for row in rows), ("requirement",)),
        Variable("share", _numbers(row["share"] for row in rows), ("requirement",), "1"),
        Variable("owner", np.repeat(np.arange(len(rows), dtype=np.int64), counts), ("element",), "1"),
        Variable("p5", _numbers(value for row in rows for value in row["p5"]), ("element",), per_row),
        Variable("p95", _numbers(value for row in rows for value in row["p95"]), ("element",), per_row),
    )


def _band(band: Mapping[str, Any]) -> tuple[Variable, ...]:
    return (
        Variable("gap", _numbers(band["gap"]), ("gap",), "m"),
        Variable("p5", _numbers(band["p5"]), ("gap",), "N"),
        Variable("p95", _numbers(band["p95"]), ("gap",), "N"),
    )


def _numbers(values: Iterable[float | None]) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    return np.array([np.nan if value is None else value for value in values], np.float64)
