"""Do the README's walk again: run its commands on its spec, write what they print into it, and redraw its picture.

Usage: python .ci/walk.py
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
README = ROOT / "README.md"
PICTURE = ROOT / ".ci" / "example.svg"
SPEC = re.compile(r"```toml\n(.*?)```", re.DOTALL)
BLOCK = re.compile(r"```console\n\$ polewright ([^\n]*)\n.*?```", re.DOTALL)


def said(arguments: str, folder: Path) -> str:
    """Run a command line and return what a person reads of it."""
    command = [sys.executable, "-m", "polewright.runs", *arguments.split()]
    done = subprocess.run(command, cwd=folder, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True, check=False)
    if done.returncode not in (0, 3):
        raise SystemExit(f"polewright {arguments} ended with {done.returncode}:\n{done.stdout}")
    return "\n".join(line.rstrip() for line in done.stdout.splitlines())


def abridged(text: str, seen: set[str]) -> str:
    """Return what an earlier command has not said already; dots stand for the rest."""
    lines: list[str] = []
    for line in text.splitlines():
        if line not in seen:
            lines.append(line)
        elif lines[-1:] != ["..."]:
            lines.append("...")
    return "\n".join(lines)


def walk(readme: str, folder: Path) -> str:
    """Return the README with every console block's output as it is today."""
    spec = SPEC.search(readme)
    if spec is None:
        raise SystemExit("README.md must hold a toml block")
    (folder / "cassette.toml").write_text(spec[1], encoding="utf-8")

    seen: set[str] = set()

    def again(block: re.Match[str]) -> str:
        text = said(block[1], folder)
        shown = abridged(text, seen)
        seen.update(text.splitlines())
        return f"```console\n$ polewright {block[1]}\n{shown}\n```"

    return BLOCK.sub(again, readme)


def main() -> None:
    """Rewrite the README and its picture."""
    # what people see without a terminal of their own: plain, at the width of a log
    for name in ("COLUMNS", "FORCE_COLOR"):
        os.environ.pop(name, None)
    os.environ["PYTHONPATH"] = str(ROOT / ".ci" / "path")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        README.write_text(walk(README.read_text(encoding="utf-8"), folder), encoding="utf-8")
        draw = [sys.executable, str(ROOT / ".ci" / "picture.py"), str(folder / "cassette.h5")]
        PICTURE.write_bytes(subprocess.run(draw, stdout=subprocess.PIPE, check=True).stdout)


if __name__ == "__main__":
    main()
