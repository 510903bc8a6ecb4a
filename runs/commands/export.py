"""``polewright export``: the files of one design."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("export")
@click.argument("run", type=click.Path(path_type=Path))
@click.option("--design", "design_id", metavar="ID", help="Which design; the best one by default.")
@click.option("-o", "output", type=click.Path(path_type=Path), metavar="FOLDER", help="Folder to make.")
@click.option("--replace", is_flag=True, help="Overwrite files in an existing folder.")
def command(run: Path, design_id: str | None, output: Path | None, replace: bool) -> None:
    """Write the patterns and curves of one design of RUN as CSV files."""
    from ..archive import read_run
    from ..export import export_design
    from ..judged import find_design

    stored = read_run(run)
    design = find_design(stored, design_id)
    folder = output if output is not None else Path(f"{run.stem}-{design.id}")
    files = export_design(stored, design, folder, replace=replace)
    click.echo(f"Design {design.id}: {', '.join(path.name for path in files)} written to {folder}", err=True)
