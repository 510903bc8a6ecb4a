"""Files of one design for the people who make and check it: patterns and curves as CSV, and a README.

A pattern file reads back as the ``pattern`` of a spec: its header lines are comments there.
"""

from __future__ import annotations

import textwrap
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from .. import __version__
from ..models.errors import InputError
from ..models.part import Part
from ..models.units import from_si
from .curves import lateral_path
from .judged import bound_text, judge, numbers, percent
from .output import put_in_place
from .records import Curve, Design, Run
from .report.cautions import FRAME, GUIDE, IDEAL, caution_lines
from .report.faces import size_words
from .spec import spec_from_json

_FACES = {
    "base": (
        "on the base's mating face 1 shows N, -1 shows S, 0 is unmagnetized or off the blank",
        "seen from +z, looking down on the base's mating face: x right, y up; first line = lowest y, at the bottom",
    ),
    "mover": (
        "on the mover's mating face 1 shows S, -1 shows N, 0 is unmagnetized or off the blank",
        "seen from +z, looking down on the mover's back: x right, y up; first line = lowest y, at the bottom. "
        "Turned over about x to look at its mating face: first line at the top",
    ),
}


def export_design(run: Run, design: Design, folder: Path, *, replace: bool = False) -> list[Path]:
    """Write the files of ``design`` into ``folder`` and return their paths.

    Args:
        run: The run.
        design: One of its designs.
        folder: Made when it does not exist.
        replace: May files in an existing folder be overwritten? Others in it are left alone.

    Raises:
        InputError: When the folder exists and may not be written to, or the file system refuses.
    """
    if folder.exists() and not folder.is_dir():
        raise InputError("is a file, a folder is needed; name another with -o", str(folder))
    if folder.exists() and not replace:
        raise InputError("exists and is not overwritten; add --replace, or name another folder with -o", str(folder))
    try:
        folder.mkdir(exist_ok=True)
    except OSError as error:
        raise InputError(f"cannot be made: {error.strerror or error}", str(folder)) from error
    files = files_of(run, design)
    for name, text in files.items():
        put_in_place(folder / name, text.encode("utf-8"))
    return [folder / name for name in files]


def files_of(run: Run, design: Design) -> dict[str, str]:
    """Return the text of every file of ``design`` by file name."""
    position = next(n for n, other in enumerate(run.designs) if other.id == design.id)
    files = {
        "base.csv": _pattern(run, design, "base", run.base, design.base),
        "mover.csv": _pattern(run, design, "mover", run.mover, design.mover),
    }
    for name, curve in sorted(run.curves.items()):
        files[f"{name}.csv"] = _curve(name, curve, position)
    files["README.txt"] = _readme(run, design, list(files))
    return files


def _pattern(run: Run, design: Design, name: str, part: Part, pattern: NDArray[np.int8]) -> str:
    sign, view = _FACES[name]
    ny, nx = part.shape
    cell, rim_x, rim_y = (from_si(length, "mm") for length in (part.cell, *part.rim))
    x, y = from_si(float(part.x[0]), "mm"), from_si(float(part.y[0]), "mm")
    header = (
        f"pole pattern of the {name}, design {design.id} of: {_one_line(run.title) or 'untitled'}",
        f"made by polewright {__version__} from spec sha256 {run.spec_sha256}",
        f"values: polarity of each cell, no unit: 1 magnetized along +z, -1 along -z; {sign}",
        f"orientation: {view}",
        "frame: that of the base in the assembled pair; its origin is the centre of the blank's bounding box",
        f"cells: {nx} along x (fields of a line), {ny} along y (lines), {cell:.6g} mm square; the first value is the "
        f"cell centred at x = {x:.6g} mm, y = {y:.6g} mm",
        f"blank: {size_words(part.blank)}, unmagnetized rim {rim_x:.6g} mm in x and {rim_y:.6g} mm in y (both sides "
        "together)",
        f"thickness: {from_si(part.thickness, 'mm'):.6g} mm without coating; coating {from_si(part.coating, 'um'):.6g} "
        f"um; remanence {part.remanence:.6g} T",
        IDEAL,
        "cautions: see README.txt; strong magnets pinch, shatter, and disturb implants",
    )
    lines = [f"# {line}" for line in header]
    lines += [",".join(str(int(value)) for value in row) for row in pattern]
    return "\n".join(lines) + "\n"


def _curve(name: str, curve: Curve, position: int) -> str:
    ordinate = name.removesuffix(f"_{curve.scale_name}")
    lines = [f"{curve.scale_name}_{_unit_word(curve.scale_unit)},{ordinate}_{_unit_word(curve.unit)}"]
    scale = from_si(curve.scale, curve.scale_unit)
    values = from_si(curve.values[position], curve.unit)
    lines += [f"{x:.9g},{value:.9g}" for x, value in zip(scale, values, strict=True)]
    return "\n".join(lines) + "\n"


def _readme(run: Run, design: Design, names: list[str]) -> str:
    title = _one_line(run.title) or "untitled"
    lines = [title, "=" * len(title), ""]
    lines += _wrapped(f"Design {design.id} ({design.origin}), {_verdict(design)}")
    lines += _wrapped(f"polewright {__version__}, spec sha256 {run.spec_sha256}, seed {run.seed}.")
    lines += ["", "Files", "-----", *(f"{name:<16}{_purpose(run, name)}" for name in names)]
    lines += ["", "Orientation", "-----------", *_wrapped(FRAME)]
    lines += _wrapped(
        "The mover's file is in the same frame, so equal places of the two files lie over each other in the pair. To "
        "see the mover's mating face, turn it over about the x axis: its first line is then at the top and 1 shows S."
    )
    lines += _wrapped("Forces act on the mover: positive pushes the parts apart, negative pulls them together.")
    lines += ["", "Required and reached", "--------------------"]
    for entry in judge(run, design):
        unit = "" if entry.unit == "1" else f" {entry.unit}"
        line = f"- {_one_line(entry.label)}: asked {bound_text(entry)}{unit}, reached {numbers(entry.values)}{unit}"
        if entry.kind != "improve":
            line += f"; {'met' if entry.ok else 'MISSED'}, margin {percent(entry.margin)}"
        lines += _wrapped(line)
    lines += ["", "What the numbers assume", "-----------------------", *_wrapped(IDEAL)]
    if any(column.name == "stand_off" for column in run.columns):
        lines += _wrapped(GUIDE)
    for warning in run.warnings:
        lines += _wrapped(f"Warning: {_one_line(warning)}")
    lines += ["", "Cautions", "--------"]
    for line in caution_lines():
        lines += _wrapped(line)
    return "\n".join(lines) + "\n"


def _verdict(design: Design) -> str:
    return "meets every requirement." if design.feasible else "MISSES a requirement."


def _purpose(run: Run, name: str) -> str:
    if name in ("base.csv", "mover.csv"):
        return "pole pattern; reads back as the pattern file of a spec"
    if name == "force_gap.csv":
        return "axial force over the gap, mover centred"
    gap, _, along = lateral_path(spec_from_json(run.spec_json))
    way = ", ".join(f"{part:.3g}" for part in along)
    return f"restoring force over the offset along ({way}) at {from_si(gap, 'mm'):g} mm gap, positive to the centre"


def _unit_word(unit: str) -> str:
    return unit.replace("/", "_per_").replace("%", "percent").replace(" ", "_")


def _one_line(text: str) -> str:
    # a line break in a title would end the comment that holds it
    return " ".join(text.split())


def _wrapped(text: str) -> list[str]:
    return textwrap.wrap(text, 100, subsequent_indent="  " if text.startswith("- ") else "")
