"""Stray-field maps: |B| on planes, logarithmic, with the lines that people ask for written on them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib import colormaps
from matplotlib.colors import LogNorm
from matplotlib.figure import Figure

from ...models.units import from_si
from .extras import FieldMap
from .figures import INK, svg_figure

# the line of implants, then decades and halves
LEVELS = (0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1000.0)
BOLD = (0.5, 5.0, 50.0)
_ROOM = 0.035
"""Share of a map's height that a part must have for its name to stand on it."""


def field_figure(maps: Sequence[FieldMap], names: str) -> list[str]:
    """Return each map as inline SVG, all on one colour scale; ``names`` prefixes their ids."""
    levels = _levels(maps)
    return [_one(field_map, levels, f"{names}-{n}") for n, field_map in enumerate(maps)]


def _levels(maps: Sequence[FieldMap]) -> list[float]:
    sizes = np.concatenate([from_si(field_map.size, "mT")[np.isfinite(field_map.size)] for field_map in maps])
    top = float(np.max(sizes, initial=1e-3))
    bottom = max(float(np.min(sizes, initial=top)), 1e-4 * top)
    inside = [level for level in LEVELS if bottom <= level <= top]
    return inside if len(inside) >= 2 else np.geomspace(bottom, max(top, 1.01 * bottom), 5).tolist()


def _one(field_map: FieldMap, levels: list[float], name: str) -> str:
    x, y = (np.asarray(from_si(axis, "mm"), float) for axis in (field_map.x, field_map.y))
    size = np.ma.masked_invalid(from_si(field_map.size, "mT"))
    ratio = float(np.ptp(y) / np.ptp(x))
    width = 6.6 if ratio < 0.75 else 5.0

    def draw(figure: Figure) -> None:
        plot = figure.subplots()
        # light where the field is weak: dark lines and words stay readable on most of the map and on paper
        colours = colormaps["YlGnBu"]
        filled = plot.contourf(x, y, size, levels=levels, cmap=colours, norm=LogNorm(levels[0], 3.0 * levels[-1]),
                               extend="both", alpha=0.85)  # fmt: skip
        lines = plot.contour(x, y, size, levels=levels, colors=INK,
                             linewidths=[1.8 if level in BOLD else 0.5 for level in levels])  # fmt: skip
        marked = _worth_a_word(size, levels)
        texts = plot.clabel(lines, marked, fmt=lambda level: f"{level:g} mT", fontsize=8)
        for text in texts:
            text.set_bbox({"facecolor": "white", "edgecolor": "none", "pad": 0.8, "alpha": 0.85})
        right = max((float(from_si(outline.points[:, 0].max(), "mm")) for outline in field_map.outlines), default=0.0)
        for outline in field_map.outlines:
            corners = from_si(np.vstack([outline.points, outline.points[:1]]), "mm")
            plot.plot(*corners.T, color=INK, lw=1.1, ls="--" if outline.dashed else "-")
            box = {"facecolor": "white", "edgecolor": "none", "pad": 0.4, "alpha": 0.7}
            middle = from_si(outline.points.mean(axis=0), "mm")
            if np.ptp(corners[:, 1]) > _ROOM * np.ptp(y):
                plot.annotate(outline.label, tuple(middle), ha="center", va="center", fontsize=7, bbox=box)
            elif outline.label:  # words would hide so slim a part
                plot.annotate(outline.label, (right, middle[1]), (4, 0), textcoords="offset points", va="center",
                              fontsize=7, bbox=box)  # fmt: skip
        plot.set_aspect("equal")
        plot.set_xlabel(f"{field_map.x_label} [mm]")
        plot.set_ylabel(f"{field_map.y_label} [mm]")
        bar = figure.colorbar(filled, ax=plot, shrink=0.9, pad=0.02, ticks=levels, format="%g")
        bar.set_label("size of B [mT]")
        bar.ax.minorticks_off()

    return svg_figure(name, "Stray field map", width, min(max((width - 1.7) * ratio + 0.7, 2.2), 7.0), draw)


def _worth_a_word(size: np.ma.MaskedArray[tuple[int, int], np.dtype[np.float64]], levels: list[float]) -> list[float]:
    """Return the lines that get their value written on them: those that people ask for, where they have the room."""
    drawn = [level for level in levels if level in BOLD] or levels[:1]
    columns = {level: np.flatnonzero((size > level).any(axis=0)) for level in drawn}
    room = 0.3 * size.shape[1]
    return [level for level in drawn if columns[level].size and np.ptp(columns[level]) > room] or drawn[:1]
