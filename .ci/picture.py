"""Draw the README's picture from a verified run: both faces and the force-gap curve, by the report's own code.

Usage: python .ci/picture.py RUN.h5 > .ci/example.svg   (with .ci/path on PYTHONPATH, or polewright installed)
"""

from __future__ import annotations

import re
import sys
from pathlib import Path

from polewright.runs.archive import read_run
from polewright.runs.records import Run
from polewright.runs.report.collect import force_marks
from polewright.runs.report.curves import force_gap_figure
from polewright.runs.report.patterns import Drawing, Face, _draw, legend
from polewright.runs.spec import spec_from_json

SCALE = 4.0  # of the faces
GAP = 6.0  # between the elements [mm]
CURVE = (160.0, 123.4)  # size of the curve on the picture [mm]


def placed(svg: str, x: float, y: float, width: float, height: float) -> str:
    """Return an SVG element as part of a larger one, at a place and of a size in its units."""
    inner = re.sub(r'(<svg[^>]*?) (?:width="[^"]*"|style="[^"]*")', r"\1", svg, count=1)
    inner = re.sub(r'(<svg[^>]*?) height="[^"]*mm"', r"\1", inner, count=1)
    return inner.replace("<svg", f'<svg x="{x:g}" y="{y:g}" width="{width:g}" height="{height:g}"', 1)


def caption(text: str, x: float, y: float) -> str:
    """Return a line of text."""
    return f'<text x="{x:g}" y="{y:g}" font-size="3.6" font-family="sans-serif" fill="#1a1a1a">{text}</text>'


def picture(run: Run) -> str:
    """Return the picture of a run's best design as one SVG document."""
    best = run.designs[0]
    faces = (Face("base", run.base, best.base), Face("mover", run.mover, best.mover))
    left, right = (_draw(face, SCALE) for face in faces)
    # on a screen no scale is true, and this one says what the scale bar says
    left, right = (
        Drawing(re.sub(r"<text[^>]*>[^<]*not true scale</text>", "", d.svg), *size(d)) for d in (left, right)
    )
    band = ((run.verification or {}).get("scatter") or {}).get("force_band")
    marks = force_marks(spec_from_json(run.spec_json, run.spec_toml))
    curve = force_gap_figure(run.curves["force_gap"], 0, marks, band)
    top = 16.0
    below = top + max(left.height, right.height)
    width = max(left.width + GAP + right.width, CURVE[0])
    shift = (width - CURVE[0]) / 2.0
    body = [
        '<rect width="100%" height="100%" fill="white"/>',
        placed(legend(), 4.0, 1.5, *legend_size()),
        caption("Base, its mating face seen from above", 9.0, top - 2.0),
        caption("Mover, turned over about x: its mating face", left.width + GAP + 9.0, top - 2.0),
        placed(left.svg, 0.0, top, left.width, left.height),
        placed(right.svg, left.width + GAP, top, right.width, right.height),
        placed(curve, shift, below, *CURVE),
    ]
    height = below + CURVE[1] + 2.0
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width:g} {height:g}" '
        f'width="{4 * width:.0f}" height="{4 * height:.0f}" font-family="DejaVu Sans, sans-serif">'
        f"<title>{run.title}: both pole patterns and the force over the gap</title>"
        f"<desc>design {best.id}, spec sha256 {run.spec_sha256}</desc>{''.join(body)}</svg>\n"
    )


def size(drawing: Drawing) -> tuple[float, float, float]:
    """Return what a drawing holds besides its element."""
    return drawing.scale, drawing.width, drawing.height


def legend_size() -> tuple[float, float]:
    """Return width and height of the legend [mm]."""
    found = re.search(r'viewBox="0 0 ([\d.]+) ([\d.]+)"', legend())
    if found is None:
        raise ValueError("the legend must have a viewBox")
    return float(found[1]), float(found[2])


if __name__ == "__main__":
    sys.stdout.write(picture(read_run(Path(sys.argv[1]))))
