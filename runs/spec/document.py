"""The spec as one strict, frozen document: what a user wrote, with every default filled in."""

from __future__ import annotations

import hashlib
import json
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, PrivateAttr, ValidationInfo

from .entries import AnyImprove, AnyRequire
from .fields import Strict, as_tuple, whole
from .files import CellFile, FileName
from .parts import AnyPart, cells_or_word

LARGEST_COUNT = 2**53


class Conditions(Strict):
    """How the pair is used."""

    temperature_C: float = Field(default=20.0, ge=-273.15, le=1000.0, description="Temperature of both magnets.")  # noqa: N815
    rotation: Literal["locked", "free"] = Field(default="locked", description="Is the mover held at its angle?")
    lateral: Literal["guided", "free"] = Field(default="guided", description="Is the mover held sideways?")


class Tolerances(Strict):
    """What scatter ``verify`` samples: half widths, 0 for none."""

    remanence_percent: float = Field(default=3.0, ge=0.0, lt=100.0)
    imbalance_percent: float = Field(default=2.0, ge=0.0, lt=100.0, description="N cells against S cells.")
    pole_position_mm: float = Field(default=0.15, ge=0.0, le=1e4)
    gap_mm: float = Field(default=0.05, ge=0.0, le=1e4)
    offset_mm: float = Field(default=0.1, ge=0.0, le=1e4)
    angle_deg: float = Field(default=0.5, ge=0.0, le=180.0)
    thickness_mm: float = Field(default=0.05, ge=0.0, le=1e4)
    samples: int = Field(default=500, ge=1, le=1_000_000)


def _start_of(value: Any, info: ValidationInfo) -> Any:
    return cells_or_word(value, info, (), free_allowed=False)


class Search(Strict):
    """How long and from where to search."""

    seed: int = Field(default=0, ge=0, le=LARGEST_COUNT, description="Seed of everything random.")
    starts: int = Field(default=32, ge=1, le=100_000, description="Starts of the gradient search.")
    evaluations: int = Field(default=200_000, ge=1, le=LARGEST_COUNT, description="Budget in evaluated pattern pairs.")
    budget_s: float | None = Field(
        default=None, gt=0.0, le=1e9, description="Cap in seconds; when it bites, not reproducible."
    )
    start: Annotated[CellFile | None, BeforeValidator(_start_of, json_schema_input_type=FileName)] = Field(
        default=None, description="A CSV pattern of the base to begin from as well."
    )


class Spec(Strict):
    """A validated spec; equal specs say the same and were given by the same text."""

    spec_version: Annotated[Literal[1], BeforeValidator(whole)]
    title: str = Field(default="", max_length=400)
    base: AnyPart
    mover: AnyPart
    conditions: Conditions = Conditions()
    tolerances: Tolerances = Tolerances()
    require: Annotated[tuple[AnyRequire, ...], BeforeValidator(as_tuple)] = Field(
        default=(), description="Hard bounds."
    )
    improve: Annotated[tuple[AnyImprove, ...], BeforeValidator(as_tuple)] = Field(
        default=(), description="Quantities to push."
    )
    search: Search = Search()

    _toml: str = PrivateAttr("")

    @property
    def toml(self) -> str:
        """The text as given, or "" for a spec read from JSON alone."""
        return self._toml

    @property
    def sha256(self) -> str:
        """SHA-256 of the text's UTF-8 bytes, in hexadecimal."""
        return hashlib.sha256(self._toml.encode()).hexdigest()

    @property
    def is_given(self) -> bool:
        """Are both patterns given, so that there is nothing to search?"""
        return self.base.is_given and self.mover.pattern != "free"

    def resolved_json(self) -> str:
        """Return the spec with every default, material and pattern file written out, as JSON in one line."""
        return json.dumps(self.model_dump(mode="json", exclude_none=True), ensure_ascii=False)
