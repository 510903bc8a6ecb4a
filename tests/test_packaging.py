"""What an installation offers: names, version, links, types, licence."""

from __future__ import annotations

import importlib.metadata
import subprocess
import sys
import tomllib
from pathlib import Path

import polewright
import pytest

ROOT = Path(__file__).resolve().parents[1]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", polewright.__all__)
def test_every_public_name_is_there(name: str) -> None:
    assert name in dir(polewright)
    assert getattr(polewright, name) is not None


def test_a_name_that_is_not_there_says_so() -> None:
    with pytest.raises(AttributeError, match="no attribute 'nonsense'"):
        _ = polewright.nonsense


def test_importing_the_package_loads_nothing_heavy() -> None:
    code = "import sys, polewright; print(*sorted({name.split('.')[0] for name in sys.modules}))"
    done = subprocess.run(
        [sys.executable, "-c", code],
        env={"PYTHONPATH": str(ROOT / ".ci" / "path")},
        capture_output=True,
        text=True,
        timeout=60,
        check=True,
    )
    heavy = {"numpy", "scipy", "jax", "optax", "pymoo", "h5py", "pydantic", "matplotlib", "plotly", "click", "rich"}
    assert set(done.stdout.split()) & heavy == set()


def test_tracebacks_show_real_paths() -> None:
    assert list(polewright.__path__) == [str(Path(polewright.__file__).resolve().parent)]


def test_the_links_lead_to_what_a_wheel_holds() -> None:
    links = ROOT / ".ci" / "path" / "polewright"
    if not links.exists():
        pytest.skip("an unpacked source archive has no links: it is tested as installed")
    held = set(PROJECT["tool"]["hatch"]["build"]["targets"]["wheel"]["only-include"])
    found = [path for path in links.iterdir() if path.name != "__pycache__"]
    assert {link.name for link in found} == held
    for link in found:
        assert link.resolve() == ROOT / link.name
        assert not link.readlink().is_absolute()


def test_the_version_stands_in_one_place() -> None:
    assert PROJECT["project"]["dynamic"] == ["version"]
    assert PROJECT["tool"]["hatch"]["version"]["path"] == "__init__.py"
    try:
        installed = importlib.metadata.version("polewright")
    except importlib.metadata.PackageNotFoundError:
        pytest.skip("run from the sources, not from an installation")
    assert installed == polewright.__version__


def test_the_licence_is_whole() -> None:
    text = (ROOT / "LICENSE").read_text(encoding="utf-8")
    assert "Apache License" in text
    assert "END OF TERMS AND CONDITIONS" in text
    assert PROJECT["project"]["license"] == "Apache-2.0"


def test_the_readme_holds_the_two_commands() -> None:
    lines = (ROOT / "README.md").read_text(encoding="utf-8").splitlines()
    assert [line for line in lines if line.startswith("python3 -m venv")] == [
        "python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/polewright demo",
        "python3 -m venv .venv && .venv/bin/pip install -e '.[test]' && .venv/bin/pytest",
    ]
