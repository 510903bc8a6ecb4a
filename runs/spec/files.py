"""Pattern files: CSV of -1, 0 and 1, one line a row of cells, first line lowest y."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, ValidationError

from ...models.errors import InputError
from .fields import Strict

LARGEST_FILE = 8_000_000
_VALUES = {"-1": -1, "0": 0, "1": 1, "+1": 1}

FileName = Annotated[str, Field(pattern=r"\.[cC][sS][vV]$")]
Row = tuple[int | None, ...]


class CellFile(Strict):
    """The cells of a pattern file, kept inside the spec so that it needs no other file.

    Attributes:
        name: The file's name as the spec gives it.
        cells: Rows of polarities as stored, lowest y first; None where the file leaves a cell free.
    """

    name: str
    cells: tuple[Row, ...]

    @property
    def shape(self) -> tuple[int, int]:
        """Cells along (y, x)."""
        return len(self.cells), len(self.cells[0])

    @property
    def values(self) -> NDArray[np.int8]:
        """Polarity -1, 0, +1, int8, shape (ny, nx); 0 where the cell is left free."""
        return np.array([[cell or 0 for cell in row] for row in self.cells], dtype=np.int8)

    @property
    def given(self) -> NDArray[np.bool_]:
        """Which cells the file gives, shape (ny, nx)."""
        return np.array([[cell is not None for cell in row] for row in self.cells], dtype=np.bool_)


def read_text(path: Path) -> str:
    """Return the text of a UTF-8 file.

    Raises:
        InputError: It is missing, no file, not readable, too large or not UTF-8.
    """
    try:
        with path.open("rb") as stream:
            data = stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise InputError("no such file; check the name and the folder") from None
    except IsADirectoryError:
        raise InputError("is a folder; a file is needed") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(f"cannot be read: {reason}") from None
    if len(data) > LARGEST_FILE:
        raise InputError(f"is larger than {LARGEST_FILE // 1_000_000} MB: not a file of this kind")
    if data.startswith(b"\x89HDF"):
        raise InputError("is an HDF5 file, perhaps a run; a text file is needed here")
    try:
        return data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise InputError(f"must be UTF-8 text, received other bytes in line {line}; save it as UTF-8") from None


def read_cells(name: str, folder: Path, *, free_allowed: bool) -> CellFile:
    """Read a pattern file named in a spec.

    Lines that begin with "#" are comments. All lines must have the same number of fields.

    Args:
        name: As in the spec, relative to ``folder``.
        folder: The spec's folder.
        free_allowed: May a field be empty (a free cell)?

    Raises:
        InputError: The file cannot be read or is no such table.
    """
    try:
        text = read_text(folder / name)
    except InputError as error:
        raise InputError(f'file "{name}": {error}') from None
    rows: list[Row] = []
    for number, line in enumerate(text.removeprefix("\ufeff").rstrip().splitlines(), start=1):
        if not line.lstrip().startswith("#"):
            rows.append(_row(line, free_allowed, f'file "{name}", line {number}'))
            if len(rows[-1]) != len(rows[0]):
                raise InputError(
                    f'file "{name}", line {number}: every line must have as many fields as the first '
                    f"({len(rows[0])}), received {len(rows[-1])}"
                )
    if not rows:
        raise InputError(f'file "{name}": must hold lines of -1, 0 and 1, received none')
    return CellFile(name=name, cells=tuple(rows))


def _row(line: str, free_allowed: bool, where: str) -> Row:
    row: list[int | None] = []
    for position, field in enumerate(line.split(","), start=1):
        word = field.strip()
        if word == "" and free_allowed:
            row.append(None)
        elif word in _VALUES:
            row.append(_VALUES[word])
        else:
            allowed = "-1, 0, 1 or empty (free)" if free_allowed else "-1, 0 or 1"
            hint = "; separate fields by commas" if any(sign in word for sign in "; \t") else ""
            raise InputError(f'{where}: field {position} must be {allowed}, received "{word[:20]}"{hint}')
    return tuple(row)


def cells_from_table(table: dict[str, Any]) -> CellFile:
    """Return the cells that a resolved spec carries.

    Raises:
        InputError: The table is damaged.
    """
    rows = table.get("cells")
    try:
        cells = tuple(tuple(row) for row in rows) if isinstance(rows, list) else ()
        found = CellFile(name=table["name"], cells=cells)
    except (TypeError, KeyError, ValidationError):
        raise InputError("must be a word or a table with a name and equally long rows of cells") from None
    lengths = {len(row) for row in found.cells}
    allowed = {-1, 0, 1, None}
    if len(lengths) != 1 or 0 in lengths or any(cell not in allowed for row in found.cells for cell in row):
        raise InputError("must have equally long rows of -1, 0, 1 or null")
    return found
