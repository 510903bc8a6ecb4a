"""Arrays between two pages that must not be touched, and a process of their own for whoever touches them anyway.

XLA's CPU code for a padding fused with the arithmetic before it reads outside its operand (a crash, now and then). The
page before and the page after these arrays are forbidden, so that every such read is a crash.
"""

from __future__ import annotations

import ctypes
import mmap
import subprocess
import sys
from pathlib import Path

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray

_ROOT = Path(__file__).resolve().parent.parent
_FORBIDDEN = 0
_kept: list[mmap.mmap] = []


def count_for(cells: int, least: int = 4) -> int:
    """Return the size of a batch of float64 patterns of ``cells`` that fills whole pages."""
    return next(n for n in range(least, least + mmap.PAGESIZE) if n * cells * 8 % mmap.PAGESIZE == 0)


def guarded(values: NDArray[np.float64]) -> jax.Array:
    """Return an array without any copy whose neighbouring pages are forbidden; its bytes must fill whole pages."""
    size, page = values.nbytes, mmap.PAGESIZE
    if size % page:
        raise ValueError(f"the array must fill whole pages of {page} bytes; received {size} bytes")
    memory = mmap.mmap(-1, size + 2 * page)
    _kept.append(memory)  # forbidden or not, the pages must outlive what JAX holds of them
    start = ctypes.addressof(ctypes.c_char.from_buffer(memory))
    protect = ctypes.CDLL(None, use_errno=True).mprotect
    for at in (start, start + page + size):
        if protect(ctypes.c_void_p(at), ctypes.c_size_t(page), _FORBIDDEN) != 0:
            raise OSError(ctypes.get_errno(), "mprotect")
    inside = np.frombuffer(memory, np.float64, values.size, page).reshape(values.shape)
    inside[...] = values
    shared: jax.Array = jnp.from_dlpack(inside)
    if shared.unsafe_buffer_pointer() != inside.ctypes.data:
        raise RuntimeError("JAX copied the array: nothing is guarded")
    return shared


def run_apart(file: str, name: str) -> int:
    """Run the function ``name`` of a test file in a process of its own; its exit code, negative for a signal.

    The function must not be called test_*, so that only this finds it.
    """
    command = [sys.executable, "-m", "pytest", "-q", "-p", "no:cacheprovider", "-p", "no:faulthandler"]
    command += ["-o", f"python_functions={name}", file]
    return subprocess.run(command, cwd=_ROOT, check=False, capture_output=True).returncode
