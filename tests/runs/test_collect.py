"""What a report adds to its run: bounds on the curve, obvious patterns, maps that show the field itself."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from polewright.models.stray import field, place_base
from polewright.runs.records import Run
from polewright.runs.report.collect import baselines, collect_extras, force_marks
from polewright.runs.report.extras import ForceMark, RestMark
from polewright.runs.report.maps import stray_maps
from polewright.runs.resolve import problem_of
from polewright.runs.spec import Spec, parse_spec, part_of

from .fixtures import MM, make_run, pattern

SPEC = """
spec_version = 1
title = "Report fixture (invented)"
[base]
shape = "rectangle"
size_mm = [12.0, 10.0]
thickness_mm = 3.0
material = {remanence_T = 1.3}
cell_mm = 1.0
pole_width_min_mm = 2.0
[mover]
like = "base"
[[require]]
quantity = "holding_force"
gap_mm = 0.3
at_least = 5.0
[[require]]
quantity = "axial_force"
gap_mm = [3.0, 4.0]
at_least = [-2.0, -1.0]
[[require]]
quantity = "axial_force"
gap_mm = 5.0
equal_to = 1.0
within_percent = 10.0
[[require]]
quantity = "axial_force"
gap_mm = 2.0
offset_mm = [1.0, 0.0]
at_most = 9.0
[[require]]
quantity = "stray_field"
of = "base"
side = "back"
distance_mm = 8.0
at_most = 50.0
[[improve]]
quantity = "holding_force"
gap_mm = 1.0
toward = 4.0
"""


def spec_with(text: str = SPEC) -> tuple[Spec, Run]:
    spec = parse_spec(text)
    base, mover = part_of(spec.base), part_of(spec.mover)
    designs = tuple(
        replace(design, base=pattern(base, "checker"), mover=pattern(mover, "stripes"))
        for design in make_run().designs[:1]
    )
    curve = make_run().curves["force_gap"]
    curves = {"force_gap": replace(curve, values=curve.values[:1])}
    json_text = spec.resolved_json()
    return spec, make_run(base=base, mover=mover, designs=designs, spec_json=json_text, curves=curves)


def test_bounds_on_the_hold_are_bounds_on_the_axial_force_with_the_sign_turned() -> None:
    spec, _ = spec_with()
    marks = [mark for mark in force_marks(spec) if isinstance(mark, ForceMark)]
    assert [(mark.kind, mark.force) for mark in marks] == [
        ("at_most", -5.0), ("at_least", -2.0), ("at_least", -1.0), ("equal_to", 1.0), ("toward", -4.0),
    ]  # fmt: skip
    np.testing.assert_allclose([mark.gap for mark in marks], np.array([0.3, 3.0, 4.0, 5.0, 1.0]) * MM)
    assert marks[3].within == pytest.approx(0.1)


def test_maps_show_the_field_itself() -> None:
    spec, run = spec_with()
    design = run.designs[0]
    behind, cut = stray_maps(spec, run, design)
    source = place_base(run.base, design.base.astype(float))
    row, column = 20, 31
    point = np.array([[behind.x[column], behind.y[row], -run.base.thickness - 8 * MM]])
    assert behind.size[row, column] == pytest.approx(float(np.linalg.norm(field([source], point))), rel=1e-9)
    assert "8 mm" in behind.title
    assert "0.3 mm gap" in cut.title
    assert np.isnan(cut.size).any()
    border = np.concatenate((cut.size[0], cut.size[-1], cut.size[:, 0], cut.size[:, -1]))
    assert border.max() < 0.5e-3


@pytest.mark.parametrize("of", ["mover", "pair"])
@pytest.mark.parametrize("side", ["back", "front"])
def test_planes_keep_clear_of_the_magnets(of: str, side: str) -> None:
    gap = "\ngap_mm = 0.3" if of == "pair" else ""
    text = SPEC.replace('of = "base"', f'of = "{of}"').replace('side = "back"', f'side = "{side}"{gap}')
    spec, run = spec_with(text)
    plane = stray_maps(spec, run, run.designs[0])[0]
    assert np.isfinite(plane.size).all()
    assert plane.size.max() < 0.6


def test_obvious_patterns_are_judged_by_the_same_problem() -> None:
    spec, run = spec_with()
    problem = problem_of(spec)
    found = {baseline.name: baseline.values for baseline in baselines(spec, problem, run.designs[0])}
    assert list(found) == ["uniform", "stripes", "checker"]
    for values in found.values():
        assert values.shape == (7,)
    # a free mover meets its like or its reverse, whichever is nearer to the spec: here the one that holds
    assert all(values[0] > 0.0 for values in found.values())


def test_a_given_pair_has_no_obvious_alternative() -> None:
    text = SPEC.replace("pole_width_min_mm = 2.0", 'pattern = "plain-N"').replace(
        'like = "base"', 'like = "base"\npattern = "plain-S"'
    )
    _, run = spec_with(text)
    assert collect_extras(run, run.designs[0]).baselines == ()


def test_extras_follow_the_conditions_of_the_spec() -> None:
    text = SPEC + '[conditions]\nlateral = "free"\n'
    _, run = spec_with(text)
    extras = collect_extras(run, run.designs[0])
    assert (extras.rotation, extras.lateral, extras.needs_guide) == ("locked", "free", False)
    stand_off = 'quantity = "stand_off"\nbetween_mm = [1, 5]'
    _, run = spec_with(SPEC.replace('quantity = "axial_force"\ngap_mm = 5.0', stand_off))
    assert collect_extras(run, run.designs[0]).needs_guide


@pytest.mark.parametrize(
    ("bound", "low", "high"),
    [("equal_to = 3.0\nwithin = 0.25", 2.75, 3.25), ("at_least = 2.0", 2.0, 5.0), ("at_most = 4.0", 1.0, 4.0)],
)
def test_a_stand_off_is_marked_where_the_mover_may_rest(bound: str, low: float, high: float) -> None:
    asked = f'[[require]]\nquantity = "stand_off"\nload_N = 0.5\nbetween_mm = [1, 5]\n{bound}\n'
    spec, _ = spec_with(SPEC + asked)
    (mark,) = [mark for mark in force_marks(spec) if isinstance(mark, RestMark)]
    assert (mark.load, mark.low, mark.high) == pytest.approx((0.5, low * MM, high * MM))
