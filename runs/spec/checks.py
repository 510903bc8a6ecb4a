"""What must fit together in a spec: size and cells, files and masks, symmetry, base and mover, material."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ...models.blank import Blank
from ...models.errors import InputError, Issue
from ...models.material import REFERENCE_C, remanence_at
from ...models.part import Part
from ...models.symmetry import IMAGES
from ...models.units import MU0
from .document import Conditions, Search
from .files import CellFile
from .geometry import blank_of
from .parts import AnyPart, MaterialSpec, RectanglePart, RingPart

MOST_CELLS = 65_536
# Data sheets round: a coercivity may stand this much above Br/mu0.
_ROUNDING = 1.005


def check_part(name: str, spec: AnyPart, conditions: Conditions | None) -> tuple[list[Issue], Part | None]:
    """Check one part by itself.

    Args:
        name: "base" or "mover".
        spec: The part.
        conditions: The spec's conditions, None where they are wrong themselves.

    Returns:
        All that is wrong, and the part when its cells can be counted (remanence at 20 C).
    """
    issues = list(_material(name, spec.material, conditions))
    issues += _pattern_alone(name, spec)
    if isinstance(spec, RingPart) and spec.inner_mm >= spec.outer_mm:
        received = f"received inner_mm = {spec.inner_mm:g} and outer_mm = {spec.outer_mm:g}"
        return [*issues, Issue(f"must be smaller than outer_mm, {received}", f"{name}.inner_mm")], None
    try:
        blank = blank_of(spec)
    except InputError as error:
        return [*issues, Issue(str(error), f"{name}.{_size_key(spec)}")], None
    found = list(_size(name, spec, blank))
    part = None if found else _cells(name, spec, blank, found)
    issues += found
    if part is not None:
        issues += _file(name, "pattern", spec.pattern, part)
        issues += _file(name, "fixed", spec.fixed, part)
        issues += _symmetry(name, spec, part)
    return issues, part


def _size_key(spec: AnyPart) -> str:
    match spec:
        case RectanglePart():
            return "size_mm"
        case RingPart():
            return "outer_mm"
        case _:
            return "diameter_mm" if spec.shape == "disc" else "outline_mm"


def _material(name: str, material: MaterialSpec, conditions: Conditions | None) -> Iterator[Issue]:
    hcb, hcj, path = material.hcb_kA_m, material.hcj_kA_m, f"{name}.material"
    if hcb is not None and hcj is not None and hcj < hcb:
        yield Issue(f"must be at least hcb_kA_m, received {hcj:g} and hcb_kA_m = {hcb:g}; swapped?", f"{path}.hcj_kA_m")
    most = material.remanence_T / MU0 / 1e3
    if hcb is not None and hcb > most * _ROUNDING:
        received = f"received {hcb:g} with remanence_T = {material.remanence_T:g}"
        yield Issue(f"must be at most Br/mu0 = {most:.0f} kA/m, {received}", f"{path}.hcb_kA_m")
    if conditions is None or conditions.temperature_C == REFERENCE_C:
        return
    try:
        remanence = remanence_at(material.to_material(), conditions.temperature_C)
    except InputError as error:
        yield Issue(str(error), path)
        return
    if not 0.0 < remanence <= 2.0:
        yield Issue(
            f"must leave a remanence between 0 and 2 T at conditions.temperature_C = {conditions.temperature_C:g}, "
            f"received {remanence:.3g} T; change the temperature or remanence_percent_per_C",
            path,
        )


def _pattern_alone(name: str, spec: AnyPart) -> Iterator[Issue]:
    shown = spec.pattern.name if isinstance(spec.pattern, CellFile) else spec.pattern
    if name == "base" and shown in ("matched", "same"):
        yield Issue(
            f'"{shown}" is a pattern of the mover alone; the base is "free", plain or a CSV file', "base.pattern"
        )
    if spec.pattern == "free":
        return
    for key, value in (("symmetry", spec.symmetry), ("fixed", spec.fixed)):
        if value != "none":
            received = f'received pattern = "{shown}", which leaves nothing to choose'
            yield Issue(f'needs pattern = "free", {received}; drop it', f"{name}.{key}")


def _size(name: str, spec: AnyPart, blank: Blank) -> Iterator[Issue]:
    xmin, xmax, ymin, ymax = blank.bounds
    x, y = (xmax - xmin) * 1e3, (ymax - ymin) * 1e3
    size = f"the blank is {x:g} x {y:g} mm"
    if spec.cell_mm > min(x, y) * (1.0 + 1e-9):
        yield Issue(f"must fit into the blank, received {spec.cell_mm:g}: {size}; use smaller cells", f"{name}.cell_mm")
        return
    if spec.pole_width_min_mm < spec.cell_mm:
        received = f"received {spec.pole_width_min_mm:g} and cell_mm = {spec.cell_mm:g}"
        yield Issue(
            f"must be at least cell_mm, {received}; a pole is one cell wide or more: use smaller cells",
            f"{name}.pole_width_min_mm",
        )
    if spec.pole_width_min_mm > max(x, y) * (1.0 + 1e-9):
        yield Issue(
            f"must fit into the blank, received {spec.pole_width_min_mm:g}: {size}", f"{name}.pole_width_min_mm"
        )
    if (x / spec.cell_mm) * (y / spec.cell_mm) > 16.0 * MOST_CELLS:
        yield _too_many(name, f"about {x / spec.cell_mm * y / spec.cell_mm:.0f}")


def _too_many(name: str, count: str) -> Issue:
    return Issue(f"makes {count} cells, at most {MOST_CELLS} are possible; use larger cells", f"{name}.cell_mm")


def _cells(name: str, spec: AnyPart, blank: Blank, found: list[Issue]) -> Part | None:
    part = Part(blank, spec.cell_mm * 1e-3, spec.thickness_mm * 1e-3, spec.material.remanence_T, spec.coating_um * 1e-6)
    if part.cells > MOST_CELLS:
        found.append(_too_many(name, str(part.cells)))
    elif part.cells == 0:
        found.append(Issue("leaves no cell with its centre inside the outline; use smaller cells", f"{name}.cell_mm"))
    return None if found else part


def _file(name: str, key: str, cells: CellFile | str, part: Part) -> Iterator[Issue]:
    if not isinstance(cells, CellFile):
        return
    path, (ny, nx) = f"{name}.{key}", part.shape
    if cells.shape != part.shape:
        yield Issue(
            f'file "{cells.name}" must hold {ny} lines of {nx} fields as the part has {nx} x {ny} cells (x, y), '
            f"received {cells.shape[0]} lines of {cells.shape[1]}",
            path,
        )
        return
    outside = (cells.values != 0) & ~part.mask
    if outside.any():
        row, column = (int(index[0]) for index in np.nonzero(outside))
        yield Issue(
            f'file "{cells.name}" must be 0 outside the blank, received {int(cells.values[row, column])} in row '
            f"{row + 1}, field {column + 1} ({int(outside.sum())} such cell(s)); rows count from the lowest y",
            path,
        )


def _symmetry(name: str, spec: AnyPart, part: Part) -> Iterator[Issue]:
    if spec.symmetry == "none" or spec.pattern != "free":
        return
    path, (ny, nx) = f"{name}.symmetry", part.shape
    if spec.symmetry == "quarter-turn" and ny != nx:
        yield Issue(f"quarter-turn needs as many cells along x as along y, received {nx} x {ny}", path)
        return
    fixed = spec.fixed if isinstance(spec.fixed, CellFile) and spec.fixed.shape == part.shape else None
    values = fixed.values if fixed else np.zeros(part.shape, np.int8)
    given = fixed.given if fixed else np.zeros(part.shape, np.bool_)
    index = np.arange(ny * nx).reshape(ny, nx)
    for move, sign in IMAGES[spec.symmetry]:
        if not np.array_equal(move(part.mask), part.mask):
            yield Issue(
                f"{spec.symmetry} needs a blank of the same symmetry, which this outline is not; use another", path
            )
            return
        blocked = (move(index) == index) & part.mask & ~(given & (values == 0))
        if sign < 0 and blocked.any():
            yield Issue(
                f"{spec.symmetry} needs an even number of cells across its axis, as a cell on the axis would have to "
                f"be its own opposite: received {nx} x {ny} cells (x, y); change the size or cell_mm by one cell",
                path,
            )
            return
        if (given & move(given) & (values != sign * move(values))).any():
            yield Issue(
                f"{spec.symmetry} contradicts the fixed cells: two cells that it ties together are fixed otherwise; "
                "change one of the two keys",
                path,
            )
            return


def check_pair(base: AnyPart, mover: AnyPart, parts: tuple[Part | None, Part | None]) -> list[Issue]:
    """Check that the mover fits the base; ``parts`` are the two as cells, None where wrong themselves."""
    issues = []
    if mover.cell_mm != base.cell_mm:
        issues.append(
            Issue(
                f"must equal base.cell_mm: the force between lattices of different pitch is not computed, received "
                f"{mover.cell_mm:g} and base.cell_mm = {base.cell_mm:g}",
                "mover.cell_mm",
            )
        )
    if mover.pattern in ("matched", "same") and parts[0] is not None and parts[1] is not None:
        issues += _copied(base, mover, parts[0], parts[1])
    return issues


def _copied(base: AnyPart, mover: AnyPart, base_part: Part, mover_part: Part) -> Iterator[Issue]:
    word, path = str(mover.pattern), "mover.pattern"
    if base_part.shape != mover_part.shape:
        sizes = " and ".join(f"{part.shape[1]} x {part.shape[0]}" for part in (mover_part, base_part))
        yield Issue(f'"{word}" needs the cells of the base, received {sizes} cells (x, y) on mover and base', path)
    elif word == "matched" and not np.array_equal(mover_part.mask, base_part.mask):
        yield Issue('"matched" needs a mover of the same outline as the base, which it is not', path)
    elif word == "same" and not np.array_equal(mover_part.mask, base_part.mask[::-1]):
        yield Issue('"same" needs the outline of the base turned over about the x axis (y becomes -y) as the mover\'s, '
                    "which it is not; give the mover that outline", path)  # fmt: skip
    if word != "same":
        return
    for key in ("thickness_mm", "material", "coating_um"):
        if getattr(mover, key) != getattr(base, key):
            hint = 'drop it or use "matched"'
            yield Issue(f'must be as in [base] since pattern = "same" is an identical part; {hint}', f"mover.{key}")


def check_start(search: Search, base: AnyPart, part: Part | None) -> list[Issue]:
    """Check that the start pattern fits the base."""
    if search.start is None:
        return []
    if base.pattern != "free":
        return [
            Issue('needs base.pattern = "free": it is the base that the search begins from; drop it', "search.start")
        ]
    return [] if part is None else list(_file("search", "start", search.start, part))
