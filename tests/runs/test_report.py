"""The report: self-contained, escaped, lettered and true to scale."""

from __future__ import annotations

import json
import re
import xml.etree.ElementTree as ET
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner
from numpy.typing import NDArray
from polewright.models.blank import Rectangle
from polewright.models.errors import InputError
from polewright.models.part import Part
from polewright.runs.archive import write_run
from polewright.runs.commands.show import command as show
from polewright.runs.records import Run
from polewright.runs.report.curves import equilibria
from polewright.runs.report.extras import Baseline, FieldMap, ForceMark, Outline, ReportExtras
from polewright.runs.report.letters import place_letters
from polewright.runs.report.loops import cell_loops
from polewright.runs.report.page import render
from polewright.runs.report.patterns import Face, Side, fits_page, fitted_drawings, true_drawing

from .fixtures import MM, make_run, other_blanks, pattern, verification

VOID = {"meta", "br", "link", "img"}


def field_map() -> FieldMap:
    x, y = np.linspace(-30, 30, 41) * MM, np.linspace(-20, 20, 31) * MM
    size = 0.05 / (1.0 + (np.hypot(*np.meshgrid(x, y)) / (4 * MM)) ** 3)
    corner = np.array([[-10.0, -8.0], [10.0, -8.0], [10.0, 8.0], [-10.0, 8.0]]) * MM
    return FieldMap("Behind the base", x, y, size, "x", "y", (Outline(corner, "base", dashed=True),), "A note.")


def extras(**changes: Any) -> ReportExtras:
    values = np.array([30.0, -5.0, -3.0, -2.0, 9e-3, np.nan, 2.0])
    made = ReportExtras(
        baselines=(Baseline("uniform", values),),
        marks=(ForceMark(0.3 * MM, "at_most", -20.0), ForceMark(3 * MM, "at_least", 2.0),
               ForceMark(6 * MM, "equal_to", 1.2, 0.2), ForceMark(7 * MM, "toward", 1.0)),
        maps=(field_map(),),
        needs_guide=True,
    )  # fmt: skip
    return replace(made, **changes)


class Page(HTMLParser):
    """Collects tags and attributes, and checks that tags nest."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.text = ""
        self.feed(text)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        self.text += data


@pytest.fixture(scope="module")
def run() -> Run:
    return make_run(verification=verification())


@pytest.fixture(scope="module")
def html(run: Run) -> str:
    return render(run, extras())


def test_the_page_is_well_formed_and_loads_nothing(html: str) -> None:
    page = Page(html)
    assert not {"script", "link", "img", "iframe", "object", "use-external"} & {tag for tag, _ in page.tags}
    for tag, attributes in page.tags:
        for name in ("src", "href", "xlink:href", "action"):
            value = attributes.get(name)
            assert value is None or value.startswith("#"), (tag, name, value)
    assert "http://" not in html
    assert "https://" not in html
    assert not re.search(r"url\((?!#)", html)
    assert "default-src 'none'" in html


def test_ids_are_unique_and_references_resolve(html: str) -> None:
    page = Page(html)
    ids = [value for _, attributes in page.tags for name, value in attributes.items() if name == "id"]
    assert len(ids) == len(set(ids))
    wanted = set(re.findall(r"url\(#([^)]+)\)", html)) | set(re.findall(r'href="#([^"]+)"', html))
    assert wanted <= set(ids)


def test_equal_runs_give_equal_reports(run: Run, html: str) -> None:
    assert render(run, extras()) == html


def test_hostile_words_stay_words() -> None:
    evil = "<script>alert('x')</script><img src=x onerror=alert(1)>\"&"
    columns = tuple(replace(column, label=evil, id=evil) for column in make_run().columns)
    found = verification()
    found["scatter"]["requirements"][0].update(label=evil, costliest=evil)
    found["second_path"]["checks"][0]["what"] = evil
    found["assembly"][0].update(name=evil, text=evil)
    found["scatter"]["imbalance_floor"] = {evil: evil}
    run = make_run(title=evil, columns=columns, spec_toml=evil, stop_reason=evil, warnings=(evil,), verification=found,
                   provenance={"platform": evil, "versions_json": json.dumps({evil: evil})})  # fmt: skip
    hostile = replace(field_map(), title=evil, note=evil, outlines=(Outline(np.zeros((3, 2)), evil),))
    made = render(run, extras(baselines=(Baseline(evil, np.zeros(7)),), maps=(hostile,), spec_name=evil))
    page = Page(made)
    assert "<script" not in made
    assert "<img" not in made
    assert evil in page.text


def test_what_an_engineer_looks_for_is_there(html: str) -> None:
    text = " ".join(Page(html).text.split())
    for phrase in (
        "every requirement met", "IDEAL", "sharp edges", "Stable only on a guide", "tightest margin +1.3 %", "uniform",
        "mover turned by 180 deg: Holds at every gap", "Second physics path: agrees", "91.6 %", "Pinching",
        "0.5 mT", "Local codes",
        make_run().spec_sha256, "seed", "stopped", "41200", "polewright design spec.toml", "true scale",
    ):  # fmt: skip
        assert phrase in text, phrase
    assert text.index("axial_force at 3, 4, 5 mm") < text.index("K1 holding_force at 0.3 mm")


def test_a_bare_run_makes_a_report_too() -> None:
    run = make_run(curves={}, verification=None, warnings=(), provenance={})
    text = Page(render(replace(run, complete=False), ReportExtras(), "d3")).text
    for phrase in ("interrupted run", "misses a requirement", "Not verified yet", "none"):
        assert phrase in text
    with pytest.raises(InputError, match="give one of"):
        render(run, ReportExtras(), "d9")


def test_marks_that_a_baseline_misses_are_crossed(html: str) -> None:
    rows = html.split("<tr")
    (label,) = [n for n, row in enumerate(rows) if "K1 holding_force at 0.3 mm" in row and "colspan" in row]
    assert '30 <span class="yes">✓</span>' in rows[label + 1]
    (label,) = [n for n, row in enumerate(rows) if "axial_force at 3, 4, 5 mm" in row and "colspan" in row]
    assert '-5 <span class="no">✗</span>' in rows[label + 1]
    assert '<td class="small">4 mm</td>' in rows[label + 2]


class TestFaces:
    """Drawings are in millimetres and each face is seen from its own side."""

    def face(self, side: Side, part: Part, polarity: NDArray[np.int8]) -> ET.Element:
        return ET.fromstring(true_drawing(Face(side, part, polarity)).svg)

    def box(self, path: str) -> tuple[float, float, float, float]:
        points = np.array(re.findall(r"(-?[\d.]+),(-?[\d.]+)", path), float)
        return (*points.min(axis=0).tolist(), *points.max(axis=0).tolist())

    def path(self, svg: ET.Element, name: str) -> str:
        return str(next(item for item in svg.iter("path") if item.get("class") == name).get("d"))

    def test_true_scale(self) -> None:
        part = Part(Rectangle(37.3 * MM, 21.7 * MM), 1.0 * MM, 3 * MM, 1.2)
        svg = self.face("base", part, np.ones(part.shape, np.int8))
        view = [float(number) for number in str(svg.get("viewBox")).split()]
        assert svg.get("width") == f"{view[2]:.3f}mm"
        assert svg.get("height") == f"{view[3]:.3f}mm"
        left, top, right, bottom = self.box(self.path(svg, "outline"))
        assert right - left == pytest.approx(37.3, abs=2e-3)
        assert bottom - top == pytest.approx(21.7, abs=2e-3)
        bar = next(item for item in svg.iter("rect") if item.get("class") == "scale-bar")
        assert float(str(bar.get("width"))) == pytest.approx(float(str(bar.get("data-mm"))))

    def test_each_face_is_seen_from_its_own_side(self) -> None:
        part = Part(Rectangle(20 * MM, 20 * MM), 1.0 * MM, 3 * MM, 1.2)
        polarity = -np.ones(part.shape, np.int8)
        polarity[:5, :3] = 1  # low y, low x
        base = self.box(self.path(self.face("base", part, polarity), "pole-N"))
        outline = self.box(self.path(self.face("base", part, polarity), "outline"))
        assert base[0] == pytest.approx(outline[0])
        assert base[3] == pytest.approx(outline[3])  # y up: low y is at the bottom
        mover = self.face("mover", part, polarity)
        south, outline = self.box(self.path(mover, "pole-S")), self.box(self.path(mover, "outline"))
        assert south[0] == pytest.approx(outline[0])
        assert south[1] == pytest.approx(outline[1])  # turned over about x: low y is at the top
        assert south[2] - south[0] == pytest.approx(3.0, abs=1e-3)
        assert south[3] - south[1] == pytest.approx(5.0, abs=1e-3)

    def test_corner_marks_meet(self) -> None:
        part = make_run().base
        where = {}
        for side in ("base", "mover"):
            svg = self.face(side, part, pattern(part))
            words = {item.text: item for item in svg.iter("text") if item.text in set("abcd")}
            where[side] = {name: (float(str(item.get("x"))), float(str(item.get("y")))) for name, item in words.items()}
        for name in "abcd":
            assert where["base"][name][0] == pytest.approx(where["mover"][name][0])  # turning about x keeps x
        assert where["base"]["a"][1] > where["base"]["d"][1]
        assert where["mover"]["a"][1] < where["mover"]["d"][1]

    def test_every_pole_is_lettered(self) -> None:
        part = Part(Rectangle(24 * MM, 24 * MM), 2.0 * MM, 3 * MM, 1.2)
        checker = np.where(np.indices(part.shape).sum(axis=0) % 2, 1, -1).astype(np.int8)
        svg = self.face("base", part, checker)
        letters = [item.text for item in svg.iter("text") if item.text in ("N", "S")]
        assert (letters.count("N"), letters.count("S")) == (72, 72)

    def test_large_poles_get_more_letters_and_fine_ones_an_enlarged_view(self) -> None:
        large = Part(Rectangle(100 * MM, 60 * MM), 2.0 * MM, 3 * MM, 1.2)
        face = Face("base", large, np.ones(large.shape, np.int8))
        assert len(place_letters(face.pattern, 2.0)) > 4
        assert fitted_drawings([face]) == []
        fine = Part(Rectangle(12 * MM, 12 * MM), 0.5 * MM, 3 * MM, 1.2)
        stripes = np.where(np.arange(24) % 2, 1, -1)[None, :].repeat(24, axis=0).astype(np.int8)
        (drawing,) = fitted_drawings([Face("base", fine, stripes)])
        assert drawing.scale > 2.0

    def test_a_face_larger_than_the_page_is_drawn_true_and_reduced(self) -> None:
        part = Part(Rectangle(300 * MM, 200 * MM), 10.0 * MM, 3 * MM, 1.2)
        face = Face("base", part, pattern(part, "halves"))
        assert not fits_page(part)
        assert true_drawing(face).width > 300.0
        (drawing,) = fitted_drawings([face])
        assert drawing.scale < 1.0
        assert drawing.width <= 180.0

    @pytest.mark.parametrize("blank", ["ring", "polygon"])
    def test_every_blank_is_drawn(self, blank: str) -> None:
        part = other_blanks()[blank]
        svg = self.face("mover", part, pattern(part, "levels"))
        assert self.path(svg, "blank").count("Z") == 2  # outline and hole

    def test_a_blank_face_has_no_letters(self) -> None:
        part = make_run().base
        svg = self.face("base", part, np.zeros(part.shape, np.int8))
        assert [item.text for item in svg.iter("text") if item.text in ("N", "S")] == []


class TestLoops:
    """Outlines of cells enclose exactly the cells."""

    def area(self, loops: list[list[tuple[int, int]]]) -> float:
        total = 0.0
        for loop in loops:
            x, y = np.array(loop, float).T
            total += 0.5 * float(x @ np.roll(y, -1) - y @ np.roll(x, -1))
        return total

    def test_area_and_straight_runs(self) -> None:
        cells = np.random.default_rng(5).random((17, 23)) < 0.5
        loops = cell_loops(cells)
        assert self.area(loops) == cells.sum()
        for loop in loops:
            steps = np.diff(np.array([*loop, loop[0]]), axis=0)
            assert ((steps == 0).sum(axis=1) == 1).all()

    def test_cells_that_touch_at_a_corner_are_apart(self) -> None:
        assert len(cell_loops(np.eye(3, dtype=bool))) == 3

    def test_a_hole_is_a_loop_of_its_own(self) -> None:
        cells = np.ones((3, 3), bool)
        cells[1, 1] = False
        loops = cell_loops(cells)
        assert len(loops) == 2
        assert self.area(loops) == 8.0

    def test_nothing_has_no_outline(self) -> None:
        assert cell_loops(np.zeros((2, 2), bool)) == []


def test_letters_stand_inside_their_poles() -> None:
    polarity = np.where(np.random.default_rng(8).random((20, 20)) < 0.5, 1, -1).astype(np.int8)
    for letter in place_letters(polarity, 1.0):
        rows = {int(np.floor(letter.row)), int(np.ceil(letter.row))}
        columns = {int(np.floor(letter.column)), int(np.ceil(letter.column))}
        assert {int(polarity[y, x]) for y in rows for x in columns} == {letter.polarity}


def test_stable_gaps_are_where_the_force_falls_through_zero() -> None:
    gap = np.linspace(0.0, 3.0, 301)
    assert equilibria(gap, np.sin(2 * np.pi * gap)) == pytest.approx([0.5, 1.5, 2.5], abs=1e-3)


class TestShow:
    """``polewright show`` in the terminal and as JSON."""

    @pytest.fixture
    def path(self, run: Run, tmp_path: Path) -> Path:
        write_run(run, tmp_path / "hatch.h5")
        return tmp_path / "hatch.h5"

    def test_people_read_stderr(self, path: Path) -> None:
        done = CliRunner().invoke(show, [str(path)])
        assert done.exit_code == 0
        assert done.stdout == ""
        assert "Every requirement is met." in done.stderr

    def test_pipelines_read_stdout(self, path: Path) -> None:
        done = CliRunner().invoke(show, [str(path), "--json", "--design", "d2"])
        assert done.exit_code == 0
        made = json.loads(done.stdout)
        assert made["command"] == "show"
        assert [design["id"] for design in made["designs"]] == ["d2"]
