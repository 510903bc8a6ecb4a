"""The report as one HTML page: assembled from its sections, every name and title of the spec escaped."""

from __future__ import annotations

import json
from collections.abc import Sequence
from html import escape

from ... import __version__
from ..judged import find_design, judge, number, percent, tightest_first
from ..records import Design, Run
from ..verification.words import (
    PREVENT,
    Record,
    accuracy,
    elsewhere,
    harmless,
    second_sentences,
    verification_of,
    wrong_ways,
)
from . import cautions
from .curves import force_gap_figure
from .extras import ReportExtras
from .faces import faces_section
from .fieldmap import field_figure
from .style import CSS
from .tables import assembly_list, designs_table, requirements_table, scatter_table, second_path_table

_ORIGINS = {
    "gradient": "by gradient search", "linear": "by linear programs", "polish": "by local search",
    "search": "by discrete search", "given": "among given and obvious patterns", "enumerated": "by enumeration",
}  # fmt: skip


_SAID_BELOW = ("IDEAL", "A stand-off is stable only on a guide")
"""Warnings that stand in full below the table of requirements, for the design that is shown."""


def render(run: Run, extras: ReportExtras, design_id: str | None = None) -> str:
    """Return the report on one design as a complete, self-contained HTML document.

    Args:
        run: The run.
        extras: What the report shows beside it.
        design_id: Which design, the best one when None.

    Raises:
        InputError: When the run holds no such design.
    """
    design = find_design(run, design_id)
    title = escape(run.title or "Untitled")
    sections = (
        _head(run, design, extras),
        _results(run, design, extras),
        faces_section(run, design),
        _curve(run, design, extras),
        _maps(extras),
        _checks(run, design),
        _others(run, design),
        _cautions(),
        _reproduce(run, extras),
    )
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        # no page of ours loads anything: a title that smuggles a resource in is stopped by the browser as well
        "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'\">\n"
        f"<title>{title} - polewright report</title>\n<style>{CSS}</style>\n</head>\n<body>\n"
        + "\n".join(section for section in sections if section)
        + "\n</body>\n</html>\n"
    )


def _head(run: Run, design: Design, extras: ReportExtras) -> str:
    tightest = tightest_first(judge(run, design))
    badges = [
        '<span class="badge met">✓ every requirement met</span>'
        if design.feasible
        else '<span class="badge missed">✗ misses a requirement</span>',
        '<span class="badge">IDEAL</span>',
    ]
    if extras.needs_guide:
        badges.append('<span class="badge">stable only on a guide</span>')
    if not run.complete:
        badges.append('<span class="badge missed">interrupted run</span>')
    found = _ORIGINS.get(design.origin, design.origin)
    lead = f"Design {escape(design.id)} of {len(run.designs)}, found {escape(found)}"
    if tightest and tightest[0].kind != "improve":
        lead += f"; tightest margin {percent(tightest[0].margin)}: {escape(tightest[0].label)}"
    out = [
        f"<header>\n<h1>{escape(run.title or 'Untitled')}</h1>\n"
        f'<p class="lead">{lead}.</p>\n<div class="verdict">{"".join(badges)}</div>'
    ]
    dangers = [way for way in wrong_ways(verification_of(run, design) or {}) if way.dangerous]
    if dangers:
        listed = assembly_list(dangers, values=False)
        out.append(f'<div class="note danger"><strong>Wrong assembly.</strong> {PREVENT}{listed}</div>')
    warnings = [warning for warning in run.warnings if not warning.startswith(_SAID_BELOW)]
    if warnings:
        lines = "".join(f"<li>{escape(warning)}</li>" for warning in warnings)
        out.append(f'<div class="note"><strong>To know.</strong><ul>{lines}</ul></div>')
    return "\n".join(out) + "\n</header>"


def _results(run: Run, design: Design, extras: ReportExtras) -> str:
    out = ["<section>\n<h2>Required and reached</h2>", requirements_table(run, design, extras.baselines)]
    heading, text = cautions.IDEAL.split(": ", 1)
    out.append(f'<p class="note"><strong>{heading}.</strong> {escape(text[0].upper() + text[1:])}</p>')
    if extras.needs_guide:
        out.append(f'<p class="note">{escape(" ".join([cautions.GUIDE, *extras.balances]))}</p>')
    held = {"locked": "The mover is held at its angle", "free": "The mover may turn"}[extras.rotation]
    sideways = {"guided": "and guided sideways", "free": "and free to slide sideways"}[extras.lateral]
    out.append(f'<p class="small">{held} {sideways}. Margins are relative to the bound; the tightest stands first. '
               "Positive axial force pushes the parts apart; gaps lie between the coated faces.")  # fmt: skip
    note = elsewhere(run, design)
    if note:
        out.append(f" {escape(note)}.")
    if run.verification is None:
        out.append(" Not verified yet: <code>polewright verify</code> adds a second physics path and tolerances.")
    return "".join(out) + "</p>\n</section>"


def _curve(run: Run, design: Design, extras: ReportExtras) -> str:
    curve = run.curves.get("force_gap")
    if curve is None:
        return ""
    position = [other.id for other in run.designs].index(design.id)
    band = ((verification_of(run, design) or {}).get("scatter") or {}).get("force_band")
    figure = force_gap_figure(curve, position, extras.marks, band)
    force = curve.values[position]
    floats = bool(((force[:-1] > 0.0) & (force[1:] <= 0.0)).any())
    note = " Where the force falls through zero as the gap opens, the mover floats in axial balance, on a guide only."
    return (
        "<section>\n<h2>Force over the gap</h2>\n"
        f'<figure class="plotbox">{figure}<figcaption>Mover centred over the base. Positive pushes apart.'
        f"{note if floats else ''}</figcaption>"
        "</figure>\n</section>"
    )


def _maps(extras: ReportExtras) -> str:
    if not extras.maps:
        return ""
    shown = [
        f'<h3>{escape(field_map.title)}</h3>\n<figure class="plotbox">{svg}<figcaption>{escape(field_map.note)}'
        "</figcaption></figure>"
        for field_map, svg in zip(extras.maps, field_figure(extras.maps, "map"), strict=True)
    ]
    return (
        '<section>\n<div class="keep">\n<h2>Stray field</h2>\n'
        '<p class="intro">Size of B on planes through the space around the parts. '
        "Bold lines: 0.5 mT (implants), 5 mT, 50 mT. Peaks in the table of requirements are refined, not read off "
        "these rasters.</p>\n" + shown[0] + "\n</div>\n" + "\n".join(shown[1:]) + "\n</section>"
    )


def _checks(run: Run, design: Design) -> str:
    found = verification_of(run, design)
    if found is None:
        note = elsewhere(run, design)
        return f"<section>\n<h2>Checks</h2>\n<p>{escape(note)}</p>\n</section>" if note else ""
    out = [f"<section>\n<h2>Checks of design {escape(design.id)}</h2>"]
    second = found.get("second_path")
    if second:
        out.append(_second_path(second))
    scatter = found.get("scatter")
    if scatter:
        out.append(_scatter(scatter))
    ways = wrong_ways(found)
    if ways:
        lead = PREVENT if any(way.dangerous for way in ways) else harmless(ways)
        out.append(f'<h3>Wrong assembly</h3>\n<p class="intro">{lead}</p>\n{assembly_list(ways, values=True)}')
    return "\n".join(out) + "\n</section>"


def _second_path(second: Record) -> str:
    word = "agrees" if second["ok"] else "DISAGREES"
    largest = "unknown" if second["largest"] is None else f"{second['largest']:.1e}"
    says = "gives the same numbers" if second["ok"] else "does not give the same numbers"
    looked = any("random places" in str(check["what"]) for check in second["checks"])
    random = ["The field at random places checks a peak from below: it may not exceed it."] if looked else []
    return (
        f"<h3>Second physics path: {word}</h3>\n"
        f'<p class="intro">Another formula in other code {says}: largest relative difference {largest}, allowed '
        f"{second['tolerance']:.0e}.</p>\n"
        + _sentences(second_sentences(second))
        + second_path_table(second)
        + _sentences(random, small=True)
    )


def _scatter(scatter: Record) -> str:
    out = [
        f'<h3>Tolerances</h3>\n<p class="intro">{100.0 * scatter["share_all"]:.1f} % of {scatter["samples"]} sampled '
        f"pairs (seed {scatter['seed']}) meet every requirement.</p>",
        scatter_table(scatter["requirements"]),
        _sentences(accuracy(scatter["requirements"]), small=True),
        _sentences(scatter.get("notes", []), small=True),
    ]
    if scatter.get("imbalance_floor"):
        out.append(_floor(scatter["imbalance_floor"]))
    return "\n".join(line for line in out if line)


def _sentences(sentences: Sequence[str], *, small: bool = False) -> str:
    kind = ' class="small"' if small else ""
    return f"<p{kind}>{escape(' '.join(sentences))}</p>\n" if sentences else ""


def _floor(floor: Record) -> str:
    """The record's keys are "label [unit]"."""
    words = []
    for name, value in floor.items():
        label, _, unit = str(name).rpartition(" [")
        size = number(value) if isinstance(value, float) else str(value)
        words.append(escape(f"{label}: {size} {unit.rstrip(']')}" if label else f"{name}: {size}"))
    return f"<p>Imbalance between N and S sets a floor under every claim of low leakage. {'; '.join(words)}.</p>"


def _others(run: Run, design: Design) -> str:
    if len(run.designs) < 2:
        return ""
    return (
        f"<section>\n<h2>Designs of this run</h2>\n{designs_table(run, design)}\n"
        '<p class="small">The worst margin is that of the bounds; a target that lies in its band does not count. '
        "Another design: <code>polewright report RUN --design ID</code>.</p>\n</section>"
    )


def _cautions() -> str:
    lines = "".join(f"<li><strong>{escape(head)}.</strong> {escape(text)}</li>" for head, text in cautions.CAUTIONS)
    return f"<section>\n<h2>Cautions</h2>\n<ul>{lines}</ul>\n<p>{escape(cautions.DEFER)}</p>\n</section>"


def _reproduce(run: Run, extras: ReportExtras) -> str:
    facts = [
        ("stopped", run.stop_reason),
        ("evaluations", f"{run.evaluations} pattern pairs"),
        ("seed", str(run.seed)),
        ("spec, SHA-256", run.spec_sha256),
        ("polewright", __version__),
    ]
    provenance = sorted(run.provenance.items())
    facts += [(name.removesuffix("_json").replace("_", " "), _plain(value)) for name, value in provenance]
    listed = "".join(f"<dt>{escape(name)}</dt><dd>{escape(value)}</dd>" for name, value in facts if value)
    return (
        f"<section>\n<h2>How to reproduce this</h2>\n<dl>{listed}</dl>\n<p>Save the spec below and run it; the same "
        "seed on the same machine gives the same patterns.</p>\n"
        f"<pre>polewright design {escape(extras.spec_name)}</pre>\n"
        f"<pre>{escape(run.spec_toml)}</pre>\n</section>"
    )


def _plain(value: str) -> str:
    """Return a value of the provenance for people: a JSON object as its names and values."""
    try:
        found = json.loads(value)
    except ValueError:
        return value
    return ", ".join(f"{name} {item}" for name, item in found.items()) if isinstance(found, dict) else value
