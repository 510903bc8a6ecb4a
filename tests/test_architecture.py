"""The rules of the house that a machine can check: directions of import, adapters, sizes, words, what a start loads."""

from __future__ import annotations

import ast
import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
FOLDERS = ("models", "objectives", "optimizer", "runs")
SOURCES = [ROOT / "__init__.py", *sorted(path for folder in FOLDERS for path in (ROOT / folder).rglob("*.py"))]
TREES = {path: ast.parse(path.read_text(encoding="utf-8")) for path in SOURCES}
LONGEST_FILE = 400
LONGEST_BODY = 60
# A formula is one idea however long it is; each is named with its reason.
LONG_FORMULAS: dict[str, str] = {}
HEAVY = {"numpy", "scipy", "jax", "optax", "pymoo", "h5py", "pydantic", "rich", "matplotlib", "plotly"}

Function = ast.FunctionDef | ast.AsyncFunctionDef


def name_of(path: Path) -> str:
    """Return a file's name as it stands in the repository."""
    return path.relative_to(ROOT).as_posix()


def imported(path: Path) -> Iterator[tuple[int, str]]:
    """Yield the line and the absolute name of every module that a file imports, within functions too."""
    package = ("polewright", *path.relative_to(ROOT).parent.parts)
    for node in ast.walk(TREES[path]):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield node.lineno, alias.name
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else ()
            module = ".".join([*base, *([node.module] if node.module else [])])
            if node.module is None:
                for alias in node.names:
                    yield node.lineno, f"{module}.{alias.name}"
            else:
                yield node.lineno, module


def functions(tree: ast.AST) -> Iterator[Function]:
    """Yield every function and method, nested ones too."""
    for node in ast.walk(tree):
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
            yield node


def body_length(function: Function) -> int:
    """Return the lines of a function's body, its docstring aside."""
    body = function.body[1:] if ast.get_docstring(function) else function.body
    return (body[-1].end_lineno or 0) - body[0].lineno + 1 if body else 0


def public_definitions(tree: ast.Module) -> Iterator[Function | ast.ClassDef]:
    """Yield the public functions and classes of a module, and the public methods of those classes."""
    for node in tree.body:
        if isinstance(node, Function | ast.ClassDef) and not node.name.startswith("_"):
            yield node
            if isinstance(node, ast.ClassDef):
                for inner in node.body:
                    if isinstance(inner, Function) and not inner.name.startswith("_"):
                        yield inner


@pytest.mark.parametrize("folder", FOLDERS)
def test_imports_point_one_way(folder: str) -> None:
    allowed = FOLDERS[: FOLDERS.index(folder) + 1]
    wrong = [
        f"{name_of(path)}:{line} imports {module}"
        for path in SOURCES
        if name_of(path).startswith(folder + "/")
        for line, module in imported(path)
        if module.startswith("polewright.") and module.split(".")[1] not in (*allowed, "__version__")
    ]
    assert wrong == []


def test_the_package_imports_itself_relatively() -> None:
    wrong = [
        f"{name_of(path)}:{node.lineno}"
        for path, tree in TREES.items()
        for node in ast.walk(tree)
        if (isinstance(node, ast.ImportFrom) and node.level == 0 and (node.module or "").split(".")[0] == "polewright")
        or (isinstance(node, ast.Import) and any(alias.name.split(".")[0] == "polewright" for alias in node.names))
    ]
    assert wrong == []


@pytest.mark.parametrize(("library", "home"), [("pymoo", "optimizer"), ("h5py", "runs"), ("plotly", "runs")])
def test_one_file_alone_talks_to(library: str, home: str) -> None:
    users = sorted(
        {name_of(path) for path in SOURCES for _, module in imported(path) if module.split(".")[0] == library}
    )
    assert len(users) <= 1
    assert all(user.startswith(home + "/") for user in users)


@pytest.mark.parametrize("library", ["pydantic", "click", "rich", "matplotlib"])
def test_only_runs_talks_to(library: str) -> None:
    users = {name_of(path) for path in SOURCES for _, module in imported(path) if module.split(".")[0] == library}
    assert all(user.startswith("runs/") for user in users)


def test_no_file_pickles_or_reaches_for_the_network() -> None:
    banned = {"pickle", "dill", "cloudpickle", "marshal", "shelve", "socket", "urllib", "http", "requests"}
    users = {
        f"{name_of(path)} imports {module}"
        for path in SOURCES
        for _, module in imported(path)
        if module.split(".")[0] in banned
    }
    assert users == set()


def test_files_are_of_one_idea() -> None:
    lengths = {name_of(path): len(path.read_text(encoding="utf-8").splitlines()) for path in SOURCES}
    assert {name: length for name, length in lengths.items() if length > LONGEST_FILE} == {}


def test_function_bodies_are_short() -> None:
    long = {
        f"{name_of(path)}:{function.name}": body_length(function)
        for path, tree in TREES.items()
        for function in functions(tree)
        if body_length(function) > LONGEST_BODY
    }
    assert {name: length for name, length in long.items() if name not in LONG_FORMULAS} == {}
    assert set(LONG_FORMULAS) <= set(long)


def test_everything_public_is_described() -> None:
    silent = [name_of(path) for path, tree in TREES.items() if not ast.get_docstring(tree)]
    silent += [
        f"{name_of(path)}:{node.lineno} {node.name}"
        for path, tree in TREES.items()
        for node in public_definitions(tree)
        if not ast.get_docstring(node)
    ]
    assert silent == []


def test_every_function_is_annotated() -> None:
    bare = []
    for path, tree in TREES.items():
        for function in functions(tree):
            spec = function.args
            named = [*spec.posonlyargs, *spec.args, *spec.kwonlyargs, spec.vararg, spec.kwarg]
            missing = [arg for arg in named if arg and arg.annotation is None and arg.arg not in ("self", "cls")]
            if missing or function.returns is None:
                bare.append(f"{name_of(path)}:{function.lineno} {function.name}")
    assert bare == []


def test_nothing_asserts_or_catches_everything_bare() -> None:
    wrong = [
        f"{name_of(path)}:{node.lineno}"
        for path, tree in TREES.items()
        for node in ast.walk(tree)
        if isinstance(node, ast.Assert) or (isinstance(node, ast.ExceptHandler) and node.type is None)
    ]
    assert wrong == []


def test_the_top_level_holds_the_agreed_entries_alone() -> None:
    agreed = {*FOLDERS, "tests", "__init__.py", "py.typed", "LICENSE", "README.md", "DEVELOPERS.md", "pyproject.toml"}
    agreed |= {".ci", ".gitignore", ".gitattributes", ".github", ".assets", ".pre-commit-config.yaml", "CITATION.cff"}
    ignored = {".git", ".venv", "uv.lock", "dist", "build", "__pycache__", "PKG-INFO"}
    ignored |= {".mypy_cache", ".pytest_cache", ".ruff_cache", ".hypothesis"}
    assert {path.name for path in ROOT.iterdir()} - agreed - ignored == set()


def loaded_by(*arguments: str) -> set[str]:
    """Return the top-level modules that a command line imports, in a process of its own."""
    done = subprocess.run(
        [sys.executable, "-X", "importtime", "-m", "polewright.runs", *arguments],
        env={**os.environ, "PYTHONPATH": str(ROOT / ".ci" / "path")},
        capture_output=True,
        text=True,
        timeout=120,
        check=True,
    )
    lines = [line for line in done.stderr.splitlines() if line.startswith("import time:")]
    return {line.rpartition("|")[2].strip().split(".")[0] for line in lines}


def test_help_loads_nothing_heavy() -> None:
    loaded = loaded_by("--help")
    assert "click" in loaded
    assert loaded & HEAVY == set()


@pytest.mark.parametrize("command", ["schema", "example"])
def test_spec_commands_load_no_engine(command: str) -> None:
    assert loaded_by("spec", command) & {"jax", "pymoo", "matplotlib", "plotly"} == set()


def test_checking_a_spec_loads_no_engine() -> None:
    spec = ROOT / "runs" / "examples" / "hatch.toml"
    assert loaded_by("spec", "check", str(spec)) & {"jax", "optax", "pymoo", "matplotlib", "plotly", "h5py"} == set()
