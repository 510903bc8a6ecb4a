"""Matplotlib figures as inline SVG: no pyplot, no fonts embedded, the same bytes for the same numbers."""

from __future__ import annotations

import io
import re
from collections.abc import Callable
from typing import Any

import matplotlib as mpl
from matplotlib.figure import Figure

INK = "#1a1a1a"
GRID = "#d9d9d9"

_SETTINGS: dict[Any, Any] = {
    "svg.fonttype": "none",
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.8,
    "axes.titlesize": 9.5,
    "axes.titlelocation": "left",
    "xtick.color": INK,
    "ytick.color": INK,
    "text.color": INK,
    "hatch.linewidth": 0.6,
    "legend.fontsize": 8.5,
    "legend.frameon": False,
    "text.parse_math": False,
}


def svg_figure(name: str, title: str, width: float, height: float, draw: Callable[[Figure], None]) -> str:
    """Return an inline SVG element.

    Args:
        name: Prefix of its ids, unique on the page.
        title: What screen readers say, already escaped for HTML.
        width: Width [inch].
        height: Height [inch].
        draw: Draws into the empty figure.
    """
    with mpl.rc_context({**_SETTINGS, "svg.hashsalt": name}):
        figure = Figure(figsize=(width, height), layout="constrained")
        draw(figure)
        stream = io.StringIO()
        figure.savefig(stream, format="svg", metadata={"Date": None, "Creator": None, "Format": None, "Type": None})
    text = stream.getvalue()
    text = text[text.index("<svg") :]
    text = re.sub(r"<metadata>.*?</metadata>", "", text, flags=re.DOTALL)
    text = re.sub(r' xmlns(:\w+)?="[^"]*"', "", text).replace("xlink:href", "href")
    text = re.sub(r'\bid="', f'id="{name}-', text)
    text = re.sub(r'url\(#|href="#', lambda found: found.group(0) + f"{name}-", text)
    # as wide as it was drawn, or as the screen is: letters then keep their size on paper
    head = rf'<svg class="plot" style="max-width:{25.4 * width:.0f}mm" viewBox="\1" role="img"><title>{title}</title>'
    text = re.sub(r'<svg[^>]*?viewBox="([^"]*)"[^>]*>', head, text, count=1)
    return re.sub(r"\n\s*", "\n", text).strip()
