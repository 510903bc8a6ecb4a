"""Every key of a TOML text is found on its line."""

from __future__ import annotations

import pytest
from polewright.runs.spec.lines import LineMap, Path

TEXT = '''# a comment [not.a.table]
top = 1
text = """
[no] = "table"
""" # end
[base]   # comment
"quoted key" = 1
list = [
  1, # ]
  "]",
]
in.side = 2

[base.material]
x = { a = 1, b = [1, 2] }
[[require]]
q = 'lit # eral'
[[require]]

q = "\\" # still the string"
[require.sub]
deep = 1
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("top",), 2),
        (("text",), 3),
        (("base",), 6),
        (("base", "quoted key"), 7),
        (("base", "list"), 8),
        (("base", "list", 3), 8),
        (("base", "in", "side"), 12),
        (("base", "material"), 14),
        (("base", "material", "x", "a"), 15),
        (("require",), 16),
        (("require", 0), 16),
        (("require", 0, "q"), 17),
        (("require", 1), 18),
        (("require", 1, "q"), 20),
        (("require", 1, "missing"), 18),
        (("require", 1, "sub", "deep"), 22),
        (("nothing",), None),
    ],
)
def test_line(path: Path, line: int | None) -> None:
    assert LineMap(TEXT).at(path) == line


def test_windows_line_ends_count_once() -> None:
    assert LineMap(TEXT.replace("\n", "\r\n")).at(("require", 1, "q")) == 20
