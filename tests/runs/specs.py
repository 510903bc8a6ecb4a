"""Small specs for tests of whole runs, and what two archives may differ in."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import h5py
import numpy as np

ROOT = Path(__file__).resolve().parents[2]
ENVIRONMENT = {**os.environ, "PYTHONPATH": str(ROOT / ".ci" / "path")}
"""Where a process of its own finds the package, installed or not."""

PART = """shape = "rectangle"
size_mm = [{size}, {size}]
thickness_mm = 3.0
material = {{ remanence_T = 1.3 }}
cell_mm = {cell}
"""
NEAR_FAR = """
[[require]]
id = "K1"
quantity = "holding_force"
gap_mm = 0.3
at_least = {near}

[[require]]
quantity = "axial_force"
gap_mm = [4.0, 5.0]
at_least = {far}
"""


def spec_text(
    cells: int = 3, *, cell: float = 2.0, base: str = "", mover: str = "", wishes: str | None = None, search: str = ""
) -> str:
    """A spec of two square plates; by default two bounds that a pair of 3 x 3 cells can meet, which is enumerated."""
    wanted = NEAR_FAR.format(near=4.0, far=0.1) if wishes is None else wishes
    return (
        'spec_version = 1\ntitle = "Invented plates"\n\n[base]\n'
        + PART.format(size=cells * cell, cell=cell)
        + f'{base}\n[mover]\nlike = "base"\n{mover}\n{wanted}\n[search]\n{search}\n'
    )


# two stages and more of a search that cannot be enumerated, in a few seconds
SEARCHED = spec_text(5, cell=1.0, wishes=NEAR_FAR.format(near=2.0, far=0.03), search="starts = 4\nevaluations = 40000")


def write(path: Path, text: str) -> Path:
    """Write a spec and return its path."""
    path.write_text(text, encoding="utf-8")
    return path


def content(path: Path) -> dict[str, Any]:
    """All of an archive outside /provenance: attributes as they are, datasets as dtype, shape and bytes."""
    out: dict[str, Any] = {}

    def note(name: str, item: h5py.Group | h5py.Dataset) -> None:
        if name.split("/")[0] == "provenance":
            return
        for key, value in item.attrs.items():
            if key not in ("DIMENSION_LIST", "REFERENCE_LIST"):  # object references: addresses in the file
                out[f"{name}@{key}"] = value.tobytes() if isinstance(value, np.ndarray) else value
        if isinstance(item, h5py.Dataset):
            data = item[...]
            raw = data.tolist() if data.dtype.kind == "O" else data.tobytes()
            out[name] = (str(data.dtype), data.shape, raw)

    with h5py.File(path, "r") as file:
        note("", file)
        file.visititems(note)
    return out


def differences(one: Path, other: Path) -> list[str]:
    """Names of what two archives hold differently outside /provenance."""
    left, right = content(one), content(other)
    return sorted(key for key in {*left, *right} if left.get(key) != right.get(key))
