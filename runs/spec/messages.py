"""What pydantic found, in the words of an engineer: what is required, what was received, what to do."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from difflib import get_close_matches
from typing import Any

from pydantic_core import ErrorDetails

from ...models.errors import Issue
from ...objectives.catalogue import CATALOGUE
from .document import Conditions, Search, Spec, Tolerances
from .entries import IMPROVES, REQUIRES
from .fields import TAG, Strict
from .parts import SHAPE_KEYS, SHAPES, MaterialSpec

Location = tuple[str | int, ...]

_BARE = re.compile(r"[A-Za-z0-9_-]+")
_TABLES: dict[str, type[Strict]] = {"conditions": Conditions, "tolerances": Tolerances, "search": Search}
_ENTRIES: dict[str, Mapping[str, type[Strict]]] = {"require": REQUIRES, "improve": IMPROVES}
_LIMITS = {
    "greater_than": ("gt", "larger than"),
    "greater_than_equal": ("ge", "at least"),
    "less_than": ("lt", "smaller than"),
    "less_than_equal": ("le", "at most"),
}
_TYPES = {
    "float_type": "a number",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "string_type": "text in quotes",
    "bool_type": "true or false",
    "tuple_type": "a list in [ ]",
    "list_type": "a list in [ ]",
    "model_type": "a table",
    "model_attributes_type": "a table",
    "dict_type": "a table",
    "float_parsing": "a number",
    "finite_number": "a finite number",
    "int_parsing_size": "a whole number of usual size",
}


def show(value: Any) -> str:
    """Return a value as it would stand in TOML, shortened."""
    match value:
        case bool():
            return str(value).lower()
        case str():
            text = value if len(value) <= 40 else value[:37] + "..."
            return '"' + "".join(c if c.isprintable() else "?" for c in text) + '"'
        case int() if value.bit_length() > 64:
            return "a whole number of very many digits"
        case int() | float():
            return f"{value:g}" if isinstance(value, float) else str(value)
        case dict():
            return "a table" if value else "an empty table"
        case list() | tuple():
            if len(value) > 4 or any(isinstance(item, list | tuple | dict) for item in value):
                return f"a list of {len(value)}"
            return "[" + ", ".join(show(item) for item in value) + "]"
        case _:
            return type(value).__name__


def suggest(word: str, known: list[str]) -> str:
    """Return a sentence with the nearest of the ``known`` words, or with all of them."""
    near = get_close_matches(word.lower(), [item.lower() for item in known], n=1, cutoff=0.6)
    if near:
        return "did you mean " + next(item for item in known if item.lower() == near[0]) + "?"
    return "valid here: " + ", ".join(known)


def dotted(location: Location) -> str:
    """Return a location as a dotted key path; a key that is no bare key stands in quotes."""
    return ".".join(str(item) if _BARE.fullmatch(str(item)) else show(str(item)) for item in location)


def issues_of(errors: list[ErrorDetails], data: Mapping[str, Any]) -> list[Issue]:
    """Return pydantic's errors about ``data`` as issues, without lines, one a location."""
    issues: dict[str, Issue] = {}
    for error in errors:
        if error["type"] == "default_factory_not_called":
            continue  # its cause has an error of its own
        issue = _issue(error, data)
        issues.setdefault(issue.path, issue)
    return list(issues.values())


def _issue(error: ErrorDetails, data: Mapping[str, Any]) -> Issue:
    kind, received = error["type"], error["input"]
    where = _without_tags(error["loc"], last_is_key=kind == "extra_forbidden")
    if kind in ("union_tag_invalid", "union_tag_not_found"):
        return _wrong_branch(where, received)
    if kind == "extra_forbidden":
        return Issue(_unknown_key(where, data), dotted(where))
    if kind == "missing" and isinstance(where[-1], int):
        return Issue(f"must be {_form(where)}, received {show(received)}", dotted(where[:-1]))
    if kind == "missing":
        return Issue(_missing_key(where), dotted(where))
    if where in (("require",), ("improve",)) and isinstance(received, dict):
        return Issue(f"must be a list of tables, received one table; write [[{where[0]}]], not [{where[0]}]", where[0])
    return Issue(_message(error) + f", received {show(received)}" * (kind != "polewright"), dotted(where))


def _without_tags(location: Location, *, last_is_key: bool) -> Location:
    # A user's unknown key may look like a tag; it can only be the last.
    kept = location[-1:] if last_is_key else ()
    inner = location[: len(location) - len(kept)]
    return tuple(item for item in inner if not (isinstance(item, str) and item.startswith(TAG))) + kept


def _message(error: ErrorDetails) -> str:
    kind, context = error["type"], error.get("ctx", {})
    if kind in _LIMITS:
        name, words = _LIMITS[kind]
        return f"must be {words} {context[name]:g}"
    if kind in _TYPES:
        return f"must be {_TYPES[kind]}"
    return _OTHERS.get(kind, _plain)(error)


def _plain(error: ErrorDetails) -> str:
    return error["msg"][:1].lower() + error["msg"][1:]


def _choice(error: ErrorDetails) -> str:
    choices = error["ctx"]["expected"].replace("'", '"')
    if " or " not in choices:
        return f"must be {choices} (this version knows no other)"
    near = suggest(str(error["input"]), choices.replace('"', "").replace(" or ", ", ").split(", "))
    return f"must be {choices}" + (f" ({near})" if near.startswith("did") else "")


def _word(error: ErrorDetails) -> str:
    words = error["ctx"]["words"]
    allowed = ", ".join(word if " " in word else f'"{word}"' for word in words[:-1])
    allowed += (" or " if allowed else "") + words[-1]
    near = suggest(str(error["input"]), [word for word in words if " " not in word] or [""])
    return f"must be {allowed}" + (f" ({near})" if near.startswith("did") and isinstance(error["input"], str) else "")


def _count(error: ErrorDetails) -> str:
    context = error["ctx"]
    if "min_length" in context:
        return (
            f"must have at least {context['min_length']} item(s)" if "str" not in error["type"] else "must not be empty"
        )
    unit = "characters" if "str" in error["type"] else "item(s)"
    return f"must have at most {context['max_length']} {unit}"


_OTHERS: dict[str, Callable[[ErrorDetails], str]] = {
    "literal_error": _choice,
    "polewright_word": _word,
    "too_short": _count,
    "too_long": _count,
    "string_too_short": _count,
    "string_too_long": _count,
}


def _wrong_branch(where: Location, received: Any) -> Issue:
    """Say what a part without a known shape, or an entry without a known quantity, should have."""
    if where[0] in ("base", "mover"):
        key, known = "shape", list(SHAPES)
    elif where[0] in _ENTRIES:
        key, known = "quantity", list(CATALOGUE)
    else:
        return Issue(f"must be one value or a list, received {show(received)}", dotted(where))
    if not isinstance(received, dict):
        return Issue(f"must be a table, received {show(received)}", dotted(where))
    path = dotted((*where, key))
    if key not in received:
        return Issue(f"is required: {key} must be one of {', '.join(known)}; add it", path)
    found = received[key]
    hint = suggest(found, known) if isinstance(found, str) else "valid here: " + ", ".join(known)
    return Issue(f"unknown {key}, received {show(found)}; {hint}", path)


def _form(where: Location) -> str:
    """The form of a list of fixed length, of which one item has the location ``where``."""
    key = next(str(item) for item in reversed(where) if isinstance(item, str))
    numbers = {"between_mm": "two numbers [from, to]", "point_mm": "three numbers [x, y, z]"}
    return numbers.get(key, "two numbers [x, y]")


def _missing_key(where: Location) -> str:
    if where == ("spec_version",):
        return "is required; write spec_version = 1 at the top of the file"
    if where == ("base",):
        return "is required; add a table [base] with shape, size, thickness_mm, material and cell_mm"
    if where == ("mover",):
        return 'is required; add a table [mover], in the simplest case with like = "base"'
    if len(where) == 1:
        return "is required; add it"
    if where[0] in ("base", "mover") and len(where) == 2:
        for shape, keys in SHAPE_KEYS.items():
            if where[1] in keys:
                return f"is required for the shape {shape}; add it"
        return f"is required in [{where[0]}]; add it"
    return "is required here; add it"


def valid_keys(where: Location, data: Mapping[str, Any]) -> list[str]:
    """Return the keys that may stand beside the last one of ``where``; empty where the table itself is unknown."""
    match where[:-1]:
        case ():
            return list(Spec.model_fields)
        case ("base" | "mover" as part,):
            model = SHAPES.get(data[part].get("shape"))
            return [*(model.model_fields if model else ()), *(["like"] if part == "mover" else [])]
        case ("base" | "mover", "material"):
            return list(MaterialSpec.model_fields)
        case ("conditions" | "tolerances" | "search" as table,):
            return list(_TABLES[table].model_fields)
        case ("require" | "improve" as table, int() as index):
            return list(_ENTRIES[table][data[table][index]["quantity"]].model_fields)
        case _:
            return []


def _unknown_key(where: Location, data: Mapping[str, Any]) -> str:
    known, key = valid_keys(where, data), str(where[-1])
    if where[0] in ("base", "mover") and len(where) == 2:
        for shape, keys in SHAPE_KEYS.items():
            if key in keys:
                own = data[where[0]]["shape"]
                return f"belongs to the shape {shape}; this {own} takes {' and '.join(SHAPE_KEYS[own])}"
    return f"unknown key; {suggest(key, known)}"
