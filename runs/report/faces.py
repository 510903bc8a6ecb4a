"""The section of a report that shows both faces."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ...models.blank import Blank, Disc, Rectangle, Ring
from ...models.part import Part
from ...models.units import from_si
from ..judged import number
from ..records import Design, Run
from .patterns import Drawing, Face, Side, fits_page, fitted_drawings, legend, true_drawing

_VIEWS: dict[Side, str] = {
    "base": "seen from above (+z) on its mating face: x right, y up",
    "mover": "turned over about the x axis and seen on its mating face: x right, y of the pair down",
}


def faces_section(run: Run, design: Design) -> str:
    """Return both faces at true scale, and enlarged or reduced where that reads better."""
    faces = (Face("base", run.base, design.base), Face("mover", run.mover, design.mover))
    true = "".join(_figure(face, true_drawing(face)) for face in faces)
    fitted = fitted_drawings(faces)
    out = [
        '<section class="page">\n<h2>Pole patterns</h2>\n'
        "<p>Each face is drawn as you see it when you look at the face itself. The filled triangle and the letter "
        "<strong>a</strong> mark the same corner of the assembled pair: turn the mover over about the x axis, then "
        "corners with equal letters lie on each other.</p>\n"
        f'<div class="scroll">{legend()}</div>\n<h3>At true scale</h3>\n',
    ]
    if not all(fits_page(face.part) for face in faces):
        out.append(
            "<p>A face is larger than an A4 page: print this page at 100 % on larger paper, or use the reduced view "
            "below.</p>\n"
        )
    out.append(f'<div class="faces">{true}</div>\n')
    if fitted:
        others = "".join(_figure(face, drawing) for face, drawing in zip(faces, fitted, strict=True))
        word = "Enlarged" if fitted[0].scale > 1.0 else "Reduced"
        out.append(f'<h3>{word}</h3>\n<div class="faces">{others}</div>\n')
    return "".join(out) + "</section>"


def _figure(face: Face, drawing: Drawing) -> str:
    side = face.side
    if drawing.scale != 1.0:
        caption = f"<strong>{side.capitalize()}</strong>, {drawing.scale:g} : 1, the same view."
    else:
        caption = f"<strong>{side.capitalize()}</strong>, {_VIEWS[side]}. {_facts(face.part, face.pattern)}"
    style = f"width:{drawing.width:.1f}mm"
    return f'<figure style="{style}"><div class="scroll">{drawing.svg}</div><figcaption>{caption}</figcaption></figure>'


def _facts(part: Part, pattern: NDArray[np.int8]) -> str:
    ny, nx = part.shape
    facts = f"{size_words(part.blank).capitalize()}, {number(from_si(part.thickness, 'mm'))} mm thick, "
    facts += f"{nx} x {ny} cells of {number(from_si(part.cell, 'mm'))} mm, remanence {number(part.remanence)} T"
    if part.coating > 0.0:
        facts += f", coating {number(from_si(part.coating, 'um'))} µm"
    rim = max(part.rim)
    if rim > 1e-9:
        x, y = (number(from_si(length, "mm")) for length in part.rim)
        facts += f", unmagnetized rim {x} mm along x and {y} mm along y, both sides together"
    plus, minus = int((pattern == 1).sum()), int((pattern == -1).sum())
    return f"{facts}. {plus} cells along +z, {minus} along -z."


def size_words(blank: Blank) -> str:
    """Return the shape of a blank and the dimensions that a drawing would give."""

    def mm(length: float) -> str:
        return number(from_si(length, "mm"))

    match blank:
        case Disc():
            return f"disc of {mm(blank.diameter)} mm diameter"
        case Ring():
            return f"ring of {mm(blank.outer)} mm outer and {mm(blank.inner)} mm inner diameter"
    xmin, xmax, ymin, ymax = blank.bounds
    name = "rectangle of" if isinstance(blank, Rectangle) else "polygon within"
    return f"{name} {mm(xmax - xmin)} x {mm(ymax - ymin)} mm"
