"""``polewright demo``: an example end to end."""

from __future__ import annotations

import json
import time
from pathlib import Path

import click

_EXAMPLE = "hatch"


@click.command("demo")
@click.option("--json", "as_json", is_flag=True, help="Print the verified run as one JSON object to stdout.")
def command(as_json: bool) -> int:
    """Design, verify and report an invented example in a new folder polewright-demo."""
    from ..archive import write_run
    from ..examples import example_text
    from ..execute import design
    from ..output import put_in_place
    from ..progress import shown, steps
    from ..report.collect import collect_extras
    from ..report.page import render
    from ..result import EXIT_CODES, result_json, status_of
    from ..summary import print_summary, stderr_console
    from ..verify import verify

    started = time.perf_counter()
    folder = _new_folder()
    console = stderr_console()
    spec, archive, page = folder / f"{_EXAMPLE}.toml", folder / f"{_EXAMPLE}.h5", folder / f"{_EXAMPLE}.html"
    put_in_place(spec, example_text(_EXAMPLE).encode("utf-8"))
    with shown(console, quiet=as_json) as watch:
        run = design(spec, output=archive, watch=watch)
    if run.complete:
        with steps(console, quiet=as_json) as steps_watch:
            run = verify(run, watch=steps_watch)
        write_run(run, archive)
        best = run.designs[0]
        put_in_place(page, render(run, collect_extras(run, best), best.id).encode("utf-8"))
    if as_json:
        result = result_json(run, "demo", archive, time.perf_counter() - started)
        click.echo(json.dumps(result, ensure_ascii=False, allow_nan=False, indent=2))
    else:
        print_summary(run, console)
        console.print(f"The spec, the run and its report are in {folder}; open {page}", markup=False, highlight=False)
    return EXIT_CODES[status_of(run)]


def _new_folder() -> Path:
    """Make polewright-demo, or the first of polewright-demo-2, -3, ... that does not exist, in the current folder."""
    number = 1
    while True:
        folder = Path("polewright-demo" if number == 1 else f"polewright-demo-{number}")
        try:
            folder.mkdir()
        except FileExistsError:
            number += 1
        else:
            return folder
