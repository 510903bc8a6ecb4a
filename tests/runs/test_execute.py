"""Whole runs from Python: what is found, kept, resumed and refused."""

from __future__ import annotations

import os
import signal
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from polewright.models.errors import InputError
from polewright.models.pair import Row, pair_forms
from polewright.optimizer.stages import Stages
from polewright.optimizer.stopping import StopReason
from polewright.runs.archive import read_run
from polewright.runs.execute import design, execute
from polewright.runs.records import Run
from polewright.runs.resolve import parts
from polewright.runs.spec import parse_spec

from ..models import references as ref
from .specs import NEAR_FAR, SEARCHED, differences, spec_text, write

PRINTED = 6e-7
"""Half of the last digit of reference values printed to 1e-6 N."""
HOLD = '[[improve]]\nquantity = "holding_force"\ngap_mm = {gap}\nsense = "maximize"\n'


def text_of(pattern: np.ndarray[Any, Any]) -> str:
    """A pattern file, first line lowest y."""
    return "\n".join(",".join(str(int(cell)) for cell in row) for row in pattern) + "\n"


@pytest.mark.parametrize(("gap", "largest", "least"), [(row[0], row[1], row[3]) for row in ref.ENUMERATED_3X3])
def test_matched_pair_of_nine_cells_is_the_enumerated_optimum(gap: float, largest: float, least: float | None) -> None:
    # all 512 patterns against their own copy, with the closed form (see references); + is attraction there
    run = execute(parse_spec(spec_text(mover='pattern = "matched"', wishes=HOLD.format(gap=gap))))
    assert run.stop_reason == StopReason.PROVEN.value
    assert run.designs[0].values[0] == pytest.approx(largest, abs=PRINTED)
    assert np.array_equal(run.designs[0].base, run.designs[0].mover)
    if least is not None:
        wishes = HOLD.format(gap=gap).replace("maximize", "minimize")
        run = execute(parse_spec(spec_text(mover='pattern = "matched"', wishes=wishes)))
        assert run.designs[0].values[0] == pytest.approx(least, abs=PRINTED)


def test_same_part_is_stored_turned_over() -> None:
    run = execute(parse_spec(spec_text(mover='pattern = "same"', wishes=HOLD.format(gap=0.3))))
    for found in run.designs:
        assert np.array_equal(found.mover, -found.base[::-1])


@pytest.mark.parametrize("given", ["plain-N", "file"])
def test_a_given_partner_is_answered_by_the_sum_of_sizes(given: str, tmp_path: Path) -> None:
    # linear in the free part: the optimum is sum|K b|; 100 cells cannot be enumerated
    pattern = np.where(np.indices((10, 10)).sum(0) // 3 % 2 == 0, 1, -1)
    pattern[2, 3:6] *= -1
    write(tmp_path / "b.csv", text_of(pattern))
    word = given if given == "plain-N" else "b.csv"
    wishes = HOLD.format(gap=0.7)
    text = spec_text(10, cell=1.0, mover=f'pattern = "{word}"', wishes=wishes, search="starts = 4\nevaluations = 6000")
    spec = parse_spec(text, folder=tmp_path)
    run = execute(spec)
    b = run.designs[0].mover.astype(np.float64)
    # the mover's mating face shows N where its polarity is -1
    assert (b == -1.0).all() if given == "plain-N" else np.array_equal(b, pattern)
    products = pair_forms(*parts(spec), [Row("fz", 0.7e-3)]).base_products(b)
    assert run.designs[0].values[0] == pytest.approx(np.abs(products).sum(), rel=1e-6)


def test_two_given_patterns_are_simply_evaluated(tmp_path: Path) -> None:
    write(tmp_path / "a.csv", text_of(ref.pattern("+++---++-")))
    text = spec_text(
        base='pattern = "a.csv"', mover='pattern = "matched"', wishes=HOLD.format(gap=0.1), search="evaluations = 1"
    )
    run = execute(parse_spec(text, folder=tmp_path))
    assert run.stop_reason == StopReason.GIVEN.value
    assert run.complete
    assert [found.origin for found in run.designs] == ["given"]
    assert run.designs[0].values[0] == pytest.approx(17.831774, abs=PRINTED)


def test_best_design_first_and_all_reported_numbers_fit() -> None:
    run = execute(parse_spec(spec_text()))
    margins = [found.worst_margin for found in run.designs]
    assert margins == sorted(margins, reverse=True)
    assert [found.id for found in run.designs] == [f"d{n + 1}" for n in range(len(run.designs))]
    assert len(run.columns) == run.designs[0].values.size == 3
    assert run.designs[0].feasible == (margins[0] >= 0.0)
    assert run.curves["force_gap"].values.shape == (len(run.designs), run.curves["force_gap"].scale.size)
    # the curve passes through every gap that the spec names, at the value that was judged
    at = np.flatnonzero(np.isclose(run.curves["force_gap"].scale, 0.3e-3, atol=1e-9))
    assert run.curves["force_gap"].values[0, at[0]] == pytest.approx(-run.designs[0].values[0], rel=1e-9)


def test_fixed_cells_stay_in_every_design(tmp_path: Path) -> None:
    write(tmp_path / "fixed.csv", ",,\n,1,\n,,-1\n")
    run = execute(parse_spec(spec_text(base='fixed = "fixed.csv"', mover='fixed = "none"'), folder=tmp_path))
    for found in run.designs:
        assert (found.base[1, 1], found.base[2, 2]) == (1, -1)
        assert not (found.base == 0).any()
    assert any(found.mover[1, 1] != 1 or found.mover[2, 2] != -1 for found in run.designs)


def test_given_patterns_without_a_wish_are_evaluated() -> None:
    text = spec_text(base='pattern = "plain-N"', mover='pattern = "matched"', wishes="")
    run = execute(parse_spec(text))
    assert [found.feasible for found in run.designs] == [True]
    assert (run.curves["force_gap"].values < 0.0).all()


def test_a_given_pattern_with_poles_under_the_width_is_told(tmp_path: Path) -> None:
    (tmp_path / "fine.csv").write_text("1,-1,1,-1\n" * 4, encoding="utf-8")
    given = 'pattern = "fine.csv"\npole_width_min_mm = 2.0'
    run = execute(parse_spec(spec_text(4, cell=1.0, base=given), folder=tmp_path))
    (told,) = [warning for warning in run.warnings if "given pattern" in warning]
    assert told == "base and mover: the given pattern has poles of 1 mm, narrower than the 2 mm of pole_width_min_mm."


def test_a_pole_width_that_nothing_keeps_is_refused() -> None:
    # two cells are narrower than a pole of three; so is a ring three cells wide at its diagonals for one of nine
    text = spec_text(6, cell=1.0, base="pole_width_min_mm = 3.0").replace("[6.0, 6.0]", "[6.0, 2.0]")
    ring = spec_text(6, cell=1.0, base="pole_width_min_mm = 9.0").replace('"rectangle"', '"ring"')
    ring = ring.replace("size_mm = [6.0, 6.0]", "outer_mm = 20.0\ninner_mm = 14.0")
    for each in (text, ring):
        with pytest.raises(InputError) as error:
            execute(parse_spec(each))
        assert [issue.path for issue in error.value.issues] == ["base.pole_width_min_mm", "mover.pole_width_min_mm"]


def test_a_cap_in_seconds_is_told_as_not_reproducible() -> None:
    run = execute(parse_spec(SEARCHED.replace("evaluations = 40000", "evaluations = 100000000\nbudget_s = 0.5")))
    assert run.stop_reason == StopReason.SECONDS.value
    assert any("not reproducible" in warning for warning in run.warnings)
    assert run.complete


# --- interrupt and resume ------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The archive of an uninterrupted run, beside its spec."""
    folder = tmp_path_factory.mktemp("whole")
    design(write(folder / "s.toml", SEARCHED), output=folder / "s.h5")
    return folder / "s.h5"


@pytest.mark.parametrize("stage", [0, 1])
def test_an_interrupted_run_resumes_to_the_uninterrupted_one(
    stage: int, whole: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    spec, output = write(tmp_path / "s.toml", SEARCHED), tmp_path / "s.h5"
    run_stage = Stages.run

    def interrupted(self: Stages, number: int, *rest: Any) -> None:
        if number == stage:
            os.kill(os.getpid(), signal.SIGINT)
        run_stage(self, number, *rest)

    monkeypatch.setattr(Stages, "run", interrupted)
    run = design(spec, output=output)
    assert not run.complete
    assert run.stop_reason == StopReason.INTERRUPTED.value
    assert run.designs
    stored = read_run(output)
    assert not stored.complete
    assert stored.evaluations == run.evaluations
    monkeypatch.undo()
    resumed = design(spec, output=output, resume=True)
    assert resumed.complete
    assert differences(output, whole) == []


def test_handlers_are_put_back_after_a_run(whole: Path) -> None:
    assert whole.exists()
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_a_larger_budget_continues_and_never_loses(whole: Path, tmp_path: Path) -> None:
    output = tmp_path / "s.h5"
    output.write_bytes(whole.read_bytes())
    before = read_run(output)
    spec = write(tmp_path / "s.toml", SEARCHED.replace("40000", "40001"))
    after = design(spec, output=output, resume=True)
    assert after.evaluations >= before.evaluations
    assert after.designs[0].worst_margin >= before.designs[0].worst_margin


def test_a_complete_run_is_returned_as_it_is(whole: Path, tmp_path: Path) -> None:
    output = tmp_path / "s.h5"
    output.write_bytes(whole.read_bytes())
    run = design(write(tmp_path / "s.toml", SEARCHED), output=output, resume=True)
    assert run.complete
    assert output.read_bytes() == whole.read_bytes()


def test_a_proven_run_stays_proven_under_a_larger_budget(tmp_path: Path) -> None:
    output = tmp_path / "s.h5"
    design(write(tmp_path / "s.toml", spec_text()), output=output)
    stored = output.read_bytes()
    larger = write(tmp_path / "s.toml", spec_text(search="evaluations = 500000"))
    assert design(larger, output=output, resume=True).stop_reason == StopReason.PROVEN.value
    assert output.read_bytes() == stored


@pytest.mark.parametrize("change", ["seed = 1", "starts = 5"])
def test_only_budgets_may_change_on_resume(change: str, tmp_path: Path) -> None:
    output = tmp_path / "s.h5"
    design(write(tmp_path / "s.toml", spec_text()), output=output)
    stored = output.read_bytes()
    with pytest.raises(InputError, match="--resume needs the spec that the run was started with"):
        design(write(tmp_path / "t.toml", spec_text(search=change)), output=output, resume=True)
    other = write(tmp_path / "t.toml", spec_text(wishes=NEAR_FAR.format(near=4.5, far=0.1)))
    with pytest.raises(InputError, match="require"):
        design(other, output=output, resume=True)
    assert output.read_bytes() == stored


def test_resume_without_an_archive_starts_one(tmp_path: Path) -> None:
    run = design(write(tmp_path / "s.toml", spec_text()), output=tmp_path / "s.h5", resume=True)
    assert run.complete
    assert read_run(tmp_path / "s.h5").designs[0].worst_margin == run.designs[0].worst_margin


# --- from stored patterns ------------------------------------------------------------------------------------------


def test_stored_patterns_are_evaluated_under_another_spec(tmp_path: Path) -> None:
    proven = design(write(tmp_path / "a.toml", spec_text()), output=tmp_path / "a.h5")
    # one evaluation finds nothing: the best can only be what was stored
    wishes = NEAR_FAR.format(near=4.0, far=0.1).replace("K1", "Z")
    other = spec_text(search="evaluations = 1\nstarts = 1", wishes=wishes)
    run = design(write(tmp_path / "b.toml", other), output=tmp_path / "b.h5", start_from=tmp_path / "a.h5")
    assert run.designs[0].origin == "given"
    assert run.designs[0].worst_margin == proven.designs[0].worst_margin
    assert np.array_equal(run.designs[0].base, proven.designs[0].base)
    # other bounds judge the same patterns otherwise
    halved = spec_text(search="evaluations = 1\nstarts = 1", wishes=NEAR_FAR.format(near=2.0, far=0.05))
    again = design(write(tmp_path / "c.toml", halved), output=tmp_path / "c.h5", start_from=tmp_path / "a.h5")
    stored = next(d for d in again.designs if np.array_equal(d.base, proven.designs[0].base))
    assert stored.values.tolist() == proven.designs[0].values.tolist()
    assert stored.worst_margin == pytest.approx(2.0 * proven.designs[0].worst_margin + 1.0)


def test_other_cells_are_refused(tmp_path: Path) -> None:
    design(write(tmp_path / "a.toml", spec_text()), output=tmp_path / "a.h5")
    with pytest.raises(InputError, match="received 3 x 3 and 3 x 3"):
        design(write(tmp_path / "b.toml", spec_text(4)), output=tmp_path / "b.h5", start_from=tmp_path / "a.h5")
    assert not (tmp_path / "b.h5").exists()


def test_watch_and_keep_see_readable_states(tmp_path: Path) -> None:
    seen: list[Run] = []

    def watch(run: Run) -> None:
        stored = read_run(tmp_path / "s.h5")
        assert not stored.complete
        assert stored.evaluations == run.evaluations
        seen.append(run)

    last = design(write(tmp_path / "s.toml", SEARCHED), output=tmp_path / "s.h5", watch=watch)
    assert seen
    assert all(not run.complete for run in seen)
    best = [run.designs[0].worst_margin for run in [*seen, last]]
    assert best == sorted(best)
    assert replace(last, provenance={}).complete
