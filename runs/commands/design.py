"""``polewright design``: patterns that meet a spec."""

from __future__ import annotations

import json
import time
from pathlib import Path

import click


@click.command("design")
@click.argument("spec", type=click.Path(path_type=Path))
@click.option("-o", "output", type=click.Path(path_type=Path), metavar="RUN", help="Archive to write [SPEC.h5].")
@click.option("--from", "start_from", type=click.Path(path_type=Path), metavar="RUN", help="Begin from its designs.")
@click.option("--resume", is_flag=True, help="Continue an interrupted run in the archive, or start it.")
@click.option("--replace", is_flag=True, help="Overwrite an existing archive.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object to stdout instead.")
def command(
    spec: Path, output: Path | None, start_from: Path | None, resume: bool, replace: bool, as_json: bool
) -> int:
    """Find pole patterns that meet SPEC, at most one improve, and write them to an archive."""
    from ..archive import read_run
    from ..execute import design
    from ..progress import shown
    from ..result import EXIT_CODES, result_json, status_of
    from ..summary import print_summary, stderr_console

    started = time.perf_counter()
    path = output if output is not None else Path(f"{spec.stem}.h5")
    console = stderr_console()
    finished = resume and path.exists() and read_run(path).complete
    with shown(console, quiet=as_json) as watch:
        run = design(spec, output=path, replace=replace, resume=resume, start_from=start_from, watch=watch)
    status = status_of(run)
    if as_json:
        result = result_json(run, "design", path, time.perf_counter() - started)
        click.echo(json.dumps(result, ensure_ascii=False, allow_nan=False, indent=2))
    else:
        print_summary(run, console)
        console.print(f"{'Complete' if run.complete else 'Unfinished'} run in {path}", markup=False, highlight=False)
        if not run.complete:
            console.print(f"Continue it with: polewright design {spec} -o {path} --resume", markup=False)
        elif finished:
            console.print("It was complete already; only a larger budget would continue it.", markup=False)
    return EXIT_CODES[status]
