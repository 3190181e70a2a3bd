from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest
import yaml

from beforehand.comparing import lock_changes
from beforehand.lock import Lock, RulingRecord, differences, lock_from_text, lock_text, read_lock, sealed_lock

PLANS = Path(__file__).parents[2] / "plans" / "repair-bench"
FILES = PLANS / "jobs.lock.yaml", PLANS / "jobs-q2.lock.yaml"


@pytest.fixture(scope="module")
def locks() -> tuple[Lock, Lock]:
    """Two quarters of the repair bench under one plan."""
    return read_lock(FILES[0]), read_lock(FILES[1])


@pytest.fixture(scope="module")
def plain() -> tuple[Any, Any]:
    """The same two files as a general YAML reader sees them."""
    first, second = (yaml.safe_load(path.read_text(encoding="utf-8")) for path in FILES)
    return first, second


def changed(lock: Lock, **given: Any) -> Lock:
    """The lock with some parts replaced, its digest with them."""
    return sealed_lock(lock.model_copy(update=given))


def test_a_lock_is_the_same_as_itself(locks):
    """Nothing came, went, flipped or moved."""
    found = lock_changes(locks[0], lock_from_text(lock_text(locks[0]), "again"))
    assert found.same
    assert (found.changes, found.sections, found.flipped, found.parting) == ((), (), (), None)
    assert {pair.shift for pair in found.coefficients} == {0.0}


def test_what_a_run_was_made_with_is_no_difference(locks):
    """The environment and the name of the plan's file stay outside."""
    other = locks[0].environment.model_copy(update={"python": "3.99.0"})
    plan = locks[0].plan.model_copy(update={"file": "copy.plan.yaml"})
    assert lock_changes(locks[0], changed(locks[0], environment=other, plan=plan)).same


def test_coefficients_move_in_old_standard_errors(locks, plain):
    """The shift is taken from the two files by hand."""
    terms = [{one["term"]: one for one in data["answer"]["terms"]} for data in plain]
    pairs = {pair.term: pair for pair in lock_changes(*locks).coefficients}
    assert list(pairs) == list(dict.fromkeys([*terms[0], *terms[1]]))
    shared = [name for name in terms[0] if name in terms[1]]
    assert len(shared) >= 3
    for name in shared:
        old, new = terms[0][name], terms[1][name]
        expected = (new["coefficient"] - old["coefficient"]) / old["standard_error"]
        assert pairs[name].shift == pytest.approx(expected, rel=1e-12)
        assert (pairs[name].old, pairs[name].new) == (old["coefficient"], new["coefficient"])
    for name in set(terms[1]) - set(terms[0]):
        assert (pairs[name].old, pairs[name].shift, pairs[name].why) == (None, None, "new")
    back = {pair.term: pair for pair in lock_changes(locks[1], locks[0]).coefficients}
    assert {name for name, pair in back.items() if pair.why == "gone"} == set(terms[1]) - set(terms[0])


def test_the_fit_and_the_rows_stand_side_by_side(locks, plain):
    """Figures and ledger are those of the files."""
    found = lock_changes(*locks)
    for one in found.figures:
        assert (one.old, one.new) == tuple(data["answer"][one.name] for data in plain)
    rows = [{stage["stage"]: stage["rows"] for stage in data["ledger"]} for data in plain]
    assert {one.stage: (one.old, one.new) for one in found.ledger} == {
        stage: (rows[0].get(stage), rows[1].get(stage))
        for stage in dict.fromkeys([*rows[0], *rows[1]])
        if rows[0].get(stage) != rows[1].get(stage)
    }
    assert not found.data.same
    assert found.data.comparable


def test_the_first_ruling_that_goes_another_way_is_named(locks, plain):
    """All before it say the same of the same subjects in the same order."""
    found = lock_changes(*locks)
    said = [[(one["step"], one["subject"], one["verdict"]) for one in data["rulings"]] for data in plain]
    shared = next(place for place, pair in enumerate(zip(*said, strict=False)) if pair[0] != pair[1])
    assert found.parting is not None
    assert found.parting.old == locks[0].rulings[shared]
    assert found.parting.new == locks[1].rulings[shared]


def test_each_ruling_stands_on_one_side_or_in_a_pair(locks):
    """None is lost and none is counted twice; a pair is of one step and subject with two verdicts."""
    found = lock_changes(*locks)
    for pair in found.flipped:
        assert (pair.old.step, pair.old.subject) == (pair.new.step, pair.new.subject)
        assert pair.old.verdict != pair.new.verdict
    both = len(locks[0].rulings) - len(found.only_old)
    assert both == len(locks[1].rulings) - len(found.only_new)
    subjects = {(one.step, one.subject) for one in locks[0].rulings}
    assert {(one.step, one.subject) for one in found.only_old} <= subjects


def test_a_verdict_under_another_clause_is_still_a_flip(locks):
    """A keep rule decides where selection did: the same subject, another verdict."""
    rulings = list(locks[0].rulings)
    place = next(n for n, one in enumerate(rulings) if one.verdict == "remove")
    kept = {"verdict": "keep", "clause": "keep[0]", "ground": "kept", "says": "kept."}
    rulings[place] = rulings[place].model_copy(update=kept)
    found = lock_changes(locks[0], changed(locks[0], rulings=tuple(rulings)))
    assert [(pair.old.id, pair.new.clause) for pair in found.flipped] == [(rulings[place].id, "keep[0]")]
    assert found.parting == found.flipped[0]
    assert found.sections == ("rulings",)


def test_a_run_that_ends_earlier_parts_at_its_end(locks):
    """The longer run has a ruling where the shorter has none."""
    short = changed(locks[0], rulings=locks[0].rulings[:-1])
    found = lock_changes(locks[0], short)
    assert found.parting is not None
    assert (found.parting.old, found.parting.new) == (locks[0].rulings[-1], None)
    assert lock_changes(short, locks[0]).parting.new == locks[0].rulings[-1]


def test_numbers_of_another_kind_are_not_held_against_each_other(locks):
    """Another outcome, scale, form of a predictor or baseline: no shift, and the reason."""
    old = locks[0]
    answer = old.answer

    def reasons(**given: Any) -> set[str | None]:
        return {pair.why for pair in lock_changes(old, changed(old, **given)).coefficients}

    outcome = answer.outcome.model_copy(update={"transform": "log"})
    assert reasons(answer=answer.model_copy(update={"outcome": outcome})) == {"another scale of the outcome"}
    outcome = answer.outcome.model_copy(update={"column": "hours"})
    assert reasons(answer=answer.model_copy(update={"outcome": outcome})) == {"another outcome"}
    terms = tuple(
        term.model_copy(update={"transform": "square"}) if term.term == "bike_age" else term
        for term in answer.terms
    )
    assert reasons(answer=answer.model_copy(update={"terms": terms})) == {
        None,
        "another form of the predictor",
    }
    exact = tuple(term.model_copy(update={"standard_error": 0.0}) for term in answer.terms)
    other = changed(old, answer=answer.model_copy(update={"terms": exact}))
    assert {pair.why for pair in lock_changes(other, old).coefficients} == {"no standard error"}
    written = dict(old.plan.written)
    written["predictors"] = tuple(
        {**one, "baseline": "yes"} if one["column"] == "electric" else one for one in written["predictors"]
    )
    plan = old.plan.model_copy(update={"written": written, "whole": "sha256:" + "0" * 64})
    found = lock_changes(old, changed(old, plan=plan))
    assert {pair.term: pair.why for pair in found.coefficients}["electric = yes"] == "another baseline"
    assert [one.clause for one in found.changes] == ["predictors[electric].baseline"]


def test_rows_come_and_go_by_their_labels(locks):
    """A row removed in one run only stands on its side."""
    from beforehand.lock import RowRemoved

    def removing(*rows: str) -> Lock:
        gone = tuple(RowRemoved(row=row, step="influence", ruling="R006") for row in rows)
        return changed(locks[0], rows_removed=gone)

    found = lock_changes(removing("a", "b"), removing("b", "c"))
    assert (found.rows_came, found.rows_went) == (("a",), ("c",))
    unlabelled = locks[0].data.model_copy(update={"labelled": False, "fingerprint": "sha256:" + "1" * 64})
    assert not lock_changes(locks[0], changed(locks[0], data=unlabelled)).data.comparable


def test_any_difference_at_all_shows(locks):
    """Whatever ``differences`` finds in a record, some section is said to differ, and the other way round."""
    found = lock_changes(*locks)
    places = {one.place.partition(".")[0].partition("[")[0] for one in differences(*locks)}
    assert places - {"plan"} <= set(found.sections)
    first = locks[0].fits[0]
    fits = (first.model_copy(update={"r_squared": 0.125}), *locks[0].fits[1:])
    assert lock_changes(locks[0], changed(locks[0], fits=fits)).sections == ("fits",)


def test_the_end_of_a_run_that_has_no_answer(locks):
    """A run that stopped has no table; the other side's is shown alone."""
    stopped = changed(locks[0], status="stopped", answer=None)
    found = lock_changes(locks[0], stopped)
    assert (found.old_status, found.new_status) == ("adopted", "stopped")
    assert {pair.why for pair in found.coefficients} == {"gone"}
    assert {one.new for one in found.figures} == {None}
    assert lock_changes(stopped, stopped).figures == ()


def with_fits(lock: Lock, count: int, moved: float) -> Lock:
    """The lock with so many fits and rulings."""
    first, ruling = lock.fits[0], lock.rulings[0]
    fits = tuple(
        first.model_copy(update={"id": f"F{number:04d}", "r_squared": round(number / count / 2 + moved, 6)})
        for number in range(1, count + 1)
    )
    rulings = tuple(
        RulingRecord(**{**dict(ruling), "id": f"R{number:04d}", "subject": f"x{number}", "fits": ()})
        for number in range(1, count // 5)
    )
    return changed(lock, fits=fits, rulings=rulings)


def test_locks_of_5000_fits_cost_their_reading(locks):
    """Comparing is a small part of reading; a wide allowance, since clocks are shared."""
    texts = [lock_text(with_fits(locks[0], 5000, moved)) for moved in (0.0, 0.001)]
    started = time.process_time()
    old, new = (lock_from_text(text, "large") for text in texts)
    read = time.process_time()
    found = lock_changes(old, new)
    compared = time.process_time()
    assert found.sections == ("fits",)
    assert compared - read <= read - started


def test_comparing_loads_no_heavy_library():
    """Neither pandas nor statsmodels nor scipy.stats is needed to compare two locks."""
    code = (
        "import sys; from beforehand.api import compare\n"
        "from beforehand.comparing.forms import mapping, markdown\n"
        f"found = compare({str(FILES[0])!r}, {str(FILES[1])!r}); markdown(found); mapping(found)\n"
        "from beforehand.screen.comparison import comparison_text; comparison_text(found)\n"
        "print([name for name in ('pandas', 'statsmodels', 'scipy.stats') if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
