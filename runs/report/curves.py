"""The force-gap curve against what is required of it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle

from ...models.units import from_si
from ..records import Curve
from .extras import Array, ForceMark, Mark, RestMark
from .figures import GRID, INK, svg_figure

_LINE = "#1d4a52"
_BAND = "#9fc3c8"
_BOUND = "#8a4b08"
_WIDE_RANGE = 12.0


def force_gap_figure(curve: Curve, position: int, marks: Sequence[Mark], band: Mapping[str, Any] | None) -> str:
    """Return the curve of one design as inline SVG.

    Args:
        curve: Force over gap of every design.
        position: Row of the design.
        marks: What is required of the force.
        band: "gap" [m], "p5" and "p95" [N] of sampled parts, or None.
    """
    gap = np.asarray(from_si(curve.scale, "mm"), float)
    force = np.asarray(curve.values[position], float)
    small = _smallest_level(force, marks)
    two = float(np.abs(force).max()) > _WIDE_RANGE * small

    def draw(figure: Figure) -> None:
        axes = figure.subplots(2 if two else 1, 1, sharex=True, squeeze=False, height_ratios=[3, 2.3] if two else [1])
        for row, plot in enumerate(axes[:, 0]):
            _plot(plot, gap, force, marks, band, zoom=3.0 * small if row else None)
        _directions(axes[0, 0])
        axes[-1, 0].set_xlabel("gap between the coated faces [mm]")
        figure.legend(*axes[0, 0].get_legend_handles_labels(), loc="outside upper center", ncols=4, fontsize=8)

    return svg_figure("force-gap", "Axial force over the gap", 7.0, 5.4 if two else 3.6, draw)


def equilibria(gap: Array, force: Array) -> list[float]:
    """Return the gaps (of the unit of ``gap``) where the force falls through zero as the gap opens: axially stable."""
    falling = np.flatnonzero((force[:-1] > 0.0) & (force[1:] <= 0.0))
    return [float(gap[n] + (gap[n + 1] - gap[n]) * force[n] / (force[n] - force[n + 1])) for n in falling]


def _smallest_level(force: Array, marks: Sequence[Mark]) -> float:
    """Size of the smallest force that a reader must still tell from zero [N]."""
    levels = [abs(mark.force) for mark in marks if isinstance(mark, ForceMark) and mark.force != 0.0]
    # the weaker of the two directions, where the curve has both
    levels += [size for size in (float(force.max()), float(-force.min())) if size > 0.02 * np.abs(force).max()]
    return max(min(levels, default=1.0), 1e-3 * float(np.abs(force).max()), 1e-9)


def _plot(
    plot: Axes, gap: Array, force: Array, marks: Sequence[Mark], band: Mapping[str, Any] | None, zoom: float | None
) -> None:
    if band is not None:
        x = np.asarray(from_si(np.asarray(band["gap"], float), "mm"), float)
        plot.fill_between(x, band["p5"], band["p95"], color=_BAND, lw=0, label="5 to 95 % of sampled parts")
    plot.axhline(0.0, color=INK, lw=0.8)
    plot.plot(gap, force, color=_LINE, lw=1.8, label="this design")
    low, high = min(force.min(), 0.0), max(force.max(), 0.0)
    room = 0.12 * (high - low)
    low, high = low - room, high + room
    if zoom is not None:
        low, high = max(low, -zoom), min(high, zoom)
        plot.set_title("near zero, enlarged")
    plot.set_ylim(low, high)
    plot.set_xlim(0.0, float(gap[-1]) * 1.02)
    _draw_marks(plot, marks, float(gap[-1]), low, high)
    for load in sorted({mark.load for mark in marks if isinstance(mark, RestMark)} or {0.0}):
        for stable in equilibria(gap, force - load):
            plot.plot([stable], [load], marker="D", ms=5, color=INK, mfc="white", ls="", zorder=5, clip_on=False)
            words = "stable on a guide\n" + (f"under {load:.3g} N " if load else "") + f"at {stable:.3g} mm"
            plot.annotate(words, (stable, load), (6, 8), textcoords="offset points", fontsize=8)
    plot.grid(color=GRID, lw=0.6)
    plot.set_axisbelow(True)
    plot.set_ylabel("axial force on the mover [N]")
    plot.spines[["top", "right"]].set_visible(False)


def _draw_marks(plot: Axes, marks: Sequence[Mark], longest: float, low: float, high: float) -> None:
    half, deep = 0.016 * longest, 0.09 * (high - low)
    named: set[str] = set()

    def label(text: str) -> str:
        first = text not in named
        named.add(text)
        return text if first else "_nolegend_"

    for mark in marks:
        if isinstance(mark, RestMark):
            ends = [from_si(mark.low, "mm"), min(from_si(mark.high, "mm"), longest)]
            plot.plot(ends, [mark.load] * 2, color=_BOUND, lw=3.5, alpha=0.7, solid_capstyle="butt",
                      label=label("required stand-off"))  # fmt: skip
            continue
        x = from_si(mark.gap, "mm")
        if mark.kind in ("at_least", "at_most"):
            below = mark.kind == "at_least"
            bottom = mark.force - deep if below else mark.force
            plot.add_patch(Rectangle((x - half, bottom), 2 * half, deep, fill=False, hatch="/////", ec=_BOUND, lw=0.0))
            plot.plot([x - half, x + half], [mark.force] * 2, color=_BOUND, lw=2.0, solid_capstyle="butt",
                      label=label("required (hatched: forbidden)"))  # fmt: skip
        elif mark.kind == "equal_to":
            plot.errorbar([x], [mark.force], yerr=[mark.within], color=_BOUND, capsize=4, lw=1.6,
                          label=label("required band"))  # fmt: skip
        else:
            plot.plot([x], [mark.force], marker="o", mfc="none", color=_BOUND, ls="", label=label("target"))


def _directions(plot: Axes) -> None:
    for place, text, side in ((0.99, "pushes apart ↑", "top"), (0.01, "↓ pulls together", "bottom")):
        plot.text(0.01, place, text, transform=plot.transAxes, ha="left", va=side, fontsize=8.5, color="#555555")
