"""Layout of an archive: a run as groups of named arrays and back, without any file format (see ``archive``).

This is ``format_version`` 1. All numbers are SI; every numeric variable carries its unit and
names its dimensions. A variable that is named like its only dimension is the scale (coordinate) of that dimension;
each group carries its own scales, so each opens as one self-contained xarray dataset.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal, cast

import numpy as np
from numpy.typing import NDArray

from ..models.part import Part
from ..models.units import SI_NAMES
from .jsonable import jsonable
from .layout_parts import Variable, part_from, part_variables, strings
from .layout_verification import verification_groups
from .records import Column, Curve, Design, Run

FORMAT = "polewright-run"
FORMAT_VERSION = 1
PER_COLUMN = "per column, see /quantities/unit"


@dataclass(frozen=True)
class Group:
    """One group of an archive.

    Attributes:
        path: Absolute path inside the file ("/designs").
        attributes: Strings and integers.
        variables: The arrays, scales first.
    """

    path: str
    attributes: Mapping[str, str | int] = field(default_factory=dict)
    variables: tuple[Variable, ...] = ()


Tree = Mapping[str, Group]


def groups_of(run: Run) -> list[Group]:
    """Return the groups of ``run`` in the order in which they are written, the root first."""
    root: dict[str, str | int] = {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "Conventions": "CF-1.11",
        "title": run.title,
        "kind": run.kind,
        "spec_toml": run.spec_toml,
        "spec_json": run.spec_json,
        "spec_sha256": run.spec_sha256,
        "seed": run.seed,
        "stop_reason": run.stop_reason,
        "complete": int(run.complete),
        "evaluations": run.evaluations,
        "warnings_json": json.dumps(list(run.warnings), ensure_ascii=False),
    }
    groups = [
        Group("/", root),
        Group("/provenance", dict(sorted(run.provenance.items()))),
        *_geometry_groups(run),
        Group("/designs", {}, _design_variables(run)),
        Group("/quantities", {}, _column_variables(run.columns)),
        Group("/curves", {}, _curve_variables(run)),
        Group("/history", {}, _history_variables(run.history)),
        Group("/state", {}, _state_variables(run.state)),
    ]
    if run.verification is not None:
        text = json.dumps(jsonable(run.verification), sort_keys=True, ensure_ascii=False, allow_nan=False)
        groups.append(Group("/verification", {"json": text}))
        groups += [
            Group(f"/verification/{name}", {}, variables) for name, variables in verification_groups(run.verification)
        ]
    return groups


def run_from(tree: Tree) -> Run:
    """Return the run whose groups are ``tree``.

    Raises:
        KeyError: When a group, an attribute or a variable is missing.
        ValueError: When one has a shape or a word that does not fit.
    """
    root = tree["/"].attributes
    verification = tree.get("/verification")
    return Run(
        title=str(root["title"]),
        kind=cast(Literal["design", "front"], str(root["kind"])),
        spec_toml=str(root["spec_toml"]),
        spec_json=str(root["spec_json"]),
        seed=int(root["seed"]),
        stop_reason=str(root["stop_reason"]),
        complete=bool(root["complete"]),
        evaluations=int(root["evaluations"]),
        base=part_from(tree["/geometry/base"].attributes, _arrays(tree["/geometry/base"])),
        mover=part_from(tree["/geometry/mover"].attributes, _arrays(tree["/geometry/mover"])),
        columns=_columns(_arrays(tree["/quantities"])),
        designs=_designs(_arrays(tree["/designs"])),
        curves=_curves(tree["/curves"]),
        history=_history(_arrays(tree["/history"])),
        warnings=tuple(str(line) for line in json.loads(str(root["warnings_json"]))),
        state={item.name: item.data for item in tree["/state"].variables if item.dims != (item.name,)},
        provenance={name: str(value) for name, value in tree["/provenance"].attributes.items()},
        verification=None if verification is None else json.loads(str(verification.attributes["json"])),
    )


def _arrays(group: Group) -> dict[str, NDArray[Any]]:
    return {variable.name: variable.data for variable in group.variables}


def _geometry_groups(run: Run) -> list[Group]:
    groups = []
    for name, part in (("base", run.base), ("mover", run.mover)):
        attributes, variables = part_variables(part)
        groups.append(Group(f"/geometry/{name}", attributes, variables))
    return groups


def _design_variables(run: Run) -> tuple[Variable, ...]:
    designs, count = run.designs, len(run.designs)
    requires = len({column.entry for column in run.columns if column.kind != "improve"})
    flags = {"flag_values": np.array([-1, 0, 1], np.int8), "flag_meanings": "minus_z unmagnetized plus_z"}
    return (
        _index("design", count),
        Variable("column", strings(column.label for column in run.columns), ("column",)),
        _index("require", requires),
        *_pattern_scales("base", run.base),
        *_pattern_scales("mover", run.mover),
        Variable("id", strings(design.id for design in designs), ("design",)),
        Variable("origin", strings(design.origin for design in designs), ("design",)),
        _flags("feasible", [design.feasible for design in designs]),
        Variable("worst_margin", np.array([design.worst_margin for design in designs], float), ("design",), "1"),
        _flags("on_front", [design.on_front for design in designs]),
        Variable("base", _stack([d.base for d in designs], run.base), ("design", "base_y", "base_x"), "1", flags),
        Variable("mover", _stack([d.mover for d in designs], run.mover), ("design", "mover_y", "mover_x"), "1", flags),
        Variable("values", _rows([d.values for d in designs], len(run.columns)), ("design", "column"), PER_COLUMN),
        Variable("margins", _rows([d.margins for d in designs], requires), ("design", "require"), "1"),
    )


def _pattern_scales(name: str, part: Part) -> tuple[Variable, Variable]:
    y, x = part.y, part.x
    return Variable(f"{name}_y", y, (f"{name}_y",), "m"), Variable(f"{name}_x", x, (f"{name}_x",), "m")


def _index(name: str, count: int) -> Variable:
    return Variable(name, np.arange(count, dtype=np.int64), (name,), "1")


def _flags(name: str, values: list[bool]) -> Variable:
    # bytes marked as bool: an HDF5 enum would read as bool through one netCDF engine and as int8 through the other
    return Variable(name, np.array(values, np.int8), ("design",), "1", {"dtype": "bool"})


def _stack(patterns: list[NDArray[np.int8]], part: Part) -> NDArray[np.int8]:
    return np.array(patterns, np.int8).reshape((len(patterns), *part.shape))


def _rows(rows: list[NDArray[np.float64]], width: int) -> NDArray[np.float64]:
    return np.array(rows, np.float64).reshape((len(rows), width))


def _designs(data: Mapping[str, NDArray[Any]]) -> tuple[Design, ...]:
    return tuple(
        Design(
            id=str(data["id"][n]),
            origin=str(data["origin"][n]),
            base=data["base"][n],
            mover=data["mover"][n],
            values=data["values"][n],
            margins=data["margins"][n],
            feasible=bool(data["feasible"][n]),
            worst_margin=float(data["worst_margin"][n]),
            on_front=bool(data["on_front"][n]),
        )
        for n in range(len(data["id"]))
    )


def _column_variables(columns: tuple[Column, ...]) -> tuple[Variable, ...]:
    def text(name: str, words: list[str]) -> Variable:
        return Variable(name, strings(words), ("column",))

    def number(name: str, numbers: list[float | None]) -> Variable:
        data = np.array([np.nan if value is None else value for value in numbers], np.float64)
        return Variable(name, data, ("column",), PER_COLUMN)

    return (
        text("column", [column.label for column in columns]),
        text("name", [column.name for column in columns]),
        text("unit", [SI_NAMES[column.unit] for column in columns]),
        text("spec_unit", [column.unit for column in columns]),
        text("label", [column.label for column in columns]),
        text("kind", [column.kind for column in columns]),
        text("sense", [column.sense or column.kind for column in columns]),
        text("characteristic", [column.id for column in columns]),
        Variable("entry", np.array([column.entry for column in columns], np.int64), ("column",), "1"),
        number("target", [column.bound for column in columns]),
        number("within", [column.within for column in columns]),
    )


def _columns(data: Mapping[str, NDArray[Any]]) -> tuple[Column, ...]:
    def known(name: str, n: int) -> float | None:
        value = float(data[name][n])
        return None if np.isnan(value) else value

    columns = []
    for n in range(len(data["name"])):
        kind = cast(Literal["at_least", "at_most", "equal_to", "improve"], str(data["kind"][n]))
        columns.append(
            Column(
                entry=int(data["entry"][n]),
                name=str(data["name"][n]),
                label=str(data["label"][n]),
                unit=str(data["spec_unit"][n]),
                kind=kind,
                bound=known("target", n),
                within=known("within", n),
                sense=str(data["sense"][n]) if kind == "improve" else "",
                id=str(data["characteristic"][n]),
            )
        )
    return tuple(columns)


def _curve_variables(run: Run) -> tuple[Variable, ...]:
    scales: dict[str, Variable] = {"design": _index("design", len(run.designs))}
    curves = []
    for name, curve in sorted(run.curves.items()):
        scale = Variable(
            curve.scale_name, curve.scale, (curve.scale_name,), SI_NAMES[curve.scale_unit],
            {"spec_unit": curve.scale_unit},
        )  # fmt: skip
        known = scales.setdefault(curve.scale_name, scale)
        if not np.array_equal(known.data, curve.scale):
            message = f"curve {name!r} must share its scale {curve.scale_name!r} with the other curves over it"
            raise ValueError(message)
        attributes = {"spec_unit": curve.unit}
        curves.append(Variable(name, curve.values, ("design", curve.scale_name), SI_NAMES[curve.unit], attributes))
    return (*scales.values(), *curves)


def _curves(group: Group) -> dict[str, Curve]:
    by_name = {variable.name: variable for variable in group.variables}
    curves = {}
    for name, variable in by_name.items():
        if len(variable.dims) != 2:
            continue
        scale = by_name[variable.dims[1]]
        curves[name] = Curve(
            scale_name=scale.name,
            scale=scale.data,
            scale_unit=str(scale.attributes["spec_unit"]),
            values=variable.data,
            unit=str(variable.attributes["spec_unit"]),
        )
    return curves


def _history_variables(history: NDArray[np.float64]) -> tuple[Variable, ...]:
    rows = np.asarray(history, np.float64).reshape((-1, 2))
    return (
        _index("row", len(rows)),
        Variable("evaluations", rows[:, 0].astype(np.int64), ("row",), "1"),
        Variable("best", rows[:, 1].copy(), ("row",), "1"),
    )


def _history(data: Mapping[str, NDArray[Any]]) -> NDArray[np.float64]:
    return np.stack([data["evaluations"].astype(np.float64), data["best"]], axis=1)


def _state_variables(state: Mapping[str, NDArray[Any]]) -> tuple[Variable, ...]:
    # axes of state arrays have no meaning of their own, yet every axis gets a scale: netCDF readers warn otherwise
    variables: list[Variable] = []
    for name, data in sorted(state.items()):
        dims = tuple(f"{name}_axis{axis}" for axis in range(data.ndim))
        variables += [_index(dim, count) for dim, count in zip(dims, data.shape, strict=True)]
        variables.append(Variable(name, data, dims))
    return tuple(variables)
