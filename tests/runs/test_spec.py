"""A spec is read whole: defaults, ``like``, files, grades, JSON and back."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path

import numpy as np
import pytest
from polewright.models.errors import InputError
from polewright.models.material import GRADES, lookup
from polewright.objectives.catalogue import CATALOGUE
from polewright.runs.examples import NAMES, example_text
from polewright.runs.spec import CellFile, Spec, json_schema, load_spec, parse_spec, part_of, spec_from_json
from pydantic import ValidationError

SHORT = """
spec_version = 1

[base]
shape = "rectangle"
size_mm = [4, 3.5]
thickness_mm = 2
material = "HF 28/28"
cell_mm = 1

[mover]
like = "base"

[[require]]
quantity = "axial_force"
gap_mm = [1, 2]
at_least = 0.5
"""


def test_defaults_are_those_of_the_contract() -> None:
    spec = parse_spec(SHORT)
    base = spec.base
    assert (base.coating_um, base.lattice, base.levels, base.symmetry) == (0.0, "square", 2, "none")
    assert (base.pattern, base.fixed, base.pole_width_min_mm) == ("free", "none", 1.0)
    assert (spec.conditions.temperature_C, spec.conditions.rotation, spec.conditions.lateral) == (
        20.0,
        "locked",
        "guided",
    )
    assert spec.tolerances.model_dump() == {
        "remanence_percent": 3.0,
        "imbalance_percent": 2.0,
        "pole_position_mm": 0.15,
        "gap_mm": 0.05,
        "offset_mm": 0.1,
        "angle_deg": 0.5,
        "thickness_mm": 0.05,
        "samples": 500,
    }
    assert (spec.search.seed, spec.search.starts, spec.search.evaluations) == (0, 32, 200_000)
    assert spec.search.budget_s is None
    assert spec.search.start is None


def test_an_entry_offers_settings_bounds_and_list() -> None:
    entry = parse_spec(SHORT).require[0]
    assert entry.settings == {"gap_mm": (1.0, 2.0), "offset_mm": (0.0, 0.0)}
    assert (entry.kind, entry.bounds, entry.bands, entry.listed, entry.count) == (
        "at_least",
        (0.5, 0.5),
        None,
        "gap_mm",
        2,
    )


def test_within_percent_becomes_a_band_of_each_target() -> None:
    text = SHORT.replace("at_least = 0.5", "equal_to = [2, -4]\nwithin_percent = 10")
    entry = parse_spec(text).require[0]
    assert entry.kind == "equal_to"
    assert entry.bands == pytest.approx((0.2, 0.4), rel=1e-15)


def test_like_copies_every_key_and_own_keys_win() -> None:
    spec = parse_spec(SHORT.replace('like = "base"', 'like = "base"\nthickness_mm = 5\npattern = "plain-S"'))
    assert spec.mover.thickness_mm == 5.0
    assert spec.mover.pattern == "plain-S"
    assert spec.mover.material == spec.base.material
    assert spec.base.pattern == "free"


def test_a_mover_of_another_shape_leaves_the_base_s_sizes() -> None:
    spec = parse_spec(SHORT.replace('like = "base"', 'like = "base"\nshape = "disc"\ndiameter_mm = 4'))
    assert spec.mover.shape == "disc"
    assert part_of(spec.mover).cells == 12


def test_a_material_table_replaces_a_grade_whole() -> None:
    spec = parse_spec(SHORT.replace('like = "base"', 'like = "base"\n[mover.material]\nremanence_T = 1.1'))
    assert spec.mover.material.to_material().remanence == 1.1
    assert spec.mover.material.hcj_kA_m is None
    assert not spec.mover.material.from_memory


def test_a_grade_becomes_numbers_with_their_source() -> None:
    material = parse_spec(SHORT).base.material
    assert (material.name, material.remanence_T, material.hcb_kA_m, material.hcj_kA_m) == (
        "HF 28/28",
        0.385,
        260.0,
        280.0,
    )
    assert material.remanence_percent_per_C == -0.2
    assert material.from_memory
    assert material.to_material() == GRADES["HF 28/28"]


def test_grades_are_physically_possible() -> None:
    for grade in GRADES.values():
        assert grade.hcb is not None
        assert grade.hcj is not None
        assert grade.hcb <= grade.hcj
        assert grade.hcb <= grade.remanence / (4e-7 * np.pi)
        assert lookup(grade.name.lower().replace(" ", "")) is grade


def test_the_rim_is_what_whole_cells_leave_over() -> None:
    part = part_of(parse_spec(SHORT).base)
    assert part.shape == (3, 4)
    assert part.rim == pytest.approx((0.0, 0.5e-3), abs=1e-15)


def test_remanence_follows_the_temperature() -> None:
    spec = parse_spec(SHORT + "\n[conditions]\ntemperature_C = -30\n")
    assert part_of(spec.base, spec.conditions.temperature_C).remanence == pytest.approx(0.385 * 1.1, rel=1e-14)


@pytest.mark.parametrize(
    ("shape", "cells"),
    [
        ("outline_mm = [[0, 0], [4, 0], [4, 4], [0, 4]]", 16),
        ("outline_mm = [[[0, 0], [4, 0], [4, 4], [0, 4]], [[1, 1], [3, 1], [3, 3], [1, 3]]]", 12),
    ],
)
def test_polygons_take_one_loop_or_several(shape: str, cells: int) -> None:
    text = SHORT.replace('"rectangle"', '"polygon"').replace("size_mm = [4, 3.5]", shape)
    assert part_of(parse_spec(text).base).cells == cells


def test_files_are_relative_to_the_spec_and_kept_in_it(tmp_path: Path) -> None:
    folder = tmp_path / "specs"
    folder.mkdir()
    (folder / "p.csv").write_text(
        "\ufeff# lowest y first\r\n1,-1,0,+1\r\n1,1,1,1\r\n-1,-1,-1,-1\r\n\r\n", encoding="utf-8"
    )
    (folder / "f.csv").write_text("1,,,\n,,,\n,,,-1\n", encoding="utf-8")
    text = SHORT.replace("cell_mm = 1", 'cell_mm = 1\nfixed = "f.csv"').replace(
        'like = "base"', 'like = "base"\nfixed = "none"\npattern = "p.csv"'
    )
    (folder / "s.toml").write_text(text + '\n[search]\nstart = "p.csv"\n', encoding="utf-8")
    spec = load_spec(folder / "s.toml")
    assert isinstance(spec.mover.pattern, CellFile)
    assert spec.mover.pattern.values.tolist() == [[1, -1, 0, 1], [1, 1, 1, 1], [-1, -1, -1, -1]]
    assert spec.mover.pattern.values.dtype == np.int8
    assert isinstance(spec.base.fixed, CellFile)
    assert spec.base.fixed.given.sum() == 2
    assert spec.base.fixed.values[2, 3] == -1
    for file in folder.iterdir():
        file.unlink()
    assert spec_from_json(spec.resolved_json(), spec.toml) == spec


@pytest.mark.parametrize("name", NAMES)
def test_examples_are_valid_and_survive_json(name: str) -> None:
    text = example_text(name)
    assert "invented" in text.splitlines()[0]
    spec = parse_spec(text, source=name)
    again = spec_from_json(spec.resolved_json(), text)
    assert again == spec
    assert again.resolved_json() == spec.resolved_json()
    assert spec.toml == text
    assert spec.sha256 == hashlib.sha256(text.encode()).hexdigest()


def test_a_spec_does_not_change() -> None:
    spec = parse_spec(SHORT)
    with pytest.raises(ValidationError):
        spec.title = "other"


def test_given_patterns_need_no_wish() -> None:
    text = SHORT[: SHORT.index("[[require]]")].replace("cell_mm = 1", 'cell_mm = 1\npattern = "plain-N"')
    assert parse_spec(text).is_given
    assert parse_spec(text.replace('like = "base"', 'like = "base"\npattern = "matched"')).is_given
    with pytest.raises(InputError, match="at least one"):
        parse_spec(text.replace('like = "base"', 'like = "base"\npattern = "free"'))


def test_field_quantities_take_a_gap_for_the_pair_alone() -> None:
    text = SHORT.replace("axial_force", "field_reach").replace("gap_mm = [1, 2]\n", "").replace("at_least", "at_most")
    assert parse_spec(text.replace("at_most", 'of = "base"\nat_most')).require[0].settings == {
        "of": "base",
        "field_mT": 0.5,
    }
    assert parse_spec(text.replace("at_most", "gap_mm = 1\nat_most")).require[0].settings["of"] == "pair"


def test_the_schema_names_every_quantity_with_its_keys() -> None:
    schema = json_schema()
    json.dumps(schema)
    definitions = schema["$defs"]
    for kind in ("Require", "Improve"):
        for info in CATALOGUE.values():
            definition = definitions[kind + info.name.title().replace("_", "")]
            assert {key.name for key in info.keys} < set(definition["properties"])
            assert definition["properties"]["quantity"]["const"] == info.name
            assert {key.name for key in info.keys if key.required} | {"quantity"} == set(definition["required"])
            assert definition["additionalProperties"] is False


def test_the_schema_knows_that_a_mover_may_be_like_the_base() -> None:
    schema = json_schema()
    assert schema["$defs"]["MoverLikeBase"]["required"] == ["like"]
    assert {"$ref": "#/$defs/MoverLikeBase"} in schema["properties"]["mover"]["anyOf"]


@pytest.mark.parametrize("text", ["", "[]", "{", "{}", '{"spec_version": 1}', "[" * 100_000])
def test_damaged_json_is_bad_input(text: str) -> None:
    with pytest.raises(InputError):
        spec_from_json(text)


def test_cells_stand_in_json_alone() -> None:
    whole = json.loads(parse_spec(SHORT).resolved_json())
    whole["base"]["pattern"] = {"name": "p", "cells": [[1, 1, 1, 1]] * 3}
    assert isinstance(spec_from_json(json.dumps(whole)).base.pattern, CellFile)
    for cells in ([[1, 1, 1, 1]] * 2, [[1, 2, 1, 1]] * 3, [[1], [1, 1]], [], "1"):
        whole["base"]["pattern"]["cells"] = cells
        with pytest.raises(InputError):
            spec_from_json(json.dumps(whole))
    with pytest.raises(InputError, match=r"base\.pattern"):
        parse_spec(SHORT.replace("cell_mm = 1", 'cell_mm = 1\npattern = {name = "p", cells = [[1]]}'))


def test_the_type_is_public() -> None:
    assert isinstance(parse_spec(SHORT), Spec)
