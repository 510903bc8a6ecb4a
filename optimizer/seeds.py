"""One seed tree: every random stream of a run is a named child of the run's seed."""

from __future__ import annotations

import zlib

import numpy as np


def generator(seed: int, *names: str | int) -> np.random.Generator:
    """The random stream of a named place in the run; equal names give equal streams, whatever ran before."""
    keys = [zlib.crc32(name.encode()) if isinstance(name, str) else name for name in names]
    return np.random.Generator(np.random.PCG64(np.random.SeedSequence(seed, spawn_key=keys)))
