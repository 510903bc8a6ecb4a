"""``polewright spec``: check a spec, print its JSON Schema, write an example."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from ..spec import Spec


@click.group("spec")
def command() -> None:
    """Check a spec, print its JSON Schema, write an example."""


@command.command("check")
@click.argument("file", metavar="SPEC", type=click.Path(path_type=Path))
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object to stdout instead.")
def check(file: Path, as_json: bool) -> None:
    """Validate SPEC; every error is reported at once, with its line."""
    from ..spec import load_spec

    spec = load_spec(file)
    if as_json:
        _print_checked(spec)
        return
    click.echo(f"{file}: valid", err=True)
    for line in _summary(spec):
        click.echo(f"  {line}", err=True)


@command.command("schema")
@click.option("--json", is_flag=True, hidden=True, expose_value=False)  # it is JSON anyway
def schema() -> None:
    """Print the JSON Schema of a spec to stdout, for editors."""
    from ..spec import json_schema

    click.echo(json.dumps(json_schema(), ensure_ascii=False, indent=2))


@command.command("example")
@click.argument("name", required=False)
@click.option(
    "-o", "output", type=click.Path(path_type=Path), metavar="FILE", help="File to write; NAME.toml otherwise."
)
@click.option("--replace", is_flag=True, help="Overwrite an existing file.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object to stdout instead of text.")
def example(name: str | None, output: Path | None, replace: bool, as_json: bool) -> None:
    """Write the commented example NAME; without a NAME, list the examples."""
    from ..examples import example_text, titles

    if name is None:
        _list(titles(), as_json)
        return
    from ..output import output_path, put_in_place

    text = example_text(name)
    path = output_path(output, f"{name}.toml", replace=replace)
    put_in_place(path, text.encode())
    if as_json:
        _print_object(file=str(path))
    click.echo(f"{path} written; next: polewright design {path}", err=True)


def _list(titles: dict[str, str], as_json: bool) -> None:
    if as_json:
        _print_object(examples=titles)
        return
    for name, title in titles.items():
        click.echo(f"{name:<12} {title}", err=True)


def _print_object(**more: Any) -> None:
    """Print the JSON object of a command that runs nothing: the keys of every result, and ``more``."""
    from ... import __version__

    nothing_run: dict[str, Any] = {
        "run": None,
        "stop_reason": "",
        "elapsed_s": 0.0,
        "evaluations": 0,
        "designs": [],
        "warnings": [],
    }
    head = {"polewright": __version__, "command": "spec", "spec_sha256": None, "status": "met"}
    click.echo(json.dumps(head | nothing_run | more, ensure_ascii=False, allow_nan=False, indent=2))


def _print_checked(spec: Spec) -> None:
    parts = {name: _part(spec, name) for name in ("base", "mover")}
    _print_object(
        spec_sha256=spec.sha256,
        parts=parts,
        requirements=len(spec.require),
        improvements=len(spec.improve),
        warnings=[
            f"{name}: the numbers of {part['material']} are from memory, not read in the standard"
            for name, part in parts.items()
            if part["from_memory"]
        ]
        + _notes(spec),
    )


def _part(spec: Spec, name: str) -> dict[str, Any]:
    from ..spec import part_of

    table = spec.base if name == "base" else spec.mover
    part = part_of(table, spec.conditions.temperature_C)
    return {
        "shape": table.shape,
        "cells_x": part.shape[1],
        "cells_y": part.shape[0],
        "cells": part.cells,
        "rim_mm": [round(rim * 1e3, 9) for rim in part.rim],
        "pattern": table.pattern if isinstance(table.pattern, str) else table.pattern.name,
        "material": table.material.name or "own table",
        "remanence_T": round(part.remanence, 9),
        "from_memory": table.material.from_memory,
    }


def _summary(spec: Spec) -> list[str]:
    lines = [f'title: "{spec.title}"'] if spec.title else []
    for name in ("base", "mover"):
        part = _part(spec, name)
        rim = "no rim" if max(part["rim_mm"]) < 1e-6 else f"rim {part['rim_mm'][0]:g} x {part['rim_mm'][1]:g} mm in all"
        lattice = f"{part['cells_x']} x {part['cells_y']} cells (x, y), {part['cells']} on the blank"
        lines.append(f"{name}: {part['shape']}, {lattice}, {rim}; pattern {part['pattern']}")
        lines.append(
            f"{name} material: {part['material']}, Br {part['remanence_T']:g} T at {spec.conditions.temperature_C:g} C"
            + (" (numbers from memory, not read in the standard)" if part["from_memory"] else "")
        )
    for kind, entries in (("required", spec.require), ("improved", spec.improve)):
        if entries:
            lines.append(f"{kind}: {', '.join(entry.quantity for entry in entries)}")
    return lines + [f"note: {note}" for note in _notes(spec)]


def _notes(spec: Spec) -> list[str]:
    """What a valid spec still has against it."""
    many = len(spec.improve)
    return [f"polewright design takes at most one improve, this spec has {many}"] if many > 1 else []
