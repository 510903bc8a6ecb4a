"""The result of a command as one JSON object, and the exit code that goes with it."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, Literal

from .. import __version__
from ..models.errors import InputError, Issue
from ..models.units import from_si
from .jsonable import jsonable
from .judged import Judged, finite, judge
from .records import Design, Run

Status = Literal["met", "missed", "impossible", "interrupted", "error"]

EXIT_CODES: dict[Status, int] = {"met": 0, "missed": 3, "impossible": 4, "interrupted": 130, "error": 2}


def status_of(run: Run) -> Status:
    """Return how a run ended: "interrupted" before its end, else whether its best design meets every requirement."""
    if not run.complete:
        return "interrupted"
    return "met" if run.designs and run.designs[0].feasible else "missed"


def result_json(
    run: Run, command: str, path: Path | None, elapsed_s: float, status: Status | None = None
) -> dict[str, Any]:
    """Return the JSON object of a command that ended with a run.

    Args:
        run: The run.
        command: Name of the command ("design").
        path: The archive, or None when none was written.
        elapsed_s: Wall time of the command [s].
        status: How the command ended, where it differs from ``status_of(run)`` (``verify`` judges verified values).
    """
    return {
        "polewright": __version__,
        "command": command,
        "spec_sha256": run.spec_sha256,
        "status": status if status is not None else status_of(run),
        "run": None if path is None else str(path),
        "stop_reason": run.stop_reason,
        "elapsed_s": round(elapsed_s, 3),
        "evaluations": run.evaluations,
        "designs": [_design(run, design) for design in run.designs],
        "front": None,
        "limits": None,
        "verification": None if run.verification is None else verification_json(run.verification),
        "warnings": list(run.warnings),
    }


def error_json(command: str, error: InputError, elapsed_s: float = 0.0) -> dict[str, Any]:
    """Return the JSON object of a command that refused its input."""
    return {
        "polewright": __version__,
        "command": command,
        "spec_sha256": None,
        "status": "error",
        "run": None,
        "stop_reason": "bad input or usage",
        "elapsed_s": round(elapsed_s, 3),
        "evaluations": 0,
        "designs": [],
        "errors": [_issue(issue, error.source) for issue in error.issues],
        "warnings": [],
    }


def verification_json(found: Mapping[str, Any]) -> dict[str, Any]:
    """Return what ``verify`` found (SI) in the spec's units; lengths carry them in their key (``gap_mm``)."""
    shown: dict[str, Any] = jsonable(found)
    for check in shown.get("second_path", {}).get("checks", []):
        _convert(check, ("kernel", "second", "difference"))
        check["gap_mm"] = _in(check.pop("gap"), "mm")
    scatter = shown.get("scatter", {})
    for row in scatter.get("requirements", []):
        _convert(row, ("p5", "p95"))
    if scatter.get("force_band"):
        band = scatter["force_band"]
        scatter["force_band"] = {"gap_mm": _in(band["gap"], "mm"), "unit": "N", "p5": band["p5"], "p95": band["p95"]}
    for wrong in shown.get("assembly", []):
        for row in wrong["values"]:
            _convert(row, ("value",))
    return shown


def _issue(issue: Issue, source: str) -> dict[str, Any]:
    # a key path says where in the spec; an issue about a file as a whole must name the file
    whole = bool(source) and not issue.path and issue.line is None
    message = f"{source}: {issue.message}" if whole else issue.message
    return {"path": issue.path, "line": issue.line, "message": message}


def _design(run: Run, design: Design) -> dict[str, Any]:
    return {
        "id": design.id,
        "feasible": bool(design.feasible),
        "worst_margin": finite(design.worst_margin),
        "quantities": [_quantity(entry) for entry in judge(run, design)],
    }


def _quantity(entry: Judged) -> dict[str, Any]:
    values: list[float | None] = [finite(value) for value in entry.values]
    bounds: list[float | None] = [None if bound is None else finite(bound) for bound in entry.bounds]
    several = len(values) > 1
    improve = entry.kind == "improve"
    return {
        "name": entry.name,
        "label": entry.label,
        "unit": entry.unit,
        "value": values if several else values[0],
        "bound": None if improve else bounds if several else bounds[0],
        "kind": entry.kind,
        "margin": entry.margin,
        "ok": entry.ok,
    }


def _convert(row: dict[str, Any], keys: tuple[str, ...]) -> None:
    for key in keys:
        row[key] = _in(row[key], row["unit"])


def _in(value: Any, unit: str) -> Any:
    if isinstance(value, list):
        return [_in(item, unit) for item in value]
    return None if value is None else from_si(float(value), unit)
