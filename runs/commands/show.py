"""``polewright show``: a run in the terminal."""

from __future__ import annotations

import json
import time
from pathlib import Path

import click


@click.command("show")
@click.argument("run", type=click.Path(path_type=Path))
@click.option("--design", "design_id", metavar="ID", help="Which design is shown in full; the best one by default.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object to stdout instead.")
def command(run: Path, design_id: str | None, as_json: bool) -> None:
    """Show what RUN reached against what was required, worst margin first."""
    from ..archive import read_run
    from ..judged import find_design
    from ..result import result_json
    from ..summary import print_summary, stderr_console

    started = time.perf_counter()
    stored = read_run(run)
    design = find_design(stored, design_id)
    if not as_json:
        print_summary(stored, stderr_console(), design)
        return
    result = result_json(stored, "show", run, time.perf_counter() - started)
    if design_id is not None:
        result["designs"] = [item for item in result["designs"] if item["id"] == design_id]
    click.echo(json.dumps(result, ensure_ascii=False, allow_nan=False, indent=2))
