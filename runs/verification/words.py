"""What ``verify`` found, in words for people: whose verification it is, what disagrees, wrong assembly in few lines.

Light on purpose: the terminal and the report read records alone, and need none of the physics that made them.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from ..records import Design, Run

Record = Mapping[str, Any]

HARMLESS = "No wrong assembly that was tried turns a pull into a push or makes it much stronger."
ANY_WAY = "The pair fits any way round: turned or tipped over as its outline allows, nothing changes."
PREVENT = "Make impossible, by a key, a mark or an outline that fits one way only:"


def verification_of(run: Run, design: Design) -> Record | None:
    """Return the run's verification where it is that of ``design``, else None."""
    found = run.verification
    return found if found is not None and found.get("design") == design.id else None


def elsewhere(run: Run, design: Design) -> str:
    """Return whose verification the run holds where it is not that of ``design``, else an empty string."""
    if run.verification is None or verification_of(run, design) is not None:
        return ""
    return (
        f"Verified was design {run.verification.get('design')}, not {design.id}: "
        f"polewright verify RUN --design {design.id}"
    )


def second_sentences(second: Record) -> list[str]:
    """Return what the second path says beside its verdict: disagreements, what they cost, what it does not check."""
    found = [f"Disagreement in {text}." for text in second.get("failed", [])]
    found += [f"By the second path, {label} is missed." for label in second.get("missed", [])]
    return found + [f"Not checked is {item['what']}: {item['why']}." for item in second.get("unchecked", [])]


def accuracy(rows: Sequence[Record]) -> list[str]:
    """Return how the figures of the scatter were found, a sentence a method with its error on held-out pairs."""
    methods: dict[str, list[Record]] = {}
    for row in rows:
        methods.setdefault(str(row.get("method", "")), []).append(row)
    found = []
    for method, members in methods.items():
        if not method:
            continue
        whose = "" if len(methods) == 1 else f" of {_listed([str(row['label']) for row in members])}"
        errors = [row.get("error") for row in members]
        # an error without a number is one of a value that only one of the two found
        largest = max((float(error) for error in errors if error is not None), default=0.0)
        size = "without limit" if None in errors else f"{max(100.0 * largest, 0.01):.2g} %"
        if method.startswith("interpolation"):
            found.append(
                f"Figures{whose} come from interpolation; on held-out pairs that were evaluated exactly it is off by "
                f"at most {size} of the band from 5 to 95 %."
            )
        elif method.startswith("exact"):
            found.append(f"Figures{whose} come from {method}: the interpolation was off by {size} of the band.")
        else:
            found.append(f"{_listed([str(row['label']) for row in members])}: {method}.")
    return found


@dataclass(frozen=True)
class WrongWay:
    """Wrong ways to assemble a pair that do the same.

    Attributes:
        name: All of them, in words ("mover turned by 90 or 270 deg").
        text: What they do.
        dangerous: Do they surprise those who handle the parts?
        changes: Do they change anything?
        likely: Can they happen, as far as the spec says?
        values: Rows of label, unit and value [SI] of the first of them.
    """

    name: str
    text: str
    dangerous: bool
    changes: bool
    likely: bool
    values: tuple[Record, ...]


def wrong_ways(found: Record) -> tuple[WrongWay, ...]:
    """Return the wrong ways to assemble a verified pair, those that say the same together, the dangerous ones first."""
    groups: dict[str, list[Record]] = {}
    for way in found.get("assembly", []):
        # what a guide prevents is one matter, however its numbers differ
        same = str(way["text"]) if way["likely"] or not way["changes"] else ""
        groups.setdefault(same, []).append(way)
    merged = [_together(ways) for ways in groups.values()]
    return tuple(sorted(merged, key=lambda way: (not way.dangerous, not way.changes)))


def _together(ways: list[Record]) -> WrongWay:
    first = ways[0]
    text = str(first["text"])
    if len({str(way["text"]) for way in ways}) > 1:
        text = f"Of the first of these: {text}"
    name = _names([str(way["name"]) for way in ways])
    return WrongWay(name, text, first["dangerous"], first["changes"], first["likely"], tuple(first["values"]))


def harmless(ways: Sequence[WrongWay]) -> str:
    """Return the sentence for ways of which none is dangerous."""
    return HARMLESS if any(way.changes and way.likely for way in ways) else ANY_WAY


def _names(names: list[str]) -> str:
    """One name for several: of one kind what differs is listed, kinds stand after each other."""
    kinds: dict[tuple[str, ...], list[str]] = {}
    for name in names:
        kinds.setdefault(tuple(name.split(" ")[:2]), []).append(name)
    return "; ".join(_either(members) for members in kinds.values())


def _either(names: list[str]) -> str:
    words = [name.split(" ") for name in names]
    if len({len(parts) for parts in words}) != 1:
        return ", ".join(names)
    merged = []
    for parts in zip(*words, strict=True):
        distinct = list(dict.fromkeys(parts))
        merged.append(distinct[0] if len(distinct) == 1 else f"{', '.join(distinct[:-1])} or {distinct[-1]}")
    return " ".join(merged)


def _listed(labels: list[str]) -> str:
    return labels[0] if len(labels) == 1 else f"{'; '.join(labels[:-1])} and {labels[-1]}"
