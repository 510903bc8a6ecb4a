"""The archive against DESIGN section 9, read back with plain h5py and with xarray, and what damage does to it."""

from __future__ import annotations

import hashlib
import json
import os
import random
import signal
import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest
from polewright.models.errors import InputError
from polewright.models.part import Part
from polewright.runs.archive import open_run, read_run, write_run
from polewright.runs.output import output_path, put_in_place
from polewright.runs.records import Design, Run

from .fixtures import make_run, other_blanks, pattern, verification

WRITER = """
import itertools, sys
from dataclasses import replace
from pathlib import Path
sys.path[:0] = sys.argv[2:]
from fixtures import make_run
from polewright.runs.archive import write_run
run = make_run()
for n in itertools.count(1):
    write_run(replace(run, evaluations=n), Path(sys.argv[1]))
    if n == 1:
        sys.stdout.write("first\\n")
        sys.stdout.flush()
"""


@pytest.fixture
def path(tmp_path: Path) -> Path:
    target = tmp_path / "hatch.h5"
    write_run(make_run(verification=verification()), target)
    return target


def assert_same(one: Any, other: Any) -> None:
    """Compare records field by field; NaN equals NaN."""
    if hasattr(one, "__dataclass_fields__") and not isinstance(one, Part):
        for name in one.__dataclass_fields__:
            assert_same(getattr(one, name), getattr(other, name))
    elif isinstance(one, Part):
        fields = ("cell", "thickness", "remanence", "coating", "shape")
        assert [getattr(one, name) for name in fields] == [getattr(other, name) for name in fields]
        assert one.blank.bounds == other.blank.bounds
        assert type(one.blank) is type(other.blank)
        np.testing.assert_array_equal(one.mask, other.mask)
    elif isinstance(one, np.ndarray):
        assert one.dtype == other.dtype
        np.testing.assert_array_equal(one, other)
    elif isinstance(one, dict):
        assert one.keys() == other.keys()
        for name, value in one.items():
            assert_same(value, other[name])
    elif isinstance(one, tuple):
        assert len(one) == len(other)
        for left, right in zip(one, other, strict=True):
            assert_same(left, right)
    else:
        assert one == other or (one != one and other != other)


def test_a_run_reads_back_as_it_was_written(path: Path) -> None:
    assert_same(read_run(path), make_run(verification=verification()))
    assert open_run is read_run


@pytest.mark.parametrize("blank", ["ring", "polygon"])
def test_every_blank_reads_back(blank: str, tmp_path: Path) -> None:
    part = other_blanks()[blank]
    polarity = pattern(part, "checker")
    designs = tuple(replace(design, base=polarity) for design in make_run().designs)
    run = make_run(base=part, designs=designs)
    write_run(run, tmp_path / "run.h5")
    assert_same(read_run(tmp_path / "run.h5"), run)


def test_a_run_without_requirements_reads_back(tmp_path: Path) -> None:
    columns = tuple(replace(column, entry=0) for column in make_run().columns if column.kind == "improve")
    nothing = np.zeros(0)
    designs = tuple(
        replace(design, values=design.values[-1:], margins=nothing, feasible=True, worst_margin=np.nan)
        for design in make_run().designs
    )
    run = make_run(columns=columns, designs=designs, state={}, history=np.zeros((0, 2)))
    write_run(run, tmp_path / "run.h5")
    assert_same(read_run(tmp_path / "run.h5"), run)


def test_what_json_cannot_hold_in_the_verification_becomes_null(tmp_path: Path) -> None:
    found = verification()
    found["second_path"]["largest"] = float("nan")
    found["scatter"]["samples"] = np.int64(500)
    write_run(make_run(verification=found), tmp_path / "run.h5")
    stored = read_run(tmp_path / "run.h5").verification
    assert stored is not None
    assert stored["second_path"]["largest"] is None
    assert stored["scatter"]["samples"] == 500


class TestContract:
    """Section 9, rule by rule."""

    def test_root_attributes(self, path: Path) -> None:
        run = make_run()
        with h5py.File(path) as file:
            root = dict(file.attrs)
        assert (root["format"], root["format_version"], root["kind"]) == ("polewright-run", 1, "design")
        assert (root["title"], root["spec_toml"], root["spec_json"]) == (run.title, run.spec_toml, run.spec_json)
        assert root["spec_sha256"] == hashlib.sha256(run.spec_toml.encode()).hexdigest()
        assert (root["seed"], root["stop_reason"], root["complete"]) == (7, run.stop_reason, 1)

    def test_groups_and_datasets(self, path: Path) -> None:
        expected = (
            "provenance", "geometry/base", "geometry/mover", "designs", "designs/base", "designs/mover",
            "designs/values", "designs/margins", "designs/id", "designs/origin", "designs/feasible",
            "designs/worst_margin", "designs/on_front", "quantities/name", "quantities/unit", "quantities/label",
            "quantities/sense", "quantities/target", "curves/force_gap", "curves/gap", "history/evaluations",
            "history/best", "state", "verification",
        )  # fmt: skip
        with h5py.File(path) as file:
            assert [name for name in expected if name not in file] == []
            assert {"x", "y", "mask", "thickness", "remanence", "coating", "cell"} <= set(file["geometry/base"])

    def test_patterns_are_polarities_in_the_frame_of_the_base(self, path: Path) -> None:
        run = make_run()
        with h5py.File(path) as file:
            for name in ("base", "mover"):
                stored = file[f"designs/{name}"]
                assert stored.dtype == np.int8
                assert stored.shape == (3, *getattr(run, name).shape)
                assert np.isin(stored[...], (-1, 0, 1)).all()
                assert (np.diff(file[f"designs/{name}_y"][...]) > 0.0).all()  # row 0 is lowest y

    def test_best_first_and_sizes(self, path: Path) -> None:
        with h5py.File(path) as file:
            designs = file["designs"]
            assert designs["worst_margin"].dtype == np.float64
            assert designs["values"].shape == (3, 7)
            assert designs["margins"].shape == (3, 4)
            feasible = designs["feasible"][...]
        assert (np.diff(feasible) <= 0).all()

    def test_values_are_si_and_their_units_stand_in_quantities(self, path: Path) -> None:
        with h5py.File(path) as file:
            units = list(file["quantities/unit"].asstr()[...])
            target = file["quantities/target"][...]
        assert units == ["N", "N", "N", "N", "T", "m", "1"]
        np.testing.assert_allclose(target[:6], [20.0, 2.0, 2.0, 1.5, 5e-3, 2e-3])
        assert np.isnan(target[6])

    def test_every_number_carries_a_unit_and_no_dataset_is_opaque(self, path: Path) -> None:
        bare, opaque = [], []

        def look(name: str, item: Any) -> None:
            if not isinstance(item, h5py.Dataset):
                return
            if item.dtype.kind == "f" and "units" not in item.attrs and not name.startswith("state/"):
                bare.append(name)
            if item.dtype.kind not in "iuf" and h5py.check_string_dtype(item.dtype) is None:
                opaque.append(name)

        with h5py.File(path) as file:
            file.visititems(look)
        assert bare == []
        assert opaque == []

    def test_every_axis_has_its_scale(self, path: Path) -> None:
        bare = []

        def look(name: str, item: Any) -> None:
            if isinstance(item, h5py.Dataset) and not item.is_scale and not all(len(axis) for axis in item.dims):
                bare.append(name)

        with h5py.File(path) as file:
            file.visititems(look)
            gap = file["curves/force_gap"].dims[1][0]
            np.testing.assert_allclose(gap[...], make_run().curves["force_gap"].scale)
        assert bare == []

    def test_verification_tables_stand_beside_the_json(self, path: Path) -> None:
        with h5py.File(path) as file:
            found = json.loads(file["verification"].attrs["json"])
            assert found == verification()
            assert list(file["verification/scatter/owner"][...]) == [0, 1, 1, 1, 2, 3]
            assert file["verification/force_band/p5"].shape == (80,)
            gap = file["verification/second_path/gap"][...]
        assert np.isnan(gap[2])


def test_xarray_reads_every_group_without_arguments(path: Path) -> None:
    xarray = pytest.importorskip("xarray")
    pytest.importorskip("h5netcdf")
    with xarray.open_datatree(path, engine="h5netcdf") as tree:
        assert {"/designs", "/curves", "/quantities", "/history", "/geometry/base"} <= set(tree.groups)
    with xarray.open_dataset(path, group="designs", engine="h5netcdf") as designs:
        assert dict(designs.sizes) == {
            "design": 3, "base_y": 16, "base_x": 20, "mover_y": 18, "mover_x": 18, "column": 7, "require": 4,
        }  # fmt: skip
        assert designs["feasible"].dtype == bool
        assert list(designs["id"].values) == ["d1", "d2", "d3"]
        assert designs["base"].sel(base_x=0.5e-3, base_y=0.5e-3).shape == (3,)
    with xarray.open_dataset(path, group="curves", engine="h5netcdf") as curves:
        assert curves["force_gap"].attrs["units"] == "N"
        assert float(curves["force_gap"].isel(design=0).sel(gap=8e-3, method="nearest")) > 0.0


def test_equal_runs_give_equal_bytes(tmp_path: Path) -> None:
    write_run(make_run(), tmp_path / "one.h5")
    write_run(read_run(tmp_path / "one.h5"), tmp_path / "two.h5")
    assert (tmp_path / "one.h5").read_bytes() == (tmp_path / "two.h5").read_bytes()


def test_only_provenance_differs_between_equal_runs(tmp_path: Path) -> None:
    def digest(file: h5py.File) -> dict[str, Any]:
        found: dict[str, Any] = {"/": sorted((k, str(v)) for k, v in file.attrs.items())}

        def look(name: str, item: Any) -> None:
            if not name.startswith("provenance"):
                found[name] = item[...].tobytes() if isinstance(item, h5py.Dataset) and item.dtype.kind != "O" else None

        file.visititems(look)
        return found

    write_run(make_run(), tmp_path / "one.h5")
    write_run(make_run(provenance={"created_utc": "2031", "host": "another"}), tmp_path / "two.h5")
    with h5py.File(tmp_path / "one.h5") as one, h5py.File(tmp_path / "two.h5") as two:
        assert digest(one) == digest(two)


def test_a_reader_keeps_its_snapshot_while_the_run_is_written_again(path: Path) -> None:
    with h5py.File(path) as reader:
        write_run(make_run(stop_reason="later"), path)
        assert reader.attrs["stop_reason"] == make_run().stop_reason
        assert reader["designs/values"].shape == (3, 7)
    assert read_run(path).stop_reason == "later"


def test_a_kill_at_any_moment_leaves_a_readable_archive(tmp_path: Path) -> None:
    here = Path(__file__).parent
    places = [str(here), *(p for p in sys.path if p)]
    spread = random.Random(4)
    for attempt in range(20):
        target = tmp_path / f"run{attempt}.h5"
        command = [sys.executable, "-c", WRITER, str(target), *places]
        with subprocess.Popen(command, stdout=subprocess.PIPE) as writer:
            assert writer.stdout is not None
            assert writer.stdout.readline() == b"first\n"
            time.sleep(spread.uniform(0.0, 0.05))
            os.kill(writer.pid, signal.SIGKILL)
        stored = read_run(target)
        assert_same(stored, make_run(evaluations=stored.evaluations))


def test_a_kill_before_the_first_write_ends_leaves_no_archive(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def stop(_handle: int) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", stop)
    with pytest.raises(KeyboardInterrupt):
        write_run(make_run(), tmp_path / "run.h5")
    assert list(tmp_path.iterdir()) == []


class TestDamage:
    """Every unreadable file is refused with one sentence that says what it is."""

    def refused(self, path: Path) -> str:
        with pytest.raises(InputError) as caught:
            read_run(path)
        (line,) = caught.value.lines()
        assert line.startswith(str(path))
        return line

    def test_missing(self, tmp_path: Path) -> None:
        assert "no such file" in self.refused(tmp_path / "none.h5")

    def test_folder(self, tmp_path: Path) -> None:
        assert "folder" in self.refused(tmp_path)

    @pytest.mark.parametrize("content", [b"", b"spec_version = 1\n", b"\x89HDF\r\n\x1a\n"])
    def test_not_hdf5(self, content: bytes, tmp_path: Path) -> None:
        (tmp_path / "x.h5").write_bytes(content)
        self.refused(tmp_path / "x.h5")

    @pytest.mark.parametrize("share", [0.05, 0.3, 0.6, 0.9, 0.999])
    def test_truncated(self, share: float, path: Path) -> None:
        data = path.read_bytes()
        path.write_bytes(data[: int(len(data) * share)])
        assert "cut short" in self.refused(path)

    def test_another_programs_file(self, tmp_path: Path) -> None:
        with h5py.File(tmp_path / "x.h5", "w") as file:
            file["data"] = np.arange(3)
        assert "not a polewright run" in self.refused(tmp_path / "x.h5")

    def test_newer_format(self, path: Path) -> None:
        with h5py.File(path, "a") as file:
            file.attrs["format_version"] = 2
        assert "update polewright" in self.refused(path)

    @pytest.mark.parametrize("name", ["designs", "designs/base", "quantities/unit", "geometry/mover", "history/best"])
    def test_a_missing_piece_is_damage(self, name: str, path: Path) -> None:
        with h5py.File(path, "a") as file:
            del file[name]
        if name == "quantities/unit":  # redundant with spec_unit: readable all the same
            read_run(path)
        else:
            assert "damaged" in self.refused(path)

    def test_a_mask_that_does_not_fit_the_outline_is_damage(self, path: Path) -> None:
        with h5py.File(path, "a") as file:
            file["geometry/base/size_x"][...] = 0.01
        assert "damaged" in self.refused(path)

    def test_flipped_bytes_never_end_in_another_error(self, path: Path) -> None:
        data = bytearray(path.read_bytes())
        spread = random.Random(11)
        for _ in range(60):
            broken = bytearray(data)
            for _ in range(8):
                broken[spread.randrange(len(broken))] ^= 0xFF
            path.write_bytes(broken)
            try:
                run = read_run(path)
            except InputError:
                continue
            assert isinstance(run, Run)


def test_a_pattern_of_another_shape_is_refused(tmp_path: Path) -> None:
    run = make_run()
    wrong: Design = replace(run.designs[0], base=np.zeros((3, 3), np.int8))
    with pytest.raises(ValueError, match="reshape"):
        write_run(replace(run, designs=(wrong,)), tmp_path / "run.h5")
    assert not (tmp_path / "run.h5").exists()


def test_a_curve_over_another_scale_of_the_same_name_is_refused(tmp_path: Path) -> None:
    curve = make_run().curves["force_gap"]
    other = replace(curve, scale=curve.scale * 2.0)
    with pytest.raises(ValueError, match="share its scale"):
        write_run(make_run(curves={"force_gap": curve, "moment_gap": other}), tmp_path / "run.h5")


class TestOutput:
    """Outputs are never overwritten unasked."""

    def test_default_and_given(self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.chdir(tmp_path)
        assert output_path(None, "hatch.h5") == Path("hatch.h5")
        assert output_path(tmp_path / "x.h5", "hatch.h5") == tmp_path / "x.h5"

    def test_an_existing_output_needs_replace_or_resume(self, path: Path) -> None:
        with pytest.raises(InputError, match="--replace"):
            output_path(path, "x.h5")
        assert output_path(path, "x.h5", replace=True) == path
        assert output_path(path, "x.h5", resume=True) == path
        with pytest.raises(InputError, match="exclude"):
            output_path(path, "x.h5", replace=True, resume=True)

    def test_inputs_folders_and_missing_folders_are_refused(self, path: Path, tmp_path: Path) -> None:
        with pytest.raises(InputError, match="input"):
            output_path(path, "x.h5", replace=True, inputs=(path,))
        with pytest.raises(InputError, match="folder"):
            output_path(tmp_path, "x.h5", replace=True)
        with pytest.raises(InputError, match="no folder"):
            output_path(tmp_path / "none" / "x.h5", "x.h5")

    def test_a_file_system_that_refuses_is_bad_input(self, tmp_path: Path) -> None:
        with pytest.raises(InputError, match="cannot be written"):
            put_in_place(tmp_path / "none" / "x.h5", b"")
