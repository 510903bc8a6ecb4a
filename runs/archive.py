"""The archive: one HDF5 file a run, written whole and put in place with one rename; alone in importing h5py.

What stands where is decided by ``layout``; this file turns groups of named arrays into HDF5 with netCDF-4's
dimension scales, so that plain h5py, xarray and ncdump all read it, and back. A kill at any moment leaves the last
whole archive; a reader never blocks a run; equal runs give equal bytes outside /provenance (no clock is stored).

Behind the HDF5 data stands a seal, the SHA-256 of all before it. HDF5 readers do not look there, and HDF5 writers cut
it off. It lets a file that a bad disk or copy has changed be refused before the HDF5 library, which can crash the whole
process on such a file, sees it.
"""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from ..models.errors import InputError
from .layout import FORMAT, FORMAT_VERSION, Group, groups_of, run_from
from .layout_parts import Variable
from .output import put_in_place
from .records import Run

_TEXT = h5py.string_dtype("utf-8")
_SEAL = b"polewright sha256"
_SEAL_SIZE = len(_SEAL) + hashlib.sha256().digest_size
# what HDF5 and netCDF keep for themselves among a dataset's attributes
_RESERVED = {"CLASS", "NAME", "DIMENSION_LIST", "REFERENCE_LIST", "_Netcdf4Dimid", "units"}


def write_run(run: Run, path: Path) -> None:
    """Write ``run`` to ``path``, over what stands there; interrupted at any moment, the old file stays whole.

    Raises:
        ValueError: When the parts of the run do not fit together (a pattern of another shape than its part).
        InputError: When the file system refuses.
    """
    image = _image(groups_of(run))
    put_in_place(path, image + _seal(image))


def read_run(path: str | Path) -> Run:
    """Return the run stored at ``path``.

    Raises:
        InputError: When there is no such file, it is not HDF5, cut short, another program's, damaged or of a newer
            format.
    """
    path = Path(path)
    try:
        _check_seal(path)
        with h5py.File(path, "r") as file:
            _check_format(file, path)
            tree = {"/": _read_group(file)}
            file.visititems(
                lambda name, item: (
                    tree.update({f"/{name}": _read_group(item)}) if isinstance(item, h5py.Group) else None
                )
            )
        return run_from(tree)
    except (OSError, KeyError, ValueError, TypeError, RuntimeError, IndexError) as error:
        if isinstance(error, InputError):
            raise
        raise _unreadable(path, error) from error


open_run = read_run


def _image(groups: list[Group]) -> bytes:
    # built in memory: a full disk or a kill then meets plain bytes of a temporary file, never a half-open HDF5 file
    with h5py.File("archive", "w", driver="core", backing_store=False, track_order=True) as file:
        for group in groups:
            _write_group(file if group.path == "/" else file.create_group(group.path, track_order=True), group)
        file.flush()
        return bytes(file.id.get_file_image())


def _write_group(target: h5py.Group, group: Group) -> None:
    for name, value in group.attributes.items():
        target.attrs[name] = np.int64(value) if isinstance(value, int) else value
    scales: dict[str, h5py.Dataset] = {}
    for variable in group.variables:
        text = variable.data.dtype.kind in "OU"
        data = variable.data.astype(object) if text else variable.data
        dataset = target.create_dataset(variable.name, data=data, dtype=_TEXT if text else None)
        if variable.units:
            dataset.attrs["units"] = variable.units
        for name, value in variable.attributes.items():
            dataset.attrs[name] = value
        if variable.dims == (variable.name,):
            dataset.make_scale(variable.name)
            scales[variable.name] = dataset
            continue
        for axis, dim in enumerate(variable.dims):
            dataset.dims[axis].attach_scale(scales[dim])


def _read_group(source: h5py.Group) -> Group:
    variables = tuple(_read_variable(item) for item in source.values() if isinstance(item, h5py.Dataset))
    attributes = {name: _plain(value) for name, value in source.attrs.items()}
    return Group(source.name, attributes, variables)


def _read_variable(dataset: h5py.Dataset) -> Variable:
    name = str(dataset.name).rpartition("/")[2]
    data: NDArray[Any]
    if h5py.check_string_dtype(dataset.dtype) is not None:
        data = np.asarray(dataset.asstr()[...], object)
    else:
        data = np.asarray(dataset[...])
    if dataset.is_scale:
        dims: tuple[str, ...] = (name,)
    else:
        dims = tuple(str(axis[0].name).rpartition("/")[2] for axis in dataset.dims)
    attributes = {key: value for key, value in dataset.attrs.items() if key not in _RESERVED}
    return Variable(name, data, dims, str(dataset.attrs.get("units", "")), attributes)


def _plain(value: Any) -> str | int:
    if isinstance(value, str):
        return value
    return int(value)


def _seal(image: bytes) -> bytes:
    return _SEAL + hashlib.sha256(image).digest()


def _check_seal(path: Path) -> None:
    data = path.read_bytes()
    image, seal = data[:-_SEAL_SIZE], data[-_SEAL_SIZE:]
    if seal.startswith(_SEAL) and seal != _seal(image):
        raise ValueError("its content does not match its seal")


def _check_format(file: h5py.File, path: Path) -> None:
    if file.attrs.get("format") != FORMAT:
        message = "is an HDF5 file but not a polewright run; give the RUN.h5 that `polewright design` wrote"
        raise InputError(message, str(path))
    version = int(file.attrs.get("format_version", 0))
    if version > FORMAT_VERSION:
        message = (
            f"has archive format {version}; this polewright reads up to format {FORMAT_VERSION}: update polewright"
        )
        raise InputError(message, str(path))


def _unreadable(path: Path, error: Exception) -> InputError:
    if not path.exists():
        message = "no such file; give the RUN.h5 that `polewright design` wrote"
    elif path.is_dir():
        message = "is a folder; give the RUN.h5 that `polewright design` wrote"
    elif isinstance(error, PermissionError):
        message = "may not be read: permission denied"
    elif not h5py.is_hdf5(path):
        message = "is not an HDF5 file, or only its beginning is left; give the RUN.h5 that `polewright design` wrote"
    elif "truncated file" in str(error):
        message = "is cut short (an incomplete copy?); copy it again or run `polewright design` again"
    else:
        message = f"is damaged or incomplete ({error}); run `polewright design` again"
    return InputError(message, str(path))
