"""The tables of a report as HTML."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape
from typing import Any

from ...models.units import from_si
from ..judged import Judged, bound_text, finite, judge, merged_label, number, numbers, percent, tightest_first
from ..records import Column, Design, Run
from ..verification.words import WrongWay, verification_of
from .extras import Baseline

_RIGHT = ' class="number"'
_SIGNS = {"at_least": "≥", "at_most": "≤"}


def requirements_table(run: Run, design: Design, baselines: Sequence[Baseline]) -> str:
    """Return required against reached, tightest first, one line an element, with tolerance band and baselines."""
    entries = judge(run, design)
    # rows of the scatter stand in spec order, as the requires do
    requires = [entry for entry in entries if entry.kind != "improve"]
    sampled = ((verification_of(run, design) or {}).get("scatter") or {}).get("requirements", [])
    scatter = {entry.columns: row for entry, row in zip(requires, sampled, strict=False)}
    rows = _group_head(bool(scatter), baselines)
    for entry in tightest_first(entries):
        rows += _entry_rows(run, entry, scatter.get(entry.columns), bool(scatter), baselines)
    return f'<div class="wide"><table class="requirements">{"".join(rows)}</table></div>'


def designs_table(run: Run, chosen: Design) -> str:
    """Return all designs of the run with what is improved."""
    judged = [judge(run, design) for design in run.designs]
    improves = [n for n, entry in enumerate(judged[0]) if entry.kind == "improve"]
    heads = "".join(f"<th{_RIGHT}>{_with_unit(judged[0][n].label, judged[0][n].unit)}</th>" for n in improves)
    rows = [f"<tr><th>design</th><th>from</th><th>requirements</th><th{_RIGHT}>worst margin</th>{heads}</tr>"]
    for design, entries in zip(run.designs, judged, strict=True):
        margin = percent(finite(design.worst_margin))
        here = " (this report)" if design.id == chosen.id else ""
        cells = "".join(f'<td class="number">{numbers(entries[n].values)}</td>' for n in improves)
        rows.append(
            f"<tr><td>{escape(design.id)}{here}</td><td>{escape(design.origin)}</td>"
            f'<td>{_verdict(design.feasible)}</td><td class="number">{margin}</td>{cells}</tr>'
        )
    return f'<div class="wide"><table>{"".join(rows)}</table></div>'


def second_path_table(second: Mapping[str, Any]) -> str:
    """Return the checks of the second physics path."""
    heads = "".join(f"<th{_RIGHT}>{head}</th>" for head in ("gap", "design path", "second path", "difference"))
    rows = [f"<tr><th>what</th>{heads}<th>unit</th></tr>"]
    for check in second["checks"]:
        unit = str(check["unit"])
        gap = "" if check["gap"] is None else f"{number(from_si(float(check['gap']), 'mm'))} mm"
        kernel, other, difference = (_shown(check[key], unit) for key in ("kernel", "second", "difference"))
        rows.append(
            f'<tr><td>{escape(str(check["what"]))}</td><td class="number">{gap}</td>'
            f'<td class="number">{kernel:.8g}</td><td class="number">{other:.8g}</td>'
            f'<td class="number">{_small(difference)}</td><td>{_unit(unit)}</td></tr>'
        )
    return f'<div class="wide"><table>{"".join(rows)}</table></div>'


def scatter_table(rows: Sequence[Mapping[str, Any]]) -> str:
    """Return, per requirement, the share of sampled parts that meet it and the tolerance that costs most."""
    heads = f"<th{_RIGHT}>share that meets it</th><th>5 % to 95 %</th><th>costliest tolerance</th>"
    out = [f"<tr><th>requirement</th>{heads}</tr>"]
    for row in rows:
        unit = str(row["unit"])
        ends = zip(row["p5"], row["p95"], strict=True)
        band = "; ".join(f"{number(_shown(low, unit))} to {number(_shown(high, unit))}" for low, high in ends)
        out.append(
            f'<tr><td>{escape(str(row["label"]))}</td><td class="number">{100.0 * row["share"]:.1f} %</td>'
            f"<td>{band} {_unit(unit)}</td><td>{escape(str(row['costliest']))}</td></tr>"
        )
    return f'<div class="wide"><table>{"".join(out)}</table></div>'


def assembly_list(ways: Sequence[WrongWay], *, values: bool) -> str:
    """Return wrong ways to assemble the pair and what they do, with or without their numbers."""
    out = []
    for way in ways:
        kind = "danger" if way.dangerous else "plain"
        item = f'<li class="{kind}"><strong>{escape(way.name)}</strong>: {escape(way.text)}'
        if values and way.changes:
            item += f'<br><span class="small">{"; ".join(_merged(way.values))}</span>'
        out.append(item + "</li>")
    return f'<ul class="assembly">{"".join(out)}</ul>'


def _merged(values: Sequence[Mapping[str, Any]]) -> list[str]:
    """Rows of label, unit and value as one piece of text for neighbours whose labels differ in one word."""
    groups: list[list[Mapping[str, Any]]] = []
    for row in values:
        if groups and _alike(groups[-1][-1], row):
            groups[-1].append(row)
        else:
            groups.append([row])
    found = []
    for rows in groups:
        unit = str(rows[0]["unit"])
        shown = numbers(tuple(_shown(row["value"], unit) for row in rows))
        label = escape(merged_label([str(row["label"]) for row in rows]))
        found.append(f"{label}: {shown}" if shown == "none" else f"{label}: {shown} {_unit(unit)}".rstrip())
    return found


def _alike(one: Mapping[str, Any], other: Mapping[str, Any]) -> bool:
    words, others = str(one["label"]).split(" "), str(other["label"]).split(" ")
    differing = sum(word != word_ for word, word_ in zip(words, others, strict=False))
    return one["unit"] == other["unit"] and len(words) == len(others) and differing == 1


def _group_head(scatter: bool, baselines: Sequence[Baseline]) -> list[str]:
    names = "".join(f"<th{_RIGHT}>{escape(baseline.name)}</th>" for baseline in baselines)
    groups = '<th colspan="5"></th>'
    columns = "<th>quantity</th>"
    columns += "".join(f"<th{_RIGHT}>{word}</th>" for word in ("required", "reached", "margin", ""))
    if scatter:
        groups += '<th colspan="3" class="group">sampled parts</th>'
        columns += "".join(f"<th{_RIGHT}>{word}</th>" for word in ("share", "5 %", "95 %"))
    if baselines:
        groups += f'<th colspan="{len(baselines)}" class="group">obvious patterns reach</th>'
    head = f"<tr>{groups}</tr>" if scatter or baselines else ""
    return [f"<thead>{head}<tr>{columns}{names}</tr></thead>"]


def _entry_rows(
    run: Run, entry: Judged, scatter: Mapping[str, Any] | None, has_scatter: bool, baselines: Sequence[Baseline]
) -> list[str]:
    """Return the label of an entry across the table, then one line an element."""
    count = len(entry.columns)
    width = 5 + 3 * has_scatter + len(baselines)
    rows = [f'<tr class="first"><td colspan="{width}">{escape(entry.label)}</td></tr>']
    names = _element_names([run.columns[index].label for index in entry.columns])
    for element, index in enumerate(entry.columns):
        column = run.columns[index]
        cells = [
            f'<td class="small">{escape(names[element])}</td>',
            f'<td class="number">{_element_bound(entry, element)}</td>',
            f'<td class="number"><strong>{number(entry.values[element])}</strong> {_unit(entry.unit)}</td>',
        ]
        if element == 0:
            cells += _verdict_cells(entry, count)
        if has_scatter:
            cells += _scatter_cells(entry, scatter, element, count)
        cells += [_baseline_cell(baseline, column, index) for baseline in baselines]
        rows.append(f"<tr>{''.join(cells)}</tr>")
    return rows


def _element_names(labels: list[str]) -> list[str]:
    """What tells an element from the others of its entry: the words of its label from the first to the last of them."""
    words = [label.split(" ") for label in labels]
    if len(labels) == 1 or len({len(parts) for parts in words}) != 1:
        return [""] if len(labels) == 1 else labels
    differing = [n for n, parts in enumerate(zip(*words, strict=True)) if len(set(parts)) > 1]
    # with the word after them, their unit
    return [" ".join(parts[differing[0] : differing[-1] + 2]) if differing else "" for parts in words]


def _element_bound(entry: Judged, element: int) -> str:
    bound = entry.bounds[element]
    if bound is None:
        return escape(bound_text(entry))
    if entry.kind == "equal_to":
        return f"{number(bound)} ± {number(entry.within or 0.0)}"
    sign = "toward" if entry.kind == "improve" else _SIGNS[entry.kind]
    return f"{sign} {number(bound)}"


def _verdict_cells(entry: Judged, count: int) -> list[str]:
    if entry.kind == "improve":
        return [f'<td colspan="2" rowspan="{count}"></td>']
    return [
        f'<td class="number" rowspan="{count}">{percent(entry.margin)}</td>',
        f'<td rowspan="{count}">{_verdict(entry.ok)}</td>',
    ]


def _scatter_cells(entry: Judged, row: Mapping[str, Any] | None, element: int, count: int) -> list[str]:
    if row is None:
        return [f'<td colspan="3" rowspan="{count}"></td>'] if element == 0 else []
    cells = []
    if element == 0:
        cells.append(f'<td class="number" rowspan="{count}">{100.0 * row["share"]:.1f} %</td>')
    ends = (_short(_shown(row[key][element], entry.unit)) for key in ("p5", "p95"))
    return [*cells, *(f'<td class="number">{end}</td>' for end in ends)]


def _baseline_cell(baseline: Baseline, column: Column, index: int) -> str:
    value = float(baseline.values[index])
    met = _meets(column, value)
    mark = "" if met is None else ' <span class="yes">✓</span>' if met else ' <span class="no">✗</span>'
    return f'<td class="number">{_short(from_si(value, column.unit))}{mark}</td>'


def _meets(column: Column, value: float) -> bool | None:
    """Does ``value`` [SI] meet the bound of one element? None where nothing is required."""
    if column.kind == "improve" or column.bound is None:
        return None
    if column.kind == "at_least":
        return value >= column.bound
    if column.kind == "at_most":
        return value <= column.bound
    return abs(value - column.bound) <= (column.within or 0.0)


def _short(value: float) -> str:
    """Three digits, for columns that stand close together."""
    return number(float(f"{value:.3g}"))


def _small(difference: float) -> str:
    return "0" if difference == 0.0 else f"{difference:.1e}"


def _shown(value: float | None, unit: str) -> float:
    return float("nan") if value is None else from_si(float(value), unit)


def _verdict(met: bool) -> str:
    return '<span class="yes">✓ met</span>' if met else '<span class="no">✗ missed</span>'


def _unit(unit: str) -> str:
    return "" if unit == "1" else escape(unit)


def _with_unit(label: str, unit: str) -> str:
    return escape(label) if unit == "1" else f"{escape(label)} [{escape(unit)}]"
