"""Bad specs: exit code 2, a message that says where and what, nothing on stdout, nothing written."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from polewright.runs.cli import run

HATCH = """# a specification without a mistake
spec_version = 1

[base]
shape = "rectangle"
size_mm = [20.0, 20.0]
thickness_mm = 3.0
material = "REFeB 320/88"
coating_um = 15
cell_mm = 1.0
pole_width_min_mm = 2.0
symmetry = "half-turn"

[mover]
like = "base"

[conditions]
temperature_C = 20.0

[[require]]
id = "K1"
quantity = "holding_force"
gap_mm = [0.3, 1.0]
at_least = [15.0, 1.5]

[[require]]
id = "K2"
quantity = "axial_force"
gap_mm = [3.0, 4.0, 5.0]
at_least = 1.0

[[require]]
id = "K3"
quantity = "stray_field"
of = "base"
side = "back"
distance_mm = 10.0
at_most = 15.0

[[improve]]
quantity = "holding_force"
gap_mm = 0.3
sense = "maximize"

[search]
seed = 0
"""
RING = HATCH.replace('"rectangle"', '"ring"').replace("size_mm = [20.0, 20.0]", "outer_mm = 24.0\ninner_mm = 6.0")
RANGE = 'quantity = "stand_off"\nbetween_mm = [0.5, 8.0]'
RING = RING.replace('quantity = "axial_force"\ngap_mm = [3.0, 4.0, 5.0]', RANGE)
MOVER = '[mover]\nlike = "base"'
BOUND = "at_least = 1.0\n"
ANOTHER = '[[require]]\nquantity = "{}"\n{}\n[search]'

# What is done to the hatch example (old text, new text), the line and the key that the message names, words of it.
CASES: dict[str, tuple[str, str, str, tuple[str, ...]]] = {
    "misspelt key": ("coating_um", "coatng_um", "base.coatng_um", ("coating_um",)),
    "misspelt table": ("[conditions]", "[condition]", "condition", ("conditions",)),
    "wrong type": ("thickness_mm = 3.0", 'thickness_mm = "3"', "base.thickness_mm", ("number", '"3"')),
    "true is no number": ("thickness_mm = 3.0", "thickness_mm = true", "base.thickness_mm", ("number", "true")),
    "negative thickness": ("thickness_mm = 3.0", "thickness_mm = -3.0", "base.thickness_mm", ("-3",)),
    "nan": ("thickness_mm = 3.0", "thickness_mm = nan", "base.thickness_mm", ("finite", "nan")),
    "infinity": (BOUND, "at_least = inf\n", "require.1.at_least", ("finite", "inf")),
    "negative gap": ("gap_mm = [3.0", "gap_mm = [-3.0", "require.1.gap_mm.0", ("at least 0", "-3")),
    "unknown quantity": ('"axial_force"', '"axial_forec"', "require.1.quantity", ("axial_force", "axial_forec")),
    "no quantity": ('quantity = "axial_force"', "#", "require.1.quantity", ("required",)),
    "unknown grade": ("REFeB 320/88", "REFeB 320/98", "base.material", ("REFeB 320/88", "remanence_T")),
    "unknown shape": ('"rectangle"', '"square"', "base.shape", ("rectangle",)),
    "no shape": ('shape = "rectangle"', "#", "base.shape", ("required", "ring")),
    "key of another shape": ("size_mm = [20.0, 20.0]", "size_mm = [20, 20]\ninner_mm = 3", "base.inner_mm", ("ring",)),
    "missing size": ("size_mm = [20.0, 20.0]", "#", "base.size_mm", ("required", "rectangle")),
    "later lattice": ("cell_mm = 1.0", 'lattice = "polar"\ncell_mm = 1.0', "base.lattice", ('"square"', '"polar"')),
    "later levels": ("cell_mm = 1.0", "levels = 3\ncell_mm = 1.0", "base.levels", ("must be 2", "3")),
    "later kind": (MOVER, '[mover]\nlike = "base"\nkind = "steel"', "mover.kind", ("unknown key",)),
    "like what": ('like = "base"', 'like = "mover"', "mover.like", ('"base"', '"mover"')),
    "no mover": (MOVER, "", "mover", ("required", 'like = "base"')),
    "version": ("spec_version = 1", "spec_version = 2", "spec_version", ("must be 1", "2")),
    "version is no truth": ("spec_version = 1", "spec_version = true", "spec_version", ("whole number", "true")),
    "pole under a cell": ("pole_width_min_mm = 2.0", "pole_width_min_mm = 0.5",
        "base.pole_width_min_mm", ("0.5", "cell_mm = 1")),
    "pole over the blank": ("pole_width_min_mm = 2.0", "pole_width_min_mm = 25",
        "base.pole_width_min_mm", ("20 x 20",)),
    "no whole cell": ("cell_mm = 1.0", "cell_mm = 25.0", "base.cell_mm", ("20 x 20",)),
    "too many cells": ("cell_mm = 1.0", "cell_mm = 0.07", "base.cell_mm", ("65536",)),
    "absurdly many cells": ("cell_mm = 1.0", "cell_mm = 0.001", "base.cell_mm", ("65536",)),
    "other pitch": (MOVER, MOVER + "\ncell_mm = 2.0", "mover.cell_mm", ("base.cell_mm",)),
    "odd count": ('"half-turn"', '"odd-x"\nsize_mm = [21.0, 20.0]', "base.symmetry", ("21 x 20", "even number")),
    "quarter turn": ('"half-turn"', '"quarter-turn"\nsize_mm = [20.0, 18.0]', "base.symmetry", ("20 x 18",)),
    "no such symmetry": ('"half-turn"', '"half-tern"', "base.symmetry", ("half-turn",)),
    "symmetry of a given pattern": ("cell_mm = 1.0", 'cell_mm = 1.0\npattern = "plain-N"', "base.symmetry", ("free",)),
    "matched base": ('symmetry = "half-turn"', 'pattern = "matched"', "base.pattern", ("mover",)),
    "neither word nor file": ('symmetry = "half-turn"', 'pattern = "plain"', "base.pattern", ("plain-N", ".csv")),
    "matched but other cells": (MOVER, MOVER + '\npattern = "matched"\nsize_mm = [20, 19]',
        "mover.pattern", ("20 x 19",)),
    "same but thicker": (MOVER, MOVER + '\npattern = "same"\nthickness_mm = 4', "mover.thickness_mm", ("identical",)),
    "pattern file missing": ('symmetry = "half-turn"', 'pattern = "none.csv"',
        "base.pattern", ("no such file", "none.csv")),
    "pattern file of wrong shape": ('symmetry = "half-turn"', 'pattern = "small.csv"',
        "base.pattern", ("20 lines", "2 lines")),
    "pattern file with other values": ('symmetry = "half-turn"', 'pattern = "two.csv"',
        "base.pattern", ("line 2", '"2"')),
    "ragged pattern file": ('symmetry = "half-turn"', 'pattern = "ragged.csv"',
        "base.pattern", ("line 2", "as the first")),
    "empty pattern file": ('symmetry = "half-turn"', 'pattern = "empty.csv"', "base.pattern", ("none",)),
    "binary pattern file": ('symmetry = "half-turn"', 'pattern = "binary.csv"', "base.pattern", ("UTF-8", "line 2")),
    "folder as pattern file": ('symmetry = "half-turn"', 'pattern = "folder.csv"', "base.pattern", ("folder",)),
    "free field in a pattern": ('symmetry = "half-turn"', 'pattern = "free.csv"', "base.pattern", ("line 1",)),
    "fixed file of wrong shape": ('symmetry = "half-turn"', 'fixed = "free.csv"', "base.fixed", ("20 lines",)),
    "start of wrong shape": ("seed = 0", 'start = "small.csv"', "search.start", ("20 lines",)),
    "no list for two keys": ("gap_mm = [3.0", "offset_mm = [[0, 0], [1, 0]]\ngap_mm = [3.0",
        "require.1.offset_mm", ("one key",)),
    "bound list of other length": (BOUND, "at_least = [1, 2]\n", "require.1.at_least", ("gap_mm (3)", "2 numbers")),
    "bound list without a list": ("gap_mm = [3.0, 4.0, 5.0]\n" + BOUND, "gap_mm = 3\nat_least = [1]\n",
        "require.1.at_least", ("one number",)),
    "empty list": ("gap_mm = [3.0, 4.0, 5.0]", "gap_mm = []", "require.1.gap_mm", ("at least 1",)),
    "one number for a size": ("size_mm = [20.0, 20.0]", "size_mm = [20.0]", "base.size_mm", ("two numbers", "[20]")),
    "no bound": (BOUND, "", "require.1", ("exactly one", "none")),
    "two bounds": (BOUND, BOUND + "at_most = 2\n", "require.1", ("exactly one", "at_most")),
    "equality without a band": (BOUND, "equal_to = 2\n", "require.1", ("within",)),
    "band without equality": (BOUND, BOUND + "within = 1\n", "require.1.within", ("equal_to",)),
    "percent of nothing": (BOUND, "equal_to = 0\nwithin_percent = 5\n", "require.1.within_percent", ("within",)),
    "scale": (BOUND, BOUND + "scale = 0\n", "require.1.scale", ("larger than 0",)),
    "id twice": ('"K2"', '"K1"', "require.1.id", ("unique", "require.0")),
    "sense and toward": ('sense = "maximize"', 'sense = "maximize"\ntoward = 3', "improve.0", ("exactly one",)),
    "no sense": ('sense = "maximize"', "", "improve.0", ("exactly one", "none")),
    "log of a negative": ('sense = "maximize"', "toward = -3\nlog = true", "improve.0.log", ("-3",)),
    "pair without gap": ('of = "base"\n', "", "require.2.gap_mm", ("required",)),
    "gap of a part alone": ('side = "back"', 'side = "back"\ngap_mm = 1', "require.2.gap_mm", ("pair",)),
    "contradiction of two": ("[search]", ANOTHER.format("axial_force", "gap_mm = 4\nat_most = 0.5"), "require.3",
                             ("gap_mm = 4", "at least 1", "require.1 (line 26)", "at most 0.5", "require.3 (line 45)")),
    "contradiction of mirrored": ("[search]", ANOTHER.format("holding_force", "gap_mm = 5\nat_least = 0"),
                                  "require.3", ("holding_force", "gap_mm = 5", "at least 0")),
    "contradiction of equalities": ("[search]", ANOTHER.format("axial_force", "gap_mm = 4\nequal_to = 0\nwithin = 0.5"),
                                    "require.3", ("at most 0.5",)),
    "temperature list": ("temperature_C = 20.0", "temperature_C = [20, 60]", "conditions.temperature_C", ("number",)),
    "magnet above its Curie point": ("temperature_C = 20.0", "temperature_C = 960", "base.material", ("remanence",)),
    "fraction of a start": ("seed = 0", "starts = 1.5", "search.starts", ("whole number", "1.5")),
    "negative seed": ("seed = 0", "seed = -1", "search.seed", ("at least 0",)),
}  # fmt: skip

TABLE = "\n[base.material]\nremanence_T = {}\n"
TABLES = {
    "remanence": ("2.5", "base.material.remanence_T", ("at most 2",)),
    "remanence range": ("{ min = 1.2, nom = 1.3, max = 1.4 }", "base.material.remanence_T", ("number",)),
    "hcb over Br": ("1.0\nhcb_kA_m = 900", "base.material.hcb_kA_m", ("796",)),
    "hcj under hcb": ("1.3\nhcb_kA_m = 900\nhcj_kA_m = 800", "base.material.hcj_kA_m", ("hcb_kA_m",)),
    "no coefficient": ("1.3", "base.material", ("remanence_percent_per_C", "40 C")),
}  # fmt: skip


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    (tmp_path / "small.csv").write_text("1,-1\n-1,1\n", encoding="utf-8")
    (tmp_path / "two.csv").write_text("# comment\n1,2\n", encoding="utf-8")
    (tmp_path / "ragged.csv").write_text("1,1\n1\n", encoding="utf-8")
    (tmp_path / "free.csv").write_text("1,,1\n", encoding="utf-8")
    (tmp_path / "empty.csv").write_text("# nothing\n\n", encoding="utf-8")
    (tmp_path / "binary.csv").write_bytes(b"1,1\n\xff\xfe")
    (tmp_path / "folder.csv").mkdir()
    monkeypatch.chdir(tmp_path)
    return tmp_path


def refused(capsys: pytest.CaptureFixture[str], folder: Path, text: str | bytes) -> list[str]:
    """Check ``text`` as a spec and return the lines of the message; nothing else may have happened."""
    (folder / "s.toml").write_bytes(text if isinstance(text, bytes) else text.encode())
    before = sorted(folder.rglob("*"))
    assert run(["spec", "check", "s.toml"]) == 2
    assert sorted(folder.rglob("*")) == before
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "Traceback" not in shown.err
    return shown.err.splitlines()


@pytest.mark.parametrize("name", CASES)
def test_one_mistake_one_message(name: str, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    old, new, key, words = CASES[name]
    assert old in HATCH
    text = HATCH.replace(old, new, 1)
    if new.count("size_mm") and "symmetry" in key:
        text = text.replace("size_mm = [20.0, 20.0]", "#", 1)
    lines = refused(capsys, folder, text)
    assert len(lines) == 1, lines
    assert lines[0].startswith("s.toml:")
    assert f": {key}: " in lines[0]
    for word in words:
        assert word in lines[0]


@pytest.mark.parametrize("name", TABLES)
def test_material_tables(name: str, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    numbers, key, words = TABLES[name]
    text = HATCH.replace('material = "REFeB 320/88"', "#").replace("[mover]", TABLE.format(numbers) + "[mover]")
    text = text.replace("temperature_C = 20.0", "temperature_C = 40.0") if name == "no coefficient" else text
    lines = refused(capsys, folder, text)
    assert len(lines) == 1, lines
    assert f": {key}: " in lines[0]
    for word in words:
        assert word in lines[0]


@pytest.mark.parametrize(
    ("old", "new", "key", "words"),
    [
        ("inner_mm = 6.0", "inner_mm = 24.0", "base.inner_mm", "outer_mm"),
        ("inner_mm = 6.0", "inner_mm = 23.9", "base.cell_mm", "no cell"),
        ("between_mm = [0.5, 8.0]", "between_mm = [8.0, 0.5]", "require.1.between_mm", "rising"),
        ("between_mm = [0.5, 8.0]", "between_mm = [0.5]", "require.1.between_mm", "two numbers [from, to]"),
        ("at_least = 1.0", "equal_to = 1\nwithin = 1\nwithin_percent = 3", "require.1", "exactly one"),
    ],
)
def test_rings_and_ranges(
    old: str, new: str, key: str, words: str, folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    lines = refused(capsys, folder, RING.replace(old, new, 1))
    assert len(lines) == 1, lines
    assert f": {key}: " in lines[0]
    assert words in lines[0]


def test_values_outside_the_mask(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "p.csv").write_text("\n".join(["1," * 15 + "1"] * 16), encoding="utf-8")
    text = HATCH.replace('"rectangle"', '"disc"').replace("size_mm = [20.0, 20.0]", "diameter_mm = 16")
    text = text.replace('symmetry = "half-turn"', 'pattern = "p.csv"')
    lines = refused(capsys, folder, text)
    assert len(lines) == 1
    assert "base.pattern" in lines[0]
    assert "0 outside the blank, received 1 in row 1, field 1 (48 such" in lines[0]


def test_fixed_cells_obey_the_symmetry(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    free = "," * 19
    (folder / "f.csv").write_text("\n".join(["1" + free, *[free] * 18, free + "-1"]), encoding="utf-8")
    text = HATCH.replace('symmetry = "half-turn"', 'symmetry = "half-turn"\nfixed = "f.csv"')
    lines = refused(capsys, folder, text)
    assert len(lines) == 1
    assert "base.symmetry" in lines[0]
    assert "fixed cells" in lines[0]


@pytest.mark.parametrize("loop", ["[[0, 0], [4, 4], [4, 0], [0, 4]]", "[[0, 0], [1, 1], [2, 2]]"])
def test_outlines_that_are_none(loop: str, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = HATCH.replace('"rectangle"', '"polygon"').replace("size_mm = [20.0, 20.0]", f"outline_mm = {loop}")
    lines = refused(capsys, folder, text)
    assert len(lines) == 1
    assert "base.outline_mm" in lines[0]


def test_a_lopsided_outline_is_not_the_same_turned_over(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    loop = "outline_mm = [[0, 0], [20, 0], [20, 20], [10, 20], [10, 10], [0, 10]]"
    text = HATCH.replace('"rectangle"', '"polygon"').replace("size_mm = [20.0, 20.0]", loop)
    lines = refused(capsys, folder, text)
    assert [line for line in lines if "base.symmetry" in line]
    text = text.replace('"half-turn"', '"none"').replace('like = "base"', 'like = "base"\npattern = "same"')
    lines = refused(capsys, folder, text)
    assert len(lines) == 1
    assert "turned over" in lines[0]


def test_all_mistakes_at_once_in_the_order_of_the_file(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = HATCH.replace("spec_version = 1", "spec_version = 3").replace("thickness_mm", "thicknes_mm", 1)
    text = text.replace("gap_mm = [3.0", "gap_mm = [-3.0").replace('"K3"', '"K1"').replace("seed = 0", "sed = 0")
    lines = refused(capsys, folder, text)
    keys = [line.split(": ")[1] for line in lines]
    assert keys == [
        "spec_version",
        "base.thickness_mm",
        "base.thicknes_mm",
        "require.1.gap_mm.0",
        "require.2.id",
        "search.sed",
    ]
    numbers = [int(line.split(":")[1]) for line in lines]
    assert numbers == sorted(numbers)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"spec_version = = 1", ("s.toml:1: ", "TOML")),
        (b"a = 1\nb = 2\na = 3", ("s.toml:3: ", "TOML")),
        (b"a = [1,\n2", ("s.toml:2: ", "TOML")),
        (b"x = \xff\xfe", ("UTF-8", "line 1")),
        (b"\xef\xbb\xbfspec_version = 1", ("byte-order mark",)),
        (b"a = " + b"[" * 5000, ("TOML",)),
        (b"a = " + b"9" * 5000, ("TOML",)),
        (b"\x00", ("TOML",)),
        (b"\x89HDF\r\n\x1a\n", ("HDF5", "text file")),
    ],
)
def test_files_that_are_no_toml(
    content: bytes, words: tuple[str, ...], folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    lines = refused(capsys, folder, content)
    assert len(lines) == 1
    for word in words:
        assert word in lines[0]


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("missing.toml", "no such file; check the name and the folder"),
        ("folder.csv", "is a folder; a file is needed"),
        ("small.csv/x.toml", "cannot be read: Not a directory"),
    ],
)
def test_files_that_are_none(name: str, message: str, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    before = sorted(folder.rglob("*"))
    assert run(["spec", "check", name]) == 2
    assert capsys.readouterr().err == f"{name}: {message}\n"
    assert sorted(folder.rglob("*")) == before


def test_one_table_in_place_of_a_list_of_tables(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (line,) = [line for line in refused(capsys, folder, "[require]\nat_least = 1") if ": require: " in line]
    assert line.startswith("s.toml:1: ")
    assert "write [[require]], not [require]" in line


def test_fields_apart_by_semicolons(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "p.csv").write_text("1;1\n", encoding="utf-8")
    (line,) = refused(capsys, folder, HATCH.replace('symmetry = "half-turn"', 'pattern = "p.csv"'))
    assert line.endswith('received "1;1"; separate fields by commas')


def test_an_empty_file_lacks_everything(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    lines = refused(capsys, folder, "")
    assert [line.split(": ")[1] for line in lines] == ["spec_version", "base", "mover"]


def test_with_json_an_error_is_one_object(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "s.toml").write_text(HATCH.replace("coating_um", "coatng_um"), encoding="utf-8")
    assert run(["spec", "check", "s.toml", "--json"]) == 2
    result = json.loads(capsys.readouterr().out)
    assert (result["status"], result["command"], result["designs"]) == ("error", "spec", [])
    (error,) = result["errors"]
    assert (error["path"], error["line"]) == ("base.coatng_um", 9)
    assert "coating_um" in error["message"]
