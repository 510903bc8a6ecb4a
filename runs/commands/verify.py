"""``polewright verify``: the second physics path, scatter and wrong assembly of a run's design."""

from __future__ import annotations

import json
import time
from pathlib import Path

import click


@click.command("verify")
@click.argument("run", type=click.Path(path_type=Path))
@click.option("--design", "design_id", metavar="ID", help="Which design is verified; the best one by default.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object to stdout instead.")
def command(run: Path, design_id: str | None, as_json: bool) -> int:
    """Check a design of RUN by a second physics path, tolerances and wrong assembly, and store the result in RUN."""
    from ..judged import find_design
    from ..progress import steps
    from ..result import EXIT_CODES, result_json
    from ..summary import print_summary, stderr_console
    from ..verify import verified_status, verify

    started = time.perf_counter()
    console = stderr_console()
    with steps(console, quiet=as_json) as watch:
        found = verify(run, design_id, watch)
    status = verified_status(found)
    if as_json:
        result = result_json(found, "verify", run, time.perf_counter() - started, status)
        click.echo(json.dumps(result, ensure_ascii=False, allow_nan=False, indent=2))
    else:
        print_summary(found, console, find_design(found, design_id), status)
        console.print(f"Verification stored in {run}", markup=False, highlight=False)
    return EXIT_CODES[status]
