"""README and DEVELOPERS say what is so: snippets run, tables equal the code, files and commands exist.

What is made from the code (quantities, cautions, rooms) stands between two comments in the texts. Written anew by

    python tests/test_docs.py

with ``.ci/path`` on PYTHONPATH, or with polewright installed.
"""

from __future__ import annotations

import ast
import hashlib
import re
import runpy
import shlex
from pathlib import Path
from xml.etree import ElementTree

import click
import pytest
from click.testing import CliRunner
from polewright.objectives.catalogue import CATALOGUE, Key
from polewright.runs.archive import open_run
from polewright.runs.cli import COMMANDS, group, run
from polewright.runs.report.cautions import CAUTIONS, DEFER
from polewright.runs.result import EXIT_CODES
from polewright.runs.spec import parse_spec

ROOT = Path(__file__).resolve().parents[1]
FOLDERS = ("models", "objectives", "optimizer", "runs")
PICTURE = ROOT / ".ci" / "example.svg"
USER = "python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/polewright demo"
DEVELOPER = "python3 -m venv .venv && .venv/bin/pip install -e '.[test]' && .venv/bin/pytest"

# the README's walk in a second: so few cells that all pattern pairs are looked at
SMALL = """
spec_version = 1
title = "Invented plates"

[base]
shape = "rectangle"
size_mm = [4.0, 4.0]
thickness_mm = 3.0
material = { remanence_T = 1.3 }
cell_mm = 2.0

[mover]
like = "base"

[tolerances]
samples = 20

[[require]]
quantity = "holding_force"
gap_mm = 0.3
at_least = 1.0
"""


def text_of(name: str) -> str:
    return (ROOT / name).read_text(encoding="utf-8")


def blocks(text: str, language: str) -> list[str]:
    """The contents of all fenced blocks of a language."""
    return re.findall(rf"```{language}\n(.*?)```", text, re.DOTALL)


def between(text: str, name: str) -> str:
    """What stands between a text's comments of a name, a blank line at each end left out."""
    found = re.search(rf"<!-- {name}: [^>]*-->\n+(.*?)\n*<!-- end of {name} -->", text, re.DOTALL)
    assert found is not None, f"no comments of {name}"
    return found[1]


def shown(value: str | float | tuple[float, ...]) -> str:
    """A default as a spec would give it."""
    if isinstance(value, tuple):
        return f"[{', '.join(shown(item) for item in value)}]"
    return f'"{value}"' if isinstance(value, str) else f"{value:g}"


def cell(text: str) -> str:
    """Text for a cell of a table, in which a bar would end the cell."""
    return text.replace("|", "\\|")


def key_text(key: Key) -> str:
    """One key as the README shows it: a list marked, what it may be, what it is when not given."""
    text = f"`{key.name}`"
    notes = ["list"] if key.kind in ("numbers", "pairs", "points") else []
    notes += [" or ".join(f'"{choice}"' for choice in key.choices)] if key.choices else []
    if not key.required and key.default is not None:
        notes.append(f"default {shown(key.default)}")
    elif not key.required:
        notes.append('of = "pair" alone' if key.name == "gap_mm" else "optional")
    return f"{text} ({'; '.join(notes)})" if notes else text


def catalogue_table() -> str:
    """The README's table of quantities."""
    rows = [
        f"| `{name}` | {info.unit} | {cell(info.meaning)} | {', '.join(key_text(key) for key in info.keys)} |"
        for name, info in CATALOGUE.items()
    ]
    return "\n".join(["| quantity | unit | meaning and sign | keys |", "|---|---|---|---|", *rows])


def cautions_list() -> str:
    """The README's cautions, from the one source that reports use."""
    return "\n".join([*(f"- **{heading}.** {text}" for heading, text in CAUTIONS), "", DEFER])


def rooms_table(folder: str) -> str:
    """One line a module, from the first paragraph of its own text."""
    rows = []
    for path in sorted((ROOT / folder).rglob("*.py")):
        said = ast.get_docstring(ast.parse(path.read_text(encoding="utf-8"))) or ""
        line = " ".join(said.split("\n\n")[0].split()).replace("``", "`")
        rows.append(f"| `{path.relative_to(ROOT).as_posix()}` | {cell(line)} |")
    return "\n".join(["| room | what it is |", "|---|---|", *rows])


def generated() -> list[tuple[str, str, str]]:
    """Every part of the texts that is made from the code: file, name of its comments, content."""
    rooms = [("DEVELOPERS.md", f"rooms of {folder}", rooms_table(folder)) for folder in FOLDERS]
    return [("README.md", "catalogue", catalogue_table()), ("README.md", "cautions", cautions_list()), *rooms]


@pytest.mark.parametrize(("file", "name", "content"), generated(), ids=lambda value: str(value).split("\n")[0])
def test_what_is_made_from_the_code_is_up_to_date(file: str, name: str, content: str) -> None:
    assert between(text_of(file), name) == content, f"stale: run python tests/test_docs.py to write {file} anew"


def test_the_two_commands_stand_in_the_readme_once_each() -> None:
    readme = text_of("README.md")
    for command in (USER, DEVELOPER):
        assert readme.count(command) == 1
        assert command in readme.splitlines()
    assert readme.count("python3 -m venv") == 2


def test_the_spec_of_the_walk_is_valid() -> None:
    (text,) = blocks(text_of("README.md"), "toml")
    spec = parse_spec(text)
    assert [entry.id for entry in spec.require] == ["K1", "K2", "K3"]


def walk_commands() -> list[list[str]]:
    """Arguments of every command of the README's walk."""
    return [shlex.split(block.splitlines()[0])[2:] for block in blocks(text_of("README.md"), "console")]


def test_checking_the_spec_prints_what_the_readme_shows(tmp_path: Path, monkeypatch: pytest.MonkeyPatch,
                                                        capsys: pytest.CaptureFixture[str]) -> None:  # fmt: skip
    monkeypatch.chdir(tmp_path)
    Path("cassette.toml").write_text(blocks(text_of("README.md"), "toml")[0], encoding="utf-8")
    block = next(block for block in blocks(text_of("README.md"), "console") if "spec check" in block)
    assert run(["spec", "check", "cassette.toml"]) == 0
    assert capsys.readouterr().err.splitlines() == block.splitlines()[1:]


def test_the_walk_and_the_snippets_run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch,
                                       capsys: pytest.CaptureFixture[str]) -> None:  # fmt: skip
    """On a small spec of the same name: every command, then every Python snippet."""
    pytest.importorskip("xarray")
    pytest.importorskip("h5netcdf")
    monkeypatch.chdir(tmp_path)
    Path("cassette.toml").write_text(SMALL, encoding="utf-8")
    commands = walk_commands()
    assert [arguments[0] for arguments in commands] == ["spec", "design", "verify", "report", "export"]
    for arguments in commands:
        assert run(arguments) == 0, capsys.readouterr().err
    assert Path("cassette.html").exists()
    assert Path("cassette-d1", "base.csv").exists()
    snippets = blocks(text_of("README.md"), "python")
    assert len(snippets) == 2
    capsys.readouterr()
    for snippet in snippets:
        exec(compile(snippet, "README.md", "exec"), {})
    printed = capsys.readouterr().out
    assert "d1 True" in printed
    assert "(2, 2)" in printed
    if PICTURE.exists():
        drawn = runpy.run_path(str(PICTURE.with_name("picture.py")))["picture"](open_run(Path("cassette.h5")))
        assert ElementTree.fromstring(drawn).tag.endswith("svg")


def test_the_commands_are_all_told_and_exist() -> None:
    told = {name.split()[0] for name in re.findall(r"`polewright (\w+(?: \w+)?)", text_of("README.md"))}
    assert told == set(COMMANDS)
    group_of_specs = group.get_command(click.Context(group), "spec")
    assert isinstance(group_of_specs, click.Group)
    assert set(re.findall(r"`polewright spec (\w+)", text_of("README.md"))) == set(group_of_specs.commands)


def test_options_that_the_readme_names_exist() -> None:
    helps = "".join(CliRunner().invoke(group, [name, "--help"], prog_name="polewright").output for name in COMMANDS)
    for option in re.findall(r"`(--\w+)", text_of("README.md")):
        assert option in helps, option


def test_every_exit_code_is_told() -> None:
    told = {int(code) for code in re.findall(r"^\| (\d+) \|", text_of("README.md"), re.MULTILINE)}
    assert told == {0, 1, 2, 3, 4, 130}
    assert set(EXIT_CODES.values()) <= told


def test_the_picture_belongs_to_the_spec_of_the_walk() -> None:
    if not PICTURE.exists():
        pytest.skip("an unpacked source archive has no dot folders")
    assert f"]({PICTURE.relative_to(ROOT).as_posix()})" in text_of("README.md")
    picture = PICTURE.read_text(encoding="utf-8")
    assert PICTURE.stat().st_size < 300_000
    (spec,) = blocks(text_of("README.md"), "toml")
    assert hashlib.sha256(spec.encode()).hexdigest() in picture, "the picture is of another spec: run .ci/walk.py"


def test_the_job_stands_at_the_top() -> None:
    title, blank, first = text_of("README.md").splitlines()[:3]
    assert title == "# polewright"
    assert blank == ""
    assert first.startswith("A mechanical or magnetics engineer")


@pytest.mark.parametrize("file", ["README.md", "DEVELOPERS.md"])
def test_files_that_are_named_exist(file: str) -> None:
    named = set(re.findall(r"`((?:\.ci|models|objectives|optimizer|runs|tests)/[\w./-]*)`", text_of(file)))
    if not (ROOT / ".ci").exists():  # an unpacked source archive
        named = {name for name in named if not name.startswith(".ci/")}
    assert sorted(name for name in named if not (ROOT / name).exists()) == []
    if file == "DEVELOPERS.md":
        assert len(named) > 80


@pytest.mark.parametrize("file", ["README.md", "DEVELOPERS.md"])
def test_no_addresses_and_no_long_lines_of_prose(file: str) -> None:
    """No host is named, a registry's least of all; only tables, generated lists and pictures may be wide."""
    text = text_of(file)
    assert "://" not in text
    prose = re.sub(r"```.*?```", "", text, flags=re.DOTALL)
    wide = [line for line in prose.splitlines() if len(line) > 120 and line[:1] not in ("|", "!")]
    assert [line for line in wide if line not in cautions_list()] == []


def test_nothing_is_left_to_fill_in() -> None:
    assert "LEAD-FILLS" not in text_of("DEVELOPERS.md")


def write_anew() -> None:
    """Put what is made from the code into the texts."""
    for file, name, content in generated():
        text = text_of(file)
        pattern = rf"(<!-- {name}: [^>]*-->\n).*?(<!-- end of {name} -->)"
        new = re.sub(pattern, lambda found, c=content: f"{found[1]}\n{c}\n\n{found[2]}", text, flags=re.DOTALL)  # type: ignore[misc]
        (ROOT / file).write_text(new, encoding="utf-8")


if __name__ == "__main__":
    write_anew()
