"""Synthetic runs: invented numbers that look like a run's, so that files and reports are tested without any search."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray
from polewright.models.blank import Disc, Polygon, Rectangle, Ring
from polewright.models.part import Part
from polewright.runs.records import Column, Curve, Design, Run

MM = 1e-3
SPEC_TOML = """spec_version = 1
title = "Service hatch (invented)"
# the comment stays: the spec is stored as given, with its µm and its "quotes"
"""


def pattern(part: Part, kind: str = "halves") -> NDArray[np.int8]:
    """Return a pattern on ``part``: "halves", "checker", "stripes" or "levels" (three levels)."""
    x, y = np.meshgrid(part.x, part.y)
    waves = {
        "halves": x,
        "stripes": np.sin(2 * np.pi * (x + 0.1 * MM) / (6 * MM)),
        "checker": np.sin(2 * np.pi * (x + 0.1 * MM) / (6 * MM)) * np.sin(2 * np.pi * (y + 0.1 * MM) / (6 * MM)),
        "levels": np.where(np.abs(x) < 1.6 * MM, 0.0, x * y),
    }
    return np.where(part.mask, np.sign(waves[kind]), 0).astype(np.int8)


def columns() -> tuple[Column, ...]:
    """Return columns of five entries: an id, a list, every kind of bound and a missing value's stand-off."""
    return (
        Column(0, "holding_force", "K1 holding_force at 0.3 mm", "N", "at_least", 20.0, id="K1"),
        Column(1, "axial_force", "axial_force at 3 mm", "N", "at_least", 2.0),
        Column(1, "axial_force", "axial_force at 4 mm", "N", "at_least", 2.0),
        Column(1, "axial_force", "axial_force at 5 mm", "N", "at_least", 1.5),
        Column(2, "stray_field", "stray_field of base, back, at 10 mm", "mT", "at_most", 5e-3),
        Column(3, "stand_off", "stand_off in 0.2..5 mm", "mm", "equal_to", 2.0 * MM, within=0.2 * MM),
        Column(4, "pole_count", "pole_count of both", "1", "improve", None, sense="minimize"),
    )


def designs(base: Part, mover: Part) -> tuple[Design, ...]:
    """Return three designs: one that meets all, one that misses, one without a stand-off."""
    good = np.array([23.4, 2.9, 2.31, 1.52, 3.1e-3, 2.05 * MM, 7.0])
    poor = np.array([18.0, 2.9, 2.31, 1.52, 3.1e-3, 2.05 * MM, 5.0])
    lost = np.array([25.0, 2.9, 1.9, 1.4, 6.1e-3, np.nan, 9.0])
    return (
        Design(
            "d1", "gradient", pattern(base, "stripes"), pattern(mover, "checker"), good,
            np.array([0.17, 0.0133, 0.38, 0.075]), True, 0.0133,
        ),
        Design(
            "d2", "polish", pattern(base, "checker"), pattern(mover, "checker"), poor,
            np.array([-0.1, 0.0133, 0.38, 0.075]), False, -0.1,
        ),
        Design(
            "d3", "given", pattern(base, "levels"), pattern(mover, "halves"), lost,
            np.array([0.25, -0.067, -0.22, np.nan]), False, np.nan,
        ),
    )  # fmt: skip


def force_curve(count: int) -> Curve:
    """Return force-gap curves of ``count`` designs that hold near and repel far."""
    gap = np.linspace(0.1, 8.0, 80) * MM
    near, far = -45.0 * np.exp(-gap / (0.75 * MM)), 12.0 * np.exp(-gap / (2.6 * MM))
    values = np.stack([(near + far) * (1.0 - 0.1 * n) for n in range(count)])
    return Curve("gap", gap, "mm", values, "N")


def verification() -> dict[str, Any]:
    """Return what ``verify`` would find, in SI."""
    gap = np.linspace(0.1, 8.0, 80) * MM
    force = force_curve(1).values[0]
    return {
        "design": "d1",
        "second_path": {
            "ok": True,
            "tolerance": 1e-6,
            "checks": [
                {"what": "axial force", "unit": "N", "gap": 0.3 * MM, "kernel": -23.4, "second": -23.400001,
                 "difference": 1e-6},
                {"what": "tilt moment", "unit": "N mm", "gap": 3 * MM, "kernel": 1.2e-3, "second": 1.2e-3,
                 "difference": 2e-10},
                {"what": "field behind the base", "unit": "mT", "gap": None, "kernel": 3.1e-3, "second": 3.1e-3,
                 "difference": 4e-12},
            ],
            "largest": 4.3e-8,
        },
        "scatter": {
            "samples": 500,
            "seed": 7,
            "share_all": 0.916,
            "requirements": [
                {"label": "K1 holding_force at 0.3 mm", "unit": "N", "share": 0.998, "p5": [21.4], "p95": [25.1],
                 "costliest": "gap"},
                {"label": "axial_force at 3, 4, 5 mm", "unit": "N", "share": 0.93, "p5": [2.7, 2.1, 1.4],
                 "p95": [3.1, 2.5, 1.64], "costliest": "remanence"},
                {"label": "stray_field of base, back, at 10 mm", "unit": "mT", "share": 0.99, "p5": [2.9e-3],
                 "p95": [4.2e-3], "costliest": "N/S imbalance"},
                {"label": "stand_off in 0.2..5 mm", "unit": "mm", "share": 0.95, "p5": [1.9 * MM], "p95": [2.19 * MM],
                 "costliest": "gap"},
            ],
            "force_band": {
                "gap": gap.tolist(),
                "p5": (force - 0.08 * np.abs(force) - 0.1).tolist(),
                "p95": (force + 0.08 * np.abs(force) + 0.1).tolist(),
            },
        },
        "assembly": [
            {"name": "mover turned by 180 deg",
             "text": "Holds at every gap instead of pushing away: the hatch would not open by itself.",
             "values": [{"label": "axial_force at 3 mm", "unit": "N", "value": -3.4}], "changes": True,
             "likely": True, "dangerous": True},
            {"name": "mover shifted by one pole along x", "text": "Repels at contact.",
             "values": [{"label": "holding_force at 0.3 mm", "unit": "N", "value": -11.0}], "changes": True,
             "likely": False, "dangerous": False},
        ],
    }  # fmt: skip


def make_run(**changes: Any) -> Run:
    """Return a run with three designs on a rectangle with a rim and a disc of another thickness."""
    base = Part(Rectangle(20.4 * MM, 16.0 * MM), 1.0 * MM, 3.0 * MM, 1.31, 20e-6)
    mover = Part(Disc(18.0 * MM), 1.0 * MM, 2.0 * MM, 1.18)
    return replace(
        Run(
            title="Service hatch (invented)",
            kind="design",
            spec_toml=SPEC_TOML,
            spec_json='{"spec_version": 1, "title": "Service hatch (invented)"}',
            seed=7,
            stop_reason="the search stopped improving after 41200 of 200000 evaluations",
            complete=True,
            evaluations=41_200,
            base=base,
            mover=mover,
            columns=columns(),
            designs=designs(base, mover),
            curves={"force_gap": force_curve(3)},
            history=np.array([[100.0, -0.4], [2_000.0, -0.05], [41_200.0, 0.0133]]),
            warnings=("stand_off: stable only on a guide.",),
            state={"latent": np.arange(6.0).reshape(2, 3), "generator": np.array([1, 2, 3], np.uint64)},
            provenance={"created_utc": "2030-01-01T00:00:00Z", "versions_json": "{}", "durations_json": "{}"},
        ),
        **changes,
    )


def other_blanks() -> dict[str, Part]:
    """Return parts on the blanks that ``make_run`` does not use."""
    outer = np.array([[0.0, 0.0], [20.0, 0.0], [20.0, 12.0], [8.0, 16.0], [0.0, 12.0]]) * MM
    hole = np.array([[5.0, 4.0], [9.0, 4.0], [9.0, 8.0], [5.0, 8.0]]) * MM
    return {
        "ring": Part(Ring(24.0 * MM, 8.0 * MM), 1.0 * MM, 3.0 * MM, 1.2),
        "polygon": Part(Polygon((outer, hole)), 1.0 * MM, 3.0 * MM, 1.2),
    }
