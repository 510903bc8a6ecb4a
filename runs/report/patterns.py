"""Both patterns as drawings in millimetres, each as seen from its own mating face.

The base is seen from +z: x to the right, y up, +1 shows N. The mover has been turned over about the x axis to show its
mating face: x to the right, y of the base's frame down, +1 shows S. Drawings are SVG whose user unit is one
millimetre on paper, so that at scale 1 they are true to size when printed at 100 %.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from ...models.blank import Blank, Disc, Polygon, Rectangle, Ring
from ...models.part import Part
from .letters import place_letters
from .loops import cell_loops

Side = Literal["base", "mover"]

NORTH = "#1d4a52"  # dark, white letters
SOUTH = "#f3cf7f"  # light, dark letters, hatched
INK = "#1a1a1a"
BARE = "#ececec"

PAGE_WIDTH = 180.0
PAGE_HEIGHT = 235.0
_LEFT, _RIGHT, _TOP, _BOTTOM = 9.0, 7.0, 8.0, 20.0
_NARROWEST = 84.0  # room for the scale bar and its words
_READABLE = 1.8  # mm, height of the letter on the smallest pole


@dataclass(frozen=True, eq=False)
class Face:
    """A pattern on its part.

    Attributes:
        side: Which part of the pair.
        part: The part.
        pattern: Polarities as stored, shape (ny, nx).
    """

    side: Side
    part: Part
    pattern: NDArray[np.int8]


@dataclass(frozen=True)
class Drawing:
    """A drawing and how large it is.

    Attributes:
        svg: The SVG element.
        scale: Millimetres on paper a millimetre of the part.
        width: Width on paper [mm].
        height: Height on paper [mm].
    """

    svg: str
    scale: float
    width: float
    height: float


def true_drawing(face: Face) -> Drawing:
    """Return the face at true scale."""
    return _draw(face, 1.0)


def fitted_drawings(faces: Sequence[Face]) -> list[Drawing]:
    """Return the faces side by side or one a row, enlarged or reduced at one ratio; none where true scale is as good.

    They are drawn when a face does not fit on a page, or is so small or fine that its poles' letters cannot be read.
    """
    fit = all(fits_page(face.part) for face in faces)
    if fit and all(_readable(face, 1.0) for face in faces):
        return []
    half, whole = (
        _round_scale(min(_fit(face.part, width) for face in faces)) for width in (PAGE_WIDTH / 2.0 - 3.0, PAGE_WIDTH)
    )
    scale = half if whole < 1.25 * half or all(_readable(face, half) for face in faces) else whole
    return [] if fit and scale < 1.25 else [_draw(face, scale) for face in faces]


def _readable(face: Face, scale: float) -> bool:
    """Can the letters of all poles be read at this scale?"""
    narrow = [letter.height for letter in place_letters(face.pattern, face.part.cell * 1e3 * scale)]
    poles = sum(ndimage.label(face.pattern == polarity)[1] for polarity in (1, -1))
    return poles <= len(narrow) and min(narrow, default=_READABLE) >= _READABLE


def _fit(part: Part, paper: float) -> float:
    width, height = _size(part)
    return min((paper - _LEFT - _RIGHT) / width, 0.6 * (PAGE_HEIGHT - _TOP - _BOTTOM) / height)


def fits_page(part: Part) -> bool:
    """Does the face at true scale fit on an A4 page?"""
    width, height = _size(part)
    return width + _LEFT + _RIGHT <= PAGE_WIDTH and height + _TOP + _BOTTOM <= PAGE_HEIGHT


def legend() -> str:
    """Return a small SVG that explains the two fills and the bare rim."""
    items = (
        ("N", NORTH, "white", "north pole on the face you see", False),
        ("S", SOUTH, INK, "south pole", True),
        ("", BARE, INK, "not magnetized", False),
    )
    parts, x = [], 0.5
    for letter, fill, ink, text, hatched in items:
        parts.append(f'<rect x="{x}" y="0.5" width="6" height="5" fill="{fill}"/>')
        if hatched:
            parts.append(f'<rect x="{x}" y="0.5" width="6" height="5" fill="url(#hatch-legend)"/>')
        parts.append(f'<rect x="{x}" y="0.5" width="6" height="5" fill="none" stroke="{INK}" stroke-width="0.15"/>')
        parts.append(_text(x + 3.0, 4.25, letter, 3.4, ink, "middle", bold=True))
        parts.append(_text(x + 7.5, 4.2, text, 3.2))
        x += 13.0 + 1.72 * len(text)
    return (
        f'<svg class="legend" width="{x:.1f}mm" height="6mm" viewBox="0 0 {x:.1f} 6" role="img">'
        f"<title>Meaning of the fills</title>{_hatch('hatch-legend')}{''.join(parts)}</svg>"
    )


def _draw(face: Face, scale: float) -> Drawing:
    side, part, pattern = face.side, face.part, face.pattern
    width, height = (length * scale for length in _size(part))
    total_width = max(_LEFT + width + _RIGHT, _NARROWEST)
    place = _Place(part, side, scale, _LEFT + width / 2.0, _TOP + height / 2.0)
    total_height = _TOP + height + _BOTTOM
    hatch = f"hatch-{side}-{scale:g}".replace(".", "_")
    outline = _blank_path(part.blank, place)
    # cells whose centre is on the blank may reach beyond its edge, magnetization cannot
    clip = f"clip-{hatch}"
    body = [
        f'{_hatch(hatch)}<clipPath id="{clip}"><path d="{outline}" clip-rule="evenodd"/></clipPath>',
        f'<path class="blank" d="{outline}" fill="{BARE}" fill-rule="evenodd"/><g clip-path="url(#{clip})">',
        *_poles(part, pattern, place, hatch),
        "</g>",
        *_letters(part, pattern, place),
    ]
    body.append(f'<path class="outline" d="{outline}" fill="none" stroke="{INK}" stroke-width="0.25"/>')
    body += _corner_marks(part, place)
    body += _axes(place, _TOP + height + 5.5)
    body += _scale_bar(_LEFT + 22.0, _TOP + height + 11.0, scale, total_width)
    seen = "seen from above (+z)" if side == "base" else "turned over about x, seen on its mating face"
    label = f"Pole pattern of the {side}, {seen}, scale {scale:g} : 1"
    svg = (
        f'<svg class="face" data-side="{side}" width="{total_width:.3f}mm" height="{total_height:.3f}mm" '
        f'viewBox="0 0 {total_width:.3f} {total_height:.3f}" role="img"><title>{label}</title>{"".join(body)}</svg>'
    )
    return Drawing(svg, scale, total_width, total_height)


@dataclass(frozen=True)
class _Place:
    """Where a face lies on the paper: part coordinates [m] to paper [mm]."""

    part: Part
    side: Side
    scale: float
    centre_x: float
    centre_y: float

    def at(self, x: float, y: float) -> tuple[float, float]:
        # SVG's own y runs down: up for the base is a change of sign, the mover turned over about x needs none
        up = -1.0 if self.side == "base" else 1.0
        return self.centre_x + 1e3 * self.scale * x, self.centre_y + up * 1e3 * self.scale * y

    def path(self, points: NDArray[np.float64]) -> str:
        return "M" + "L".join("{:.4g},{:.4g}".format(*self.at(x, y)) for x, y in points.tolist()) + "Z"


def _poles(part: Part, pattern: NDArray[np.int8], place: _Place, hatch: str) -> list[str]:
    ny, nx = part.shape
    out = []
    north = 1 if place.side == "base" else -1
    for polarity in (north, -north):
        loops = cell_loops(pattern == polarity)
        grid = [(np.array(loop, float) - (nx / 2.0, ny / 2.0)) * part.cell for loop in loops]
        path = "".join(place.path(points) for points in grid)
        name, fill = ("N", NORTH) if polarity == north else ("S", SOUTH)
        stroke = f'stroke="{INK}" stroke-width="0.12" stroke-linejoin="miter"'
        out.append(f'<path class="pole-{name}" d="{path}" fill="{fill}" fill-rule="evenodd" {stroke}/>')
        if name == "S":
            out.append(f'<path d="{path}" fill="url(#{hatch})" fill-rule="evenodd"/>')
    return out


def _letters(part: Part, pattern: NDArray[np.int8], place: _Place) -> list[str]:
    (ny, nx), north, out = part.shape, 1 if place.side == "base" else -1, []
    for letter in place_letters(pattern, part.cell * 1e3 * place.scale):
        x, y = place.at((letter.column - (nx - 1) / 2.0) * part.cell, (letter.row - (ny - 1) / 2.0) * part.cell)
        name, ink = ("N", "white") if letter.polarity == north else ("S", INK)
        halo = "" if name == "N" else f'stroke="{SOUTH}" stroke-width="{0.16 * letter.height:.2f}" paint-order="stroke"'
        out.append(_text(x, y + 0.5 * letter.height, name, letter.height / 0.72, ink, "middle", bold=True, more=halo))
    return out


def _blank_path(blank: Blank, place: _Place) -> str:
    if isinstance(blank, Rectangle):
        x, y = blank.size_x / 2.0, blank.size_y / 2.0
        return place.path(np.array([[-x, -y], [x, -y], [x, y], [-x, y]]))
    if isinstance(blank, Disc):
        return _circle(blank.diameter / 2.0, place)
    if isinstance(blank, Ring):
        return _circle(blank.outer / 2.0, place) + _circle(blank.inner / 2.0, place)
    if isinstance(blank, Polygon):
        return "".join(place.path(np.asarray(loop, float)) for loop in blank.loops)
    raise ValueError(f"a blank must be a rectangle, disc, ring or polygon; received {type(blank).__name__}")


def _circle(radius: float, place: _Place) -> str:
    (x, y), r = place.at(-radius, 0.0), 1e3 * place.scale * radius
    return f"M{x:.4g},{y:.4g}a{r:.4g},{r:.4g} 0 1 0 {2 * r:.4g},0a{r:.4g},{r:.4g} 0 1 0 {-2 * r:.4g},0Z"


def _corner_marks(part: Part, place: _Place) -> list[str]:
    """Letters a to d at the corners of the bounding box: equal letters meet; a filled triangle marks corner a."""
    xmin, xmax, ymin, ymax = part.blank.bounds
    out = []
    for name, (x, y) in zip("abcd", ((xmin, ymin), (xmax, ymin), (xmax, ymax), (xmin, ymax)), strict=True):
        px, py = place.at(x, y)
        right, down = (1.0 if px > place.centre_x else -1.0), (1.0 if py > place.centre_y else -1.0)
        out.append(f'<circle cx="{px + 3.0 * right:.3f}" cy="{py + 3.0 * down:.3f}" r="2" fill="white" stroke="{INK}" '
                   f'stroke-width="0.2"/>')  # fmt: skip
        out.append(_text(px + 3.0 * right, py + 3.0 * down + 0.85, name, 2.9, INK, "middle", bold=name == "a"))
        if name == "a":
            tip = f"{px + 0.4 * right:.3f},{py + 0.4 * down:.3f} {px + 2.6 * right:.3f},{py + 0.4 * down:.3f}"
            out.append(f'<polygon points="{tip} {px + 0.4 * right:.3f},{py + 2.6 * down:.3f}" fill="{INK}"/>')
    return out


def _axes(place: _Place, y: float) -> list[str]:
    """Arrows of x and y as they lie in this view, at the lower left."""
    x0, up = 4.0, place.side == "base"
    y0 = y + 9.0 if up else y + 2.0
    tip = y0 - 7.0 if up else y0 + 7.0
    back = 1.4 if up else -1.4
    return [
        f'<g class="axes" stroke="{INK}" stroke-width="0.3" fill="none">'
        f'<path d="M{x0},{y0:.3f}h7m-1.4,-0.7l1.4,0.7l-1.4,0.7"/>'
        f'<path d="M{x0},{y0:.3f}V{tip:.3f}m-0.7,{back}l0.7,{-back}l0.7,{back}"/></g>',
        _text(x0 + 8.0, y0 + 1.0, "x", 3.0),
        _text(x0 + 1.3, tip + (1.6 if up else 0.8), "y", 3.0),
    ]


def _scale_bar(x: float, y: float, scale: float, total_width: float) -> list[str]:
    room = min(50.0, total_width - x - 9.0)
    length = max((length for length in (1.0, 2.0, 5.0, 10.0, 20.0, 50.0) if length * scale <= room), default=1.0)
    end = x + length * scale
    ratio = "true scale when printed at 100 %" if scale == 1.0 else f"{scale:g} : 1, not true scale"
    return [
        f'<rect x="{x:.3f}" y="{y:.3f}" width="{length * scale / 2:.3f}" height="1.2" fill="{INK}"/>',
        f'<rect class="scale-bar" data-mm="{length:g}" x="{x:.3f}" y="{y:.3f}" width="{end - x:.3f}" height="1.2" '
        f'fill="none" stroke="{INK}" stroke-width="0.2"/>',
        _text(x, y - 1.0, "0", 2.6, INK, "middle"),
        _text(end, y - 1.0, f"{length:g} mm", 2.6, INK, "middle"),
        _text(x, y + 4.6, ratio, 2.6),
    ]


def _hatch(name: str) -> str:
    return (
        f'<defs><pattern id="{name}" width="1.1" height="1.1" patternUnits="userSpaceOnUse" '
        f'patternTransform="rotate(45)"><path d="M0,0V1.1" stroke="{INK}" stroke-width="0.16" stroke-opacity="0.55"/>'
        f"</pattern></defs>"
    )


def _text(
    x: float,
    y: float,
    text: str,
    size: float,
    ink: str = INK,
    anchor: str = "start",
    bold: bool = False,
    more: str = "",
) -> str:
    weight = ' font-weight="bold"' if bold else ""
    return (
        f'<text x="{x:.3f}" y="{y:.3f}" font-size="{size:.2f}" fill="{ink}" text-anchor="{anchor}"{weight} {more}>'
        f"{text}</text>"
    )


def _size(part: Part) -> tuple[float, float]:
    xmin, xmax, ymin, ymax = part.blank.bounds
    return (xmax - xmin) * 1e3, (ymax - ymin) * 1e3


def _round_scale(scale: float) -> float:
    """Return the largest handy ratio not above ``scale``."""
    handy = [step * 10.0**power for power in (-2, -1, 0, 1) for step in (1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0)]
    return float(f"{max((value for value in handy if value <= scale), default=0.01):.3g}")
