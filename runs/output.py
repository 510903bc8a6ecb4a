"""Output files: never over an existing one unasked, and never half written."""

from __future__ import annotations

import os
from pathlib import Path

from ..models.errors import InputError


def output_path(
    given: Path | None,
    default: str,
    *,
    replace: bool = False,
    resume: bool = False,
    inputs: tuple[Path, ...] = (),
) -> Path:
    """Return where to write.

    Args:
        given: What the user named with ``-o``, or None.
        default: File name in the current folder when nothing was named.
        replace: May an existing output be overwritten?
        resume: Is an existing output to be continued?
        inputs: Files that are read by the same command and may never be overwritten by it.

    Raises:
        InputError: When the output exists and may not be replaced, is a folder or an input, or its folder is missing.
    """
    path = given if given is not None else Path(default)
    if replace and resume:
        message = "--replace and --resume exclude each other; give one of them"
        raise InputError(message)
    if any(path.resolve() == source.resolve() for source in inputs):
        message = "is an input of this command and would be overwritten; name another output with -o"
        raise InputError(message, str(path))
    if path.is_dir():
        message = "is a folder; name a file with -o"
        raise InputError(message, str(path))
    if path.exists() and not (replace or resume):
        message = "exists and is not overwritten; add --replace, or name another output with -o"
        raise InputError(message, str(path))
    if not path.parent.is_dir():
        message = f"cannot be written: there is no folder {path.parent}; make it first"
        raise InputError(message, str(path))
    return path


def put_in_place(path: Path, data: bytes) -> None:
    """Write ``data`` to ``path`` so that a kill at any moment leaves either the old file or the new one, whole.

    Raises:
        InputError: When the file system refuses (no space, no permission).
    """
    # a name of this process: two writers of one path then never write into each other's file
    temporary = path.with_name(f".{path.name}.{os.getpid()}.partial")
    try:
        with temporary.open("wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        temporary.replace(path)
        _sync_folder(path.parent)
    except OSError as error:
        message = f"cannot be written: {error.strerror or error}"
        raise InputError(message, str(path)) from error
    finally:
        temporary.unlink(missing_ok=True)


def _sync_folder(folder: Path) -> None:
    # makes the rename itself survive a power loss; Windows cannot open folders and needs no such thing
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
