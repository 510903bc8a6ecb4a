"""Which line of a TOML text holds which key: what ``tomllib`` does not tell."""

from __future__ import annotations

import re
import tomllib

Path = tuple[str | int, ...]

_KEY = re.compile(r"""\s*(?:"((?:[^"\\\n]|\\.)*)"|'([^'\n]*)'|([A-Za-z0-9_-]+))\s*""")
_SKIP = re.compile(
    r'"""(?:[^\\]|\\.)*?"{3,5}'  # a multi-line basic string may end in two quotes of its own
    r"|'''.*?'{3,5}"
    r'|"(?:[^"\\\n]|\\.)*"'
    r"|'[^'\n]*'"
    r"|#[^\n]*"
    r"|[\[\]{}\n]"
    r"|[^\[\]{}\n\"'#]+",
    re.DOTALL,
)


class LineMap:
    """Lines of the keys and tables of a valid TOML text.

    Attributes:
        lines: Line, counted from 1, by key path; arrays of tables count from 0.
    """

    def __init__(self, text: str) -> None:
        self.lines: dict[Path, int] = {}
        self._text = text
        self._prefix: Path = ()
        self._counts: dict[Path, int] = {}
        position, line = 0, 1
        while position < len(text):
            end = self._statement_end(position)
            statement = text[position:end]
            blank = len(statement) - len(statement.lstrip())
            self._note(statement.strip(), line + statement.count("\n", 0, blank))
            line += statement.count("\n")
            position = end

    def at(self, path: Path) -> int | None:
        """Return the line of a key, or of the nearest table around it, or None."""
        for length in range(len(path), 0, -1):
            if path[:length] in self.lines:
                return self.lines[path[:length]]
        return None

    def _statement_end(self, position: int) -> int:
        depth = 0
        while position < len(self._text):
            match = _SKIP.match(self._text, position)
            if match is None:
                return len(self._text)
            token, position = match.group(), match.end()
            if token in "[{":
                depth += 1
            elif token in "]}":
                depth -= 1
            elif token == "\n" and depth <= 0:
                return position
        return position

    def _note(self, statement: str, line: int) -> None:
        if statement.startswith("[["):
            name = self._place(_keys(statement[2:]))
            index = self._counts.get(name, -1) + 1
            self._counts[name] = index
            self.lines.setdefault(name, line)
            self._prefix = (*name, index)
        elif statement.startswith("["):
            self._prefix = self._place(_keys(statement[1:]))
        elif statement and not statement.startswith("#"):
            path: Path = self._prefix
            for key in _keys(statement):
                path = (*path, key)
                self.lines.setdefault(path, line)
            return
        else:
            return
        self.lines.setdefault(self._prefix, line)

    def _place(self, keys: list[str]) -> Path:
        # A table below an array of tables belongs to the array's last table.
        path: Path = ()
        for number, key in enumerate(keys):
            path = (*path, key)
            if path in self._counts and number < len(keys) - 1:
                path = (*path, self._counts[path])
        return path


def _keys(text: str) -> list[str]:
    keys: list[str] = []
    position = 0
    while match := _KEY.match(text, position):
        quoted, literal, bare = match.groups()
        if quoted is not None:
            keys.append(tomllib.loads(f'k = "{quoted}"')["k"])
        else:
            keys.append(bare if literal is None else literal)
        position = match.end()
        if text[position : position + 1] != ".":
            break
        position += 1
    return keys
