"""Whatever a spec holds, it is read or refused with a message: never anything else."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from polewright.models.errors import InputError
from polewright.objectives.catalogue import CATALOGUE
from polewright.runs.cli import run
from polewright.runs.examples import NAMES, example_text
from polewright.runs.spec import Spec, parse_spec, spec_from_json
from polewright.runs.spec.entries import IMPROVES, REQUIRES
from polewright.runs.spec.parts import SHAPES, MaterialSpec
from pydantic import BaseModel

TEXTS = [example_text(name) for name in NAMES]
DATA = [tomllib.loads(text) for text in TEXTS]
MODELS: list[type[BaseModel]] = [*SHAPES.values(), MaterialSpec, *REQUIRES.values(), *IMPROVES.values()]
TABLES = ("base", "mover", "require", "improve", "search", "conditions", "tolerances")
KEYS = sorted({key for model in MODELS for key in model.model_fields} | {*TABLES, "like", "title", "", "a.b", "#x"})
WORDS = [
    "free",
    "same",
    "matched",
    "none",
    "quarter-turn",
    "odd-xy",
    "disc",
    "ring",
    "polygon",
    "x.csv",
    "pair",
    "#",
    "\x00",
]

scalars = st.one_of(
    st.sampled_from([*WORDS, *CATALOGUE]),
    st.text(st.characters(exclude_categories=["Cs"]), max_size=8),
    st.integers(-3, 40),
    st.integers(),
    st.floats(),
    st.floats(0.01, 40.0),
    st.booleans(),
)
values = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.sampled_from(KEYS), inner, max_size=3),
    max_leaves=12,
)


def places(data: Any) -> list[tuple[Any, Any]]:
    """Return every (container, key) in ``data``."""
    pairs = data.items() if isinstance(data, dict) else enumerate(data) if isinstance(data, list) else ()
    found = []
    for key, value in pairs:
        found.append((data, key))
        found += places(value)
    return found


@st.composite
def mutated(draw: st.DrawFn) -> dict[str, Any]:
    """Draw an example with a few of its values exchanged, dropped, or joined by others."""
    data: dict[str, Any] = json.loads(json.dumps(draw(st.sampled_from(DATA))))
    for _ in range(draw(st.integers(1, 4))):
        found = places(data)
        if not found:
            break
        container, key = draw(st.sampled_from(found))
        match draw(st.sampled_from(["exchange", "drop", "join", "copy"])):
            case "exchange":
                container[key] = draw(values)
            case "drop":
                del container[key]
            case "join" if isinstance(container, dict):
                container[draw(st.sampled_from(KEYS))] = draw(values)
            case "copy" if isinstance(container, list):
                container.append(container[key])
    return data


def toml(value: Any) -> str:
    """Return ``value`` as TOML on one line."""
    match value:
        case dict():
            return "{" + ", ".join(f"{json.dumps(key)} = {toml(item)}" for key, item in value.items()) + "}"
        case list():
            return "[" + ", ".join(toml(item) for item in value) + "]"
        case str():
            return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f")
        case bool():
            return str(value).lower()
        case float():
            return repr(value)
        case _:
            return str(value)


def document(data: dict[str, Any]) -> str:
    """Return ``data`` as a TOML text, tables inline."""
    return "".join(f"{json.dumps(key)} = {toml(value)}\n" for key, value in data.items())


def refusal(read: Callable[[str], Spec], text: str) -> InputError | None:
    """Return why ``text`` is refused, or None when it is read; any other error fails the test."""
    try:
        read(text)
    except InputError as error:
        return error
    return None


def read_or_refused(text: str) -> None:
    """Check that ``text`` is a spec that survives JSON, or is refused with whole messages on lines that exist."""
    error = refusal(parse_spec, text)
    if error is None:
        spec = parse_spec(text)
        assert spec_from_json(spec.resolved_json(), text) == spec
        return
    assert error.issues
    for issue in error.issues:
        assert issue.message
        assert "\n" not in issue.message + issue.path
        assert issue.line is None or 1 <= issue.line <= text.count("\n") + 1


@settings(max_examples=400)
@given(mutated())
def test_mutated_specs(data: dict[str, Any]) -> None:
    read_or_refused(document(data))


@settings(max_examples=200)
@given(st.sampled_from(TEXTS), st.integers(0, 10_000), st.integers(0, 12), st.text(st.characters(), max_size=6))
def test_mutated_texts(text: str, start: int, length: int, new: str) -> None:
    start %= len(text)
    read_or_refused(text[:start] + new + text[start + length :])


@settings(max_examples=100)
@given(st.text(st.characters(), max_size=60))
def test_any_text(text: str) -> None:
    read_or_refused(text)


@settings(max_examples=150)
@given(mutated())
def test_mutated_resolved_specs(data: dict[str, Any]) -> None:
    error = refusal(spec_from_json, json.dumps(data))
    assert error is None or error.issues


@settings(max_examples=60, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.binary(max_size=40) | mutated().map(document).map(lambda text: text.encode("utf-8", "surrogatepass")))
def test_the_command_line_never_shows_a_traceback(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], content: bytes
) -> None:
    spec = tmp_path / "s.toml"
    spec.write_bytes(content)
    code = run(["spec", "check", str(spec)])
    shown = capsys.readouterr()
    assert code in (0, 2), shown.err
    assert "Traceback" not in shown.err
    assert shown.out == ""
    assert list(tmp_path.iterdir()) == [spec]
