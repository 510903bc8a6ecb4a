"""What ``verify`` found, in words: whose it is, what disagrees, wrong assembly in few lines; and labels that read."""

from __future__ import annotations

from typing import Any

import pytest
from polewright.runs.judged import merged_label
from polewright.runs.report.extras import ReportExtras
from polewright.runs.report.page import render
from polewright.runs.resolve import columns_of
from polewright.runs.verification.words import (
    ANY_WAY,
    HARMLESS,
    accuracy,
    elsewhere,
    harmless,
    second_sentences,
    verification_of,
    wrong_ways,
)

from .fixtures import make_run, verification
from .verified import require, spec_of


def way(name: str, text: str, **flags: bool) -> dict[str, Any]:
    return {"name": name, "text": text, "values": [], "changes": True, "likely": True, "dangerous": False} | flags


def test_a_verification_belongs_to_its_design() -> None:
    run = make_run(verification=verification())
    first, second, _ = run.designs
    assert verification_of(run, first) is run.verification
    assert verification_of(run, second) is None
    assert elsewhere(run, first) == ""
    assert elsewhere(run, second).startswith("Verified was design d1, not d2")
    assert elsewhere(make_run(), first) == ""


def test_a_report_on_another_design_shows_none_of_its_figures() -> None:
    run = make_run(verification=verification())
    own, other = render(run, ReportExtras(), "d1"), render(run, ReportExtras(), "d2")
    for phrase in ("5 to 95 % of sampled parts", "Second physics path", "91.6 %", "Wrong assembly", "sampled parts"):
        assert phrase in own
        assert phrase not in other
    assert "Verified was design d1, not d2" in other


def test_what_the_second_path_says() -> None:
    found = second_sentences(
        {"failed": ["F: 1 N against 2 N"], "missed": ["K1"], "unchecked": [{"what": "K2", "why": "it diverges"}]}
    )
    assert found == [
        "Disagreement in F: 1 N against 2 N.", "By the second path, K1 is missed.", "Not checked is K2: it diverges.",
    ]  # fmt: skip


def test_how_figures_of_the_scatter_were_found() -> None:
    by_table = "interpolation, checked against exact pairs"
    rows = [{"label": "A", "method": by_table, "error": 1e-7}, {"label": "B", "method": by_table, "error": 0.0123}]
    (sentence,) = accuracy(rows)
    assert "off by at most 1.2 % of the band" in sentence
    assert "A" not in sentence
    rows += [{"label": "C", "method": "exact evaluation of the first 100 pairs", "error": None}]
    of_two, exact = accuracy(rows)
    assert "Figures of A and B come from interpolation" in of_two
    assert "Figures of C come from exact evaluation of the first 100 pairs" in exact
    assert "without limit" in exact
    rows += [{"label": "D", "method": "does not change with tolerances", "error": 0.0}]
    assert accuracy(rows)[-1] == "D: does not change with tolerances."


def test_wrong_ways_that_say_the_same_are_one_and_dangers_come_first() -> None:
    found = wrong_ways({"assembly": [
        way("mover turned by 180 deg", "Nothing.", changes=False),
        way("mover turned by 90 deg", "It repels."),
        way("mover turned by 270 deg", "It repels."),
        way("mover upside down, tipped over about x", "It jumps.", dangerous=True),
        way("mover upside down, tipped over about y", "It jumps.", dangerous=True),
        way("mover shifted by one pole (2 mm) along +x", "It slides 1.", likely=False),
        way("mover shifted by one pole (2 mm) along -x", "It slides 2.", likely=False),
        way("mover shifted by one pole (2 mm) along +y", "It slides 3.", likely=False),
    ]})  # fmt: skip
    assert [(item.name, item.text) for item in found] == [
        ("mover upside down, tipped over about x or y", "It jumps."),
        ("mover turned by 90 or 270 deg", "It repels."),
        ("mover shifted by one pole (2 mm) along +x, -x or +y", "Of the first of these: It slides 1."),
        ("mover turned by 180 deg", "Nothing."),
    ]


def test_a_harmless_pair_is_told_apart_from_one_that_fits_any_way() -> None:
    shifted = way("mover shifted by one pole (2 mm) along +x", "It slides.", likely=False)
    turned = way("mover turned by 180 deg", "Nothing.", changes=False)
    assert harmless(wrong_ways({"assembly": [turned, shifted]})) == ANY_WAY
    assert harmless(wrong_ways({"assembly": [turned | {"changes": True}, shifted]})) == HARMLESS


@pytest.mark.parametrize(
    ("quantity", "keys", "label"),
    [
        ("stray_field", {"of": "pair", "side": "around", "distance_mm": 15.0, "gap_mm": 0.2},
         "stray_field 15 mm all around the pair at 0.2 mm gap"),
        ("stray_field", {"of": "base", "side": "back", "distance_mm": 10.0}, "stray_field 10 mm behind the base"),
        ("stand_off", {"between_mm": [0.5, 8.0], "load_N": 3.0}, "stand_off under 3 N between 0.5 and 8 mm"),
        ("lateral_force", {"gap_mm": 0.5, "offset_mm": [[1.0, 0.3], [2.0, 0.0]]},
         "lateral_force at 0.5 mm gap at (1,0.3), (2,0) mm offset"),
        ("axial_force", {"gap_mm": [3.0, 4.0]}, "axial_force at 3, 4 mm gap"),
        ("field_reach", {"of": "mover"}, "field_reach of the mover down to 0.5 mT"),
        ("net_moment", {}, "net_moment of both parts"),
        ("slide_force", {"gap_mm": 0.2, "travel_mm": 3.0}, "slide_force at 0.2 mm gap over 3 mm along x"),
        ("peak_force", {"which": "repulsion", "between_mm": [0.1, 6.0]},
         "peak_force in repulsion between 0.1 and 6 mm"),
        ("field_at", {"of": "base", "point_mm": [[0, 0, 5], [1, 0, 5]], "component": "z"},
         "field_at of the base at (0,0,5), (1,0,5) mm along z"),
    ],
)  # fmt: skip
def test_labels_read_and_merge(quantity: str, keys: dict[str, Any], label: str) -> None:
    columns = columns_of(spec_of(require(quantity, **keys)))
    assert merged_label([column.label for column in columns]) == label
