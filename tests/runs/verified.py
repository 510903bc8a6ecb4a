"""Small runs of given patterns, judged by the problem itself, for the tests of ``verify``."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from polewright.runs.curves import curves_of
from polewright.runs.records import Design, Run
from polewright.runs.resolve import columns_of, problem_of
from polewright.runs.spec import Spec, parse_spec

HEAD = """
spec_version = 1
title = "Verified fixture (invented)"
[base]
shape = "rectangle"
size_mm = {size}
thickness_mm = 3.0
material = {{remanence_T = 1.3}}
cell_mm = {cell}
[mover]
like = "base"
thickness_mm = 2.0
"""


def spec_of(body: str, size: str = "[8.0, 6.0]", cell: float = 1.0, head: str = HEAD) -> Spec:
    """Return a spec of a small pair with the given requires, improves and tolerances."""
    return parse_spec(head.format(size=size, cell=cell) + body)


def require(quantity: str, bound: str = "at_least = -1e6", **keys: object) -> str:
    """Return a [[require]] as TOML."""
    lines = [f"{key} = {_toml(value)}" for key, value in keys.items()]
    return "\n".join(["[[require]]", f'quantity = "{quantity}"', *lines, bound, ""])


def run_of(spec: Spec, a: NDArray[np.int8], b: NDArray[np.int8], **values: NDArray[np.float64]) -> Run:
    """Return a run with one design of the given patterns; ``values`` stands in for what is reported."""
    problem = problem_of(spec)
    found = problem.exact(a, b)
    design = Design("d1", "given", a, b, values.get("values", found.values), found.margins, found.feasible,
                    found.worst_margin)  # fmt: skip
    return Run(
        title=spec.title, kind="design", spec_toml=spec.toml, spec_json=spec.resolved_json(), seed=spec.search.seed,
        stop_reason="given patterns", complete=True, evaluations=1, base=problem.base, mover=problem.mover,
        columns=columns_of(spec), designs=(design,), curves=curves_of(spec, problem, (design,)),
        history=np.zeros((0, 2)),
    )  # fmt: skip


def silent(share: float) -> None:
    """Tell nobody how much is done."""
    del share


def blocks(shape: tuple[int, int], seed: int, size: int = 2) -> NDArray[np.int8]:
    """Return a random pattern of square blocks of ``size`` cells."""
    rng = np.random.default_rng(seed)
    coarse = rng.choice([-1, 1], tuple(-(-count // size) for count in shape))
    return np.kron(coarse, np.ones((size, size), int))[: shape[0], : shape[1]].astype(np.int8)


def stripes(shape: tuple[int, int], width: int) -> NDArray[np.int8]:
    """Return stripes along y that alternate along x."""
    line = np.where((np.arange(shape[1]) // width) % 2 == 0, 1, -1)
    return np.broadcast_to(line, shape).astype(np.int8)


def _toml(value: object) -> str:
    return f'"{value}"' if isinstance(value, str) else str(value)
