"""``polewright report``: one self-contained HTML file about a run."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("report")
@click.argument("run", type=click.Path(path_type=Path))
@click.option("-o", "output", type=click.Path(path_type=Path), metavar="FILE", help="HTML file to write.")
@click.option("--design", "design_id", metavar="ID", help="Which design; the best one by default.")
@click.option("--replace", is_flag=True, help="Overwrite an existing file.")
def command(run: Path, output: Path | None, design_id: str | None, replace: bool) -> None:
    """Write one self-contained HTML report about a design of RUN: patterns, curves, checks, cautions."""
    from ..archive import read_run
    from ..judged import find_design
    from ..output import output_path, put_in_place
    from ..report.collect import collect_extras
    from ..report.page import render

    stored = read_run(run)
    design = find_design(stored, design_id)
    path = output_path(output, f"{run.stem}.html", replace=replace, inputs=(run,))
    put_in_place(path, render(stored, collect_extras(stored, design), design.id).encode("utf-8"))
    click.echo(f"Report on design {design.id} written to {path}", err=True)
