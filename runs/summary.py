"""A run in the terminal: required against reached, worst margin first. For people, so on stderr."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from typing import Any

from rich import box
from rich.console import Console
from rich.table import Table
from rich.text import Text

from .judged import Judged, bound_text, finite, judge, numbers, percent, tightest_first
from .records import Design, Run
from .result import Status, status_of
from .verification.words import PREVENT, accuracy, elsewhere, harmless, second_sentences, verification_of, wrong_ways

_HEADLINES: dict[Status, tuple[str, str]] = {
    "met": ("every requirement is met", "bold green"),
    "missed": ("a requirement is missed", "bold yellow"),
    "impossible": ("proven impossible", "bold red"),
    "interrupted": ("interrupted; the best so far is saved", "bold yellow"),
    "error": ("failed", "bold red"),
}
_LISTED = 8
_LOG_WIDTH = 120  # of a pipe or a log file, which have no width of their own


def stderr_console() -> Console:
    """Return the console for people: colours on a terminal, plain text elsewhere or with NO_COLOR set."""
    plain = bool(os.environ.get("NO_COLOR"))
    console = Console(
        stderr=True, force_terminal=False if plain else None, no_color=plain or None, highlight=False, emoji=False,
        markup=False,
    )  # fmt: skip
    if not console.is_terminal and "COLUMNS" not in os.environ:
        console.width = _LOG_WIDTH
    return console


def print_summary(run: Run, console: Console, design: Design | None = None, status: Status | None = None) -> None:
    """Print a run: what it is, one design against the requirements, the other designs, the warnings.

    Args:
        run: The run.
        console: Where to.
        design: The design shown in full, the best one when None.
        status: How the command ended, where it differs from ``status_of(run)``.
    """
    shown = design if design is not None else run.designs[0] if run.designs else None
    headline, style = _HEADLINES[status if status is not None else _status(run, shown)]
    console.print(Text(run.title or "untitled", style="bold"))
    console.print(Text(headline[0].upper() + headline[1:] + ".", style=style))
    console.print(Text(f"Stopped: {run.stop_reason} ({run.evaluations} evaluations, seed {run.seed})."))
    if shown is not None:
        console.print(_requirements(run, shown, plain=not console.is_terminal))
    if len(run.designs) > 1:
        console.print(_designs(run, plain=not console.is_terminal))
    if shown is not None:
        _print_verification(run, shown, console)
    for warning in run.warnings:
        console.print(Text(f"warning: {warning}", style="yellow" if console.is_terminal else ""))
    if not any(warning.startswith("IDEAL") for warning in run.warnings):
        console.print(Text("IDEAL: computed for sharp pole edges and full magnetizing depth."))


def _status(run: Run, shown: Design | None) -> Status:
    """How the run ended, for the design that is shown."""
    ended = status_of(run)
    if ended == "interrupted" or shown is None:
        return ended
    return "met" if shown.feasible else "missed"


def _table(title: str, plain: bool) -> Table:
    return Table(
        title=title, title_justify="left", title_style="" if plain else "bold", header_style="" if plain else "bold",
        box=box.ASCII2 if plain else box.SIMPLE_HEAD, pad_edge=False,
    )  # fmt: skip


def _requirements(run: Run, design: Design, plain: bool) -> Table:
    table = _table(f"Design {design.id} ({design.origin}), tightest margin first", plain)
    table.add_column("quantity", overflow="fold")
    table.add_column("required", justify="right", overflow="fold")
    table.add_column("reached", justify="right", overflow="fold")
    table.add_column("unit")
    table.add_column("margin", justify="right")
    table.add_column("")
    for entry in tightest_first(judge(run, design)):
        word, style = _verdict(entry)
        required = _ascii(bound_text(entry)) if plain else bound_text(entry)
        margin = "" if entry.kind == "improve" else percent(entry.margin)
        cells = (entry.label, required, numbers(entry.values), entry.unit, margin)
        table.add_row(*(Text(cell) for cell in cells), Text(word, style="" if plain else style))
    return table


def _verdict(entry: Judged) -> tuple[str, str]:
    if entry.kind == "improve":
        return "", ""
    return ("met", "green") if entry.ok else ("missed", "bold red")


def _designs(run: Run, plain: bool) -> Table:
    table = _table("Designs, best first", plain)
    entries = [judge(run, design) for design in run.designs[:_LISTED]]
    improves = [n for n, entry in enumerate(entries[0]) if entry.kind == "improve"]
    for heading in ("id", "from", "requirements"):
        table.add_column(heading)
    table.add_column("worst margin", justify="right")
    for n in improves:
        table.add_column(f"{entries[0][n].label} [{entries[0][n].unit}]", justify="right", overflow="fold")
    for design, judged in zip(run.designs, entries, strict=False):
        verdict = Text("met" if design.feasible else "missed")
        reached = [Text(numbers(judged[n].values)) for n in improves]
        margin = Text(percent(finite(design.worst_margin)))
        table.add_row(Text(design.id), Text(design.origin), verdict, margin, *reached)
    if len(run.designs) > _LISTED:
        table.caption = f"and {len(run.designs) - _LISTED} more in the archive"
    return table


def _print_verification(run: Run, design: Design, console: Console) -> None:
    found = verification_of(run, design)
    if found is None:
        if run.verification is not None:
            console.print(Text(elsewhere(run, design)))
        return
    second = found.get("second_path")
    if second:
        verdict = "agrees" if second["ok"] else "DISAGREES"
        size, limit = second["largest"], second["tolerance"]
        console.print(Text(f"Second path: {verdict} (largest relative difference {size:.1e}, allowed {limit:.0e})."))
        for sentence in second_sentences(second):
            console.print(Text(f"Second path: {sentence}"))
    scatter = found.get("scatter")
    if scatter:
        share = 100.0 * scatter["share_all"]
        console.print(Text(f"Scatter: {share:.1f} % of {scatter['samples']} sampled pairs meet every requirement."))
        for sentence in _costly(scatter["requirements"]):
            console.print(Text(f"Scatter: {sentence}"))
        console.print(Text(" ".join([*accuracy(scatter["requirements"]), *scatter.get("notes", [])])))
    ways = wrong_ways(found)
    dangers = [way for way in ways if way.dangerous]
    if dangers:
        console.print(Text(f"Wrong assembly. {PREVENT}"))
        for way in dangers:
            console.print(Text(f"- {way.name}: {way.text}"))
    elif ways:
        console.print(Text(f"Wrong assembly. {harmless(ways)}"))


def _costly(rows: Sequence[Mapping[str, Any]]) -> list[str]:
    """What costs the requirements that not every sampled pair meets."""
    return [
        f"{row['label']} is met by {100.0 * row['share']:.1f} %; costliest tolerance: {row['costliest']}."
        for row in rows
        if row["share"] < 1.0
    ]


def _ascii(text: str) -> str:
    return text.replace("≥", ">=").replace("≤", "<=").replace("±", "+-")
