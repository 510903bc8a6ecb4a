"""The spec: a short TOML file in, a validated and complete document out, or every error of the file at once."""

from __future__ import annotations

import json
import re
import tomllib
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

from pydantic import TypeAdapter, ValidationError

from ...models.errors import InputError, Issue
from .bounds import check_contradictions, check_entry, check_ids, check_shape
from .checks import check_pair, check_part, check_start
from .document import Conditions as Conditions
from .document import Search as Search
from .document import Spec as Spec
from .document import Tolerances as Tolerances
from .entries import AnyImprove, AnyRequire
from .entries import Entry as Entry
from .entries import Improve as Improve
from .entries import Require as Require
from .files import CellFile as CellFile
from .files import read_text
from .geometry import blank_of as blank_of
from .geometry import part_of as part_of
from .like import drop_repeated, expand
from .lines import LineMap
from .messages import issues_of
from .parts import AnyPart
from .parts import MaterialSpec as MaterialSpec
from .parts import PartSpec as PartSpec
from .schema import json_schema as json_schema

_AT_LINE = re.compile(r"\s*\(at (?:line (\d+), column \d+|end of document)\)")


def load_spec(path: str | Path) -> Spec:
    """Read and validate a spec file; the files it names are relative to its folder.

    Raises:
        InputError: All that is wrong with it, with lines.
    """
    place = Path(path)
    try:
        text = read_text(place)
    except InputError as error:
        raise InputError(str(error), str(path)) from None
    return parse_spec(text, source=str(path), folder=place.parent)


def parse_spec(text: str, *, source: str = "<text>", folder: Path | None = None) -> Spec:
    """Validate the text of a spec.

    Args:
        text: TOML.
        source: What errors call it.
        folder: Where the files it names are; the current folder by default.

    Raises:
        InputError: All that is wrong with it, with lines.
    """
    data = _toml(text, source)
    lines = LineMap(text)
    spec, issues = _validate(data, lines, {"folder": folder or Path(), "resolved": False})
    if spec is None or issues:
        raise InputError(_in_order([_with_line(issue, lines) for issue in issues]), source)
    spec._toml = text
    return spec


def spec_from_json(json_text: str, toml: str = "") -> Spec:
    """Return the spec of ``Spec.resolved_json``; no file is read.

    Args:
        json_text: The resolved spec.
        toml: The text it was resolved from, where known: with it, the result equals the original spec.

    Raises:
        InputError: It is no such JSON.
    """
    try:
        data = json.loads(json_text)
    except (ValueError, RecursionError) as error:
        raise InputError(f"must be JSON: {error}", "resolved spec") from None
    if not isinstance(data, dict):
        raise InputError("must be a JSON object", "resolved spec")
    spec, issues = _validate(data, LineMap(""), {"resolved": True})
    if spec is None or issues:
        raise InputError(issues, "resolved spec")
    spec._toml = toml
    return spec


def _toml(text: str, source: str) -> dict[str, Any]:
    if text.startswith("\ufeff"):
        raise InputError(Issue("begins with a byte-order mark; save it as UTF-8 without one", "", 1), source)
    try:
        text.encode()
        return tomllib.loads(text)
    except UnicodeEncodeError:
        raise InputError("holds characters that are not Unicode text", source) from None
    except RecursionError:
        raise InputError("must be TOML, received lists or tables nested too deep", source) from None
    except ValueError as error:
        place = _AT_LINE.search(str(error))
        reason = _AT_LINE.sub("", str(error))
        line = int(place.group(1)) if place and place.group(1) else None
        if place and line is None:
            line = text.rstrip().count("\n") + 1
        raise InputError(Issue(f"must be TOML: {reason}", "", line), source) from None


def _validate(data: dict[str, Any], lines: LineMap, context: dict[str, Any]) -> tuple[Spec | None, list[Issue]]:
    """Return the spec, where it has the right form, and all that is wrong."""
    expanded, issues = expand(data)
    wrong_form = check_shape(expanded)
    issues += wrong_form
    spec = None
    try:
        spec = Spec.model_validate(expanded, context=context)
        sections: Mapping[str, Any] = dict(spec)
    except ValidationError as error:
        issues += issues_of(error.errors(include_url=False), expanded)
        sections = _salvage(expanded, context)
    issues += _part_checks(sections)
    issues += _entry_checks(sections, {".".join(issue.path.split(".")[:2]) for issue in wrong_form}, lines)
    return spec, drop_repeated(issues, data)


def _salvage(data: Mapping[str, Any], context: dict[str, Any]) -> dict[str, Any]:
    """Return the sections that are right by themselves, so that one wrong key hides no other error."""
    kinds: dict[str, Any] = {"base": AnyPart, "mover": AnyPart, "conditions": Conditions, "search": Search}
    sections = {name: _one(kind, data.get(name, {}), context) for name, kind in kinds.items()}
    for name, kind in (("require", AnyRequire), ("improve", AnyImprove)):
        entries = data.get(name, [])
        sections[name] = [_one(kind, entry, context) for entry in entries] if isinstance(entries, list) else [None]
    return sections


def _one(kind: Any, data: Any, context: dict[str, Any]) -> Any:
    try:
        return TypeAdapter(kind).validate_python(data, context=context)
    except ValidationError:
        return None


def _part_checks(sections: Mapping[str, Any]) -> list[Issue]:
    issues: list[Issue] = []
    parts = {}
    for name in ("base", "mover"):
        if sections[name] is not None:
            found, parts[name] = check_part(name, sections[name], sections["conditions"])
            issues += found
    base, mover, search = sections["base"], sections["mover"], sections["search"]
    if base is not None and mover is not None:
        issues += check_pair(base, mover, (parts["base"], parts["mover"]))
    if search is not None and base is not None:
        issues += check_start(search, base, parts["base"])
    if not sections["require"] and not sections["improve"] and not _evaluation(base, mover):
        issues.append(Issue("needs at least one [[require]] or [[improve]]: there is nothing to design for"))
    return issues


def _entry_checks(sections: Mapping[str, Any], wrong_form: set[str], lines: LineMap) -> list[Issue]:
    """Check the entries among themselves; those of the ``wrong_form`` have no bound to speak of."""
    issues: list[Issue] = []
    sound: dict[int, Require] = {}
    for table in ("require", "improve"):
        for index, entry in enumerate(sections[table]):
            path = f"{table}.{index}"
            if entry is None or path in wrong_form:
                continue
            found = check_entry(path, entry)
            issues += found
            if table == "require" and not found:
                sound[index] = entry
    issues += check_ids({index: entry for index, entry in enumerate(sections["require"]) if entry is not None})
    return issues + check_contradictions(sound, {index: lines.at(("require", index)) for index in sound})


def _evaluation(base: AnyPart | None, mover: AnyPart | None) -> bool:
    """Tell whether the spec may be without any wish: its patterns are given, or it is wrong anyway."""
    return base is None or mover is None or (base.is_given and mover.pattern != "free")


def _with_line(issue: Issue, lines: LineMap) -> Issue:
    path = tuple(int(key) if key.isdigit() else key for key in issue.path.split(".")) if issue.path else ()
    return replace(issue, line=lines.at(path))


def _in_order(issues: list[Issue]) -> list[Issue]:
    return sorted(issues, key=lambda issue: (issue.line is not None, issue.line or 0))
