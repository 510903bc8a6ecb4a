"""The [base] and [mover] tables: blank, lattice, material and pattern of a part."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import BeforeValidator, Discriminator, Field, Tag, ValidationInfo
from pydantic_core import PydanticCustomError

from ...models import material as grades
from ...models.errors import InputError
from .fields import TAG, Length, Outline, Size, Strict, whole
from .files import CellFile, FileName, cells_from_table, read_cells

PATTERN_WORDS = ("free", "plain-N", "plain-S")
MOVER_WORDS = ("matched", "same")
SYMMETRIES = ("none", "half-turn", "quarter-turn", "even-x", "even-y", "odd-x", "odd-y", "odd-xy")

PatternWord = Literal["free", "plain-N", "plain-S", "matched", "same"]


class MaterialSpec(Strict):
    """A magnet material by its numbers at 20 C; a designation becomes one of these."""

    name: str | None = Field(default=None, max_length=80, description="What the material is called.")
    remanence_T: float = Field(gt=0.0, le=2.0, description="Remanence Br at 20 C.")  # noqa: N815 (a unit)
    hcj_kA_m: float | None = Field(default=None, gt=0.0, le=1e5, description="Coercivity of polarization.")  # noqa: N815
    hcb_kA_m: float | None = Field(default=None, gt=0.0, le=1e5, description="Coercivity of flux density.")  # noqa: N815
    recoil_permeability: float = Field(
        default=1.0, ge=1.0, le=10.0, description="Slope of the recoil line; 1 is rigid."
    )
    remanence_percent_per_C: float | None = Field(  # noqa: N815 (a unit)
        None, ge=-2.0, le=2.0, description="Change of Br a degree; needed away from 20 C."
    )
    source: str | None = Field(default=None, max_length=400, description="Where the numbers come from.")
    from_memory: bool = Field(default=False, description="The numbers were remembered, not read in their source.")

    def to_material(self) -> grades.Material:
        """Return the material in SI units."""
        percent = self.remanence_percent_per_C
        return grades.Material(
            name=self.name or "own table",
            remanence=self.remanence_T,
            hcb=None if self.hcb_kA_m is None else self.hcb_kA_m * 1e3,
            hcj=None if self.hcj_kA_m is None else self.hcj_kA_m * 1e3,
            recoil_permeability=self.recoil_permeability,
            remanence_temperature_coefficient=None if percent is None else percent / 100.0,
            source=self.source or "the spec",
            from_memory=self.from_memory,
        )


def _rounded(value: float | None, factor: float) -> float | None:
    # Twelve digits: what a conversion of decimal numbers adds beyond them is noise.
    return None if value is None else float(f"{value * factor:.12g}")


def _material_of(value: Any) -> Any:
    if not isinstance(value, str):
        return value
    try:
        grade = grades.lookup(value)
    except InputError as error:
        raise PydanticCustomError("polewright", "{text}", {"text": str(error)}) from None
    return MaterialSpec(
        name=grade.name,
        remanence_T=grade.remanence,
        hcj_kA_m=_rounded(grade.hcj, 1e-3),
        hcb_kA_m=_rounded(grade.hcb, 1e-3),
        recoil_permeability=grade.recoil_permeability,
        remanence_percent_per_C=_rounded(grade.remanence_temperature_coefficient, 100.0),
        source=grade.source,
        from_memory=grade.from_memory,
    )


def cells_or_word(value: Any, info: ValidationInfo, words: tuple[str, ...], *, free_allowed: bool) -> Any:
    """Turn a file's name into its cells and leave the ``words`` as they are.

    Args:
        value: What the spec gives.
        info: Its context holds the spec's ``folder``, and ``resolved`` when cells may stand in the spec itself.
        words: Words that are no file.
        free_allowed: May a field of the file be empty?
    """
    if isinstance(value, CellFile) or (isinstance(value, str) and value in words):
        return value
    context = info.context or {}
    try:
        if isinstance(value, dict) and context.get("resolved"):
            return cells_from_table(value)
        if isinstance(value, str) and value.lower().endswith(".csv") and not context.get("resolved"):
            return read_cells(value, context["folder"], free_allowed=free_allowed)
    except InputError as error:
        raise PydanticCustomError("polewright", "{text}", {"text": str(error)}) from None
    raise PydanticCustomError("polewright_word", "a word", {"words": [*words, "a file name that ends in .csv"]})


def _pattern_of(value: Any, info: ValidationInfo) -> Any:
    return cells_or_word(value, info, (*PATTERN_WORDS, *MOVER_WORDS), free_allowed=False)


def _fixed_of(value: Any, info: ValidationInfo) -> Any:
    return cells_or_word(value, info, ("none",), free_allowed=True)


class PartSpec(Strict):
    """What parts of every shape share; lengths in mm."""

    shape: str
    thickness_mm: Length = Field(description="Thickness of the magnet, without coating.")
    material: Annotated[
        MaterialSpec, BeforeValidator(_material_of, json_schema_input_type=Literal[tuple(grades.GRADES)] | MaterialSpec)
    ] = Field(description="A grade by its open-standard designation, or a table of numbers.")
    coating_um: float = Field(
        default=0.0, ge=0.0, le=1e6, description="Coating on every surface; gaps are between coatings."
    )
    lattice: Literal["square"] = Field(default="square", description="How the face is divided into cells.")
    cell_mm: Length = Field(description="Cell pitch.")
    pole_width_min_mm: Length = Field(
        default_factory=lambda data: data["cell_mm"], description="Narrowest pole that can be made; default: cell_mm."
    )
    fixed: Annotated[
        Literal["none"] | CellFile, BeforeValidator(_fixed_of, json_schema_input_type=Literal["none"] | FileName)
    ] = Field(default="none", description="A CSV with -1, 0 or 1 in the cells that are given and nothing where free.")
    levels: Annotated[Literal[2], BeforeValidator(whole)] = Field(default=2, description="2: N and S.")
    symmetry: Literal["none", "half-turn", "quarter-turn", "even-x", "even-y", "odd-x", "odd-y", "odd-xy"] = Field(
        default="none", description="Symmetry of the pattern."
    )
    pattern: Annotated[
        PatternWord | CellFile, BeforeValidator(_pattern_of, json_schema_input_type=PatternWord | FileName)
    ] = Field(
        default="free", description="Free, plain, a CSV of -1, 0, 1 (lowest y first); a mover's: matched or same."
    )

    @property
    def is_given(self) -> bool:
        """Is the pattern known from the spec alone, without the other part's?"""
        return isinstance(self.pattern, CellFile) or self.pattern in ("plain-N", "plain-S")


class RectanglePart(PartSpec):
    """A rectangle."""

    shape: Literal["rectangle"]
    size_mm: Size = Field(description="[x, y]")


class DiscPart(PartSpec):
    """A round disc."""

    shape: Literal["disc"]
    diameter_mm: Length


class RingPart(PartSpec):
    """A flat ring."""

    shape: Literal["ring"]
    outer_mm: Length = Field(description="Outer diameter.")
    inner_mm: Length = Field(description="Inner diameter.")


class PolygonPart(PartSpec):
    """A polygon, with holes if wanted."""

    shape: Literal["polygon"]
    outline_mm: Outline = Field(description="Corners [x, y], or a list of loops of corners: the outer one, then holes.")

    @property
    def loops_mm(self) -> tuple[tuple[tuple[float, float], ...], ...]:
        """The loops, outer first, each a tuple of corners (x, y) in mm."""
        if isinstance(self.outline_mm[0][0], tuple):
            return self.outline_mm
        return (self.outline_mm,)


SHAPES: dict[str, type[PartSpec]] = {
    "rectangle": RectanglePart,
    "disc": DiscPart,
    "ring": RingPart,
    "polygon": PolygonPart,
}
SHAPE_KEYS = {shape: sorted(set(model.model_fields) - set(PartSpec.model_fields)) for shape, model in SHAPES.items()}


def _shape_of(value: Any) -> Any:
    shape = value.get("shape") if isinstance(value, dict) else getattr(value, "shape", None)
    return TAG + shape if isinstance(shape, str) else shape


if TYPE_CHECKING:
    AnyPart = RectanglePart | DiscPart | RingPart | PolygonPart
else:
    AnyPart = Annotated[
        Annotated[RectanglePart, Tag(TAG + "rectangle")]
        | Annotated[DiscPart, Tag(TAG + "disc")]
        | Annotated[RingPart, Tag(TAG + "ring")]
        | Annotated[PolygonPart, Tag(TAG + "polygon")],
        Discriminator(_shape_of),
    ]
