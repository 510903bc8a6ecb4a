"""The [[require]] and [[improve]] entries: one strict model a quantity, made from the catalogue."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Discriminator, Field, Tag, create_model

from ...objectives.catalogue import CATALOGUE, Info, Key
from .fields import LARGEST, TAG, Numbers, Positive, Strict, fixed_list, one_or_list

BOUNDS = ("at_least", "at_most", "equal_to")
_LIST_KINDS = {"numbers": 0, "pairs": 1, "points": 1}

Setting = float | str | tuple[Any, ...]


class Entry(Strict):
    """What requires and improves share: a quantity and the keys that the catalogue gives it."""

    quantity: str

    @property
    def info(self) -> Info:
        """The catalogue's line of the quantity."""
        return CATALOGUE[self.quantity]

    @property
    def settings(self) -> dict[str, Setting]:
        """The quantity's own keys in the spec's units, defaults filled in; a key that does not apply is absent."""
        given = {key.name: getattr(self, key.name) for key in self.info.keys}
        return {name: value for name, value in given.items() if value is not None}

    @property
    def listed(self) -> str | None:
        """The key that was given as a list, or None when the entry is about one pose."""
        for key in self.info.keys:
            if key.kind in _LIST_KINDS and is_listed(key, getattr(self, key.name)):
                return key.name
        return None

    @property
    def count(self) -> int:
        """How many values the entry has: the length of its list, or 1."""
        return 1 if self.listed is None else len(getattr(self, self.listed))


class Require(Entry):
    """A hard bound on a quantity; exactly one of ``at_least``, ``at_most`` and ``equal_to`` is not None."""

    id: str | None = Field(
        default=None, min_length=1, max_length=80, description="The drawing's own name of the characteristic."
    )
    at_least: Numbers | None = Field(default=None, description="Lower bound: one for all poses, or a list.")
    at_most: Numbers | None = Field(default=None, description="Upper bound: one for all poses, or a list.")
    equal_to: Numbers | None = Field(default=None, description="Target: one for all poses, or a list.")
    within: Positive | None = Field(default=None, description="Half width of the band about equal_to.")
    within_percent: Positive | None = Field(default=None, description="The same in percent of the target.")
    scale: Positive | None = Field(default=None, description="Size that margins are relative to where the bound is 0.")

    @property
    def kind(self) -> Literal["at_least", "at_most", "equal_to"]:
        """Which bound it is."""
        if self.at_least is not None:
            return "at_least"
        return "at_most" if self.at_most is not None else "equal_to"

    @property
    def bounds(self) -> tuple[float, ...]:
        """The bound or target of every value, in the spec's unit, length ``count``."""
        return _spread(getattr(self, self.kind), self.count)

    @property
    def bands(self) -> tuple[float, ...] | None:
        """Half width of the band about every target, in the spec's unit; None unless it is an equality."""
        if self.kind != "equal_to":
            return None
        if self.within is not None:
            return (self.within,) * self.count
        return tuple(abs(target) * (self.within_percent or 0.0) / 100.0 for target in self.bounds)


class Improve(Entry):
    """A quantity to push: in the direction ``sense``, or toward the value(s) ``toward``."""

    sense: Literal["maximize", "minimize"] | None = Field(default=None, description="Direction to push in.")
    toward: Numbers | None = Field(default=None, description="Value(s) to come close to, in the rms sense.")
    log: bool = Field(default=False, description="Compare logarithms, for a quantity that spans decades.")

    @property
    def targets(self) -> tuple[float, ...] | None:
        """The target of every value, in the spec's unit; None when it is pushed in a direction."""
        return None if self.toward is None else _spread(self.toward, self.count)


def _spread(value: float | tuple[float, ...], count: int) -> tuple[float, ...]:
    return value if isinstance(value, tuple) else (value,) * count


def is_listed(key: Key, value: Any) -> bool:
    """Tell whether ``value`` of a key that may be one or a list is a list."""
    if not isinstance(value, list | tuple):
        return False
    return _LIST_KINDS[key.kind] == 0 or any(isinstance(item, list | tuple) for item in value)


def _number(key: Key) -> Any:
    limits: dict[str, Any] = {"le": LARGEST}
    if key.positive:
        limits["gt"] = 0.0
    else:
        limits["ge"] = -LARGEST if key.minimum is None else key.minimum
    return Annotated[float, Field(**limits)]


def _kind(key: Key) -> Any:
    number = _number(key)
    match key.kind:
        case "number":
            return number
        case "numbers":
            return one_or_list(number)
        case "range" | "pair":
            return fixed_list(number, 2)
        case "pairs":
            return one_or_list(fixed_list(number, 2), 1)
        case "point":
            return fixed_list(number, 3)
        case "points":
            return one_or_list(fixed_list(number, 3), 1)
        case "choice":
            return Literal[key.choices]


def _field(key: Key) -> tuple[Any, Any]:
    if key.required:
        return _kind(key), Field(description=key.help or None)
    kind = _kind(key) if key.default is not None else _kind(key) | None
    return kind, Field(default=key.default, description=key.help or None)


def _model(prefix: str, parent: type[Entry], info: Info) -> type[Entry]:
    fields: dict[str, Any] = {key.name: _field(key) for key in info.keys}
    fields["quantity"] = (Literal[info.name], Field(description=f"{info.meaning} Unit: {info.unit}."))
    name = prefix + info.name.title().replace("_", "")
    model: type[Entry] = create_model(name, __base__=parent, __doc__=info.meaning, **fields)
    return model


REQUIRES = {name: _model("Require", Require, info) for name, info in CATALOGUE.items()}
IMPROVES = {name: _model("Improve", Improve, info) for name, info in CATALOGUE.items()}


def _quantity_of(value: Any) -> Any:
    name = value.get("quantity") if isinstance(value, dict) else getattr(value, "quantity", None)
    return TAG + name if isinstance(name, str) else name


if TYPE_CHECKING:
    AnyRequire = Require
    AnyImprove = Improve
else:

    def _any_of(models: dict[str, type[Entry]]) -> Any:
        union = None
        for name, model in models.items():
            branch = Annotated[model, Tag(TAG + name)]
            union = branch if union is None else union | branch
        return Annotated[union, Discriminator(_quantity_of)]

    AnyRequire = _any_of(REQUIRES)
    AnyImprove = _any_of(IMPROVES)
