"""The strict base of every spec model, and the kinds of value that its keys take."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag
from pydantic_core import PydanticKnownError

LONGEST_MM = 10_000.0
SHORTEST_MM = 0.001
LARGEST = 1e9
TAG = "#"
"""First letter of the names that pydantic puts into an error's location for a branch of a union; never a key."""


class Strict(BaseModel):
    """Unknown keys, wrong types, NaN and infinity are errors; nothing changes after construction."""

    model_config = ConfigDict(extra="forbid", frozen=True, strict=True, allow_inf_nan=False)


def as_tuple(value: Any) -> Any:
    """Return a list as a tuple: strict pydantic takes no list for one, and TOML has nothing but lists."""
    return tuple(value) if isinstance(value, list) else value


def whole(value: Any) -> Any:
    """Refuse true and 1.0 where a whole number is the only choice: to Python they equal 1."""
    if isinstance(value, bool | float):
        raise PydanticKnownError("int_type")
    return value


def _depth(value: Any) -> int:
    depth = 0
    while isinstance(value, list | tuple) and value:
        value, depth = value[0], depth + 1
    return depth if not isinstance(value, list | tuple) else depth + 1


def _plain_or_list(plain_depth: int) -> Any:
    def branch(value: Any) -> str:
        return TAG + "list" if _depth(value) > plain_depth else TAG + "one"

    return Discriminator(branch)


def one_or_list(item: Any, depth: int = 0) -> Any:
    """Return the type "one ``item`` or a list of them", where an item is itself a list ``depth`` deep."""
    several = Annotated[tuple[item, ...], BeforeValidator(as_tuple), Field(min_length=1)]
    return Annotated[Annotated[item, Tag(TAG + "one")] | Annotated[several, Tag(TAG + "list")], _plain_or_list(depth)]


def fixed_list(item: Any, count: int) -> Any:
    """Return the type "a list of exactly ``count`` items"."""
    items: Any = tuple.__class_getitem__((item,) * count)
    return Annotated[items, BeforeValidator(as_tuple)]


Length = Annotated[float, Field(ge=SHORTEST_MM, le=LONGEST_MM)]
Coordinate = Annotated[float, Field(ge=-LONGEST_MM, le=LONGEST_MM)]
Number = Annotated[float, Field(ge=-LARGEST, le=LARGEST)]
Positive = Annotated[float, Field(gt=0.0, le=LARGEST)]
Size = Annotated[tuple[Length, Length], BeforeValidator(as_tuple)]
Pair = Annotated[tuple[Coordinate, Coordinate], BeforeValidator(as_tuple)]
Loop = Annotated[tuple[Pair, ...], BeforeValidator(as_tuple), Field(min_length=3, max_length=2000)]
Loops = Annotated[tuple[Loop, ...], BeforeValidator(as_tuple), Field(min_length=1, max_length=200)]
Outline = Annotated[Annotated[Loop, Tag(TAG + "one")] | Annotated[Loops, Tag(TAG + "list")], _plain_or_list(2)]

if TYPE_CHECKING:
    Numbers = float | tuple[float, ...]
else:
    Numbers = one_or_list(Number)
