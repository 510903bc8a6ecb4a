"""Example specs: commented, and invented from the first line to the last."""

from __future__ import annotations

import tomllib
from importlib.resources import files

from ...models.errors import InputError

NAMES = ("hatch", "hover", "instrument", "fixture")


def example_text(name: str) -> str:
    """Return the TOML text of an example.

    Raises:
        InputError: There is no such example.
    """
    if name not in NAMES:
        raise InputError(f'example must be one of {", ".join(NAMES)}, received "{name}"')
    return (files(__package__) / f"{name}.toml").read_text(encoding="utf-8")


def titles() -> dict[str, str]:
    """Return the title of every example by its name."""
    return {name: tomllib.loads(example_text(name))["title"] for name in NAMES}
