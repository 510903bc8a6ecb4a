"""Tests run stricter than users do: float64, no silent rank promotion, the same examples every time."""

from __future__ import annotations

from importlib.util import find_spec

import hypothesis

# Same examples in every run and no clock: a slow machine must not fail a property.
hypothesis.settings.register_profile("polewright", derandomize=True, deadline=None)
hypothesis.settings.load_profile("polewright")

if find_spec("jax") is not None:
    import jax

    jax.config.update("jax_enable_x64", True)  # type: ignore[no-untyped-call]
    jax.config.update("jax_numpy_rank_promotion", "raise")  # type: ignore[no-untyped-call]
