"""The story of one predictor or one row."""

from __future__ import annotations

import pytest

from beforehand.faults import LockError
from beforehand.lock import Flag, Lock, lock_from_text, lock_text, trace


def test_a_predictors_story_has_its_rulings_in_order(lock: Lock) -> None:
    """Rulings about it, and those in which it is the partner of another, in the order of the run."""
    story = trace(lock, "pallets")
    assert (story.kind, story.verdict, story.ruling, story.says) == (
        "predictor",
        "removed",
        "R002",
        "pallets: removed.",
    )
    assert [(entry.ruling, entry.role, entry.step) for entry in story.entries] == [
        ("R001", "subject", "missing_data"),
        ("R002", "subject", "collinearity"),
    ]
    entry = story.entries[1]
    assert (entry.limit, entry.margin, entry.evidence["p"]) == (0.05, 0.362, 0.412)
    assert story.groups == (("load", "pallets"),)


def test_a_partner_meets_the_ruling_that_removed_the_other(lock: Lock) -> None:
    """The one of a pair that stays has the pair's ruling in its story, and its own after it."""
    story = trace(lock, "load")
    assert [(entry.ruling, entry.role) for entry in story.entries] == [
        ("R002", "partner"),
        ("R003", "subject"),
        ("R006", "subject"),
    ]
    assert story.products == ("outdoor_temp × load",)
    assert story.entries[1].because == "Product mass."


def test_a_story_shows_the_coefficient_in_every_fit_where_it_stood(lock: Lock) -> None:
    """Coefficient, standard error, t and p, in the order of the run, and no fit without it."""
    story = trace(lock, "load")
    found = [(one.fit, one.rows, one.terms[0].coefficient, one.terms[0].t, one.p) for one in story.fits]
    assert found == [
        ("F001", 397, 1.2, 2.4, 0.01),
        ("F002", 397, 1.3, 2.6, 0.01),
        ("F003", 396, 0.7, 1.4, 0.01),
    ]
    assert [one.fit for one in story.entries[0].fits] == ["F001", "F002"]


def test_fits_of_a_ruling_without_the_predictor_are_left_out(lock: Lock) -> None:
    """In the fit without it a predictor has no coefficient to show."""
    (entry,) = [entry for entry in trace(lock, "pallets").entries if entry.ruling == "R002"]
    assert [one.fit for one in entry.fits] == ["F001"]


def test_a_product_knows_its_parts_and_what_removed_it(lock: Lock) -> None:
    """The ruling that took it away is in its story, although it is about a part."""
    story = trace(lock, "outdoor_temp × load")
    assert story.parts == ("outdoor_temp", "load")
    assert [(entry.ruling, entry.role) for entry in story.entries] == [("R006", "part")]


def test_a_removed_rows_story_has_measures_limits_and_both_fits(lock: Lock) -> None:
    """What flagged it at the sizes of that fit, and the coefficient it moved with and without it."""
    story = trace(lock, "row:r0147")
    assert (story.kind, story.verdict, story.ruling) == ("row", "removed", "R004")
    assert story.measures is not None
    assert story.measures.change_coefficient == 1.25
    assert [(one.fit, one.rows, one.terms[0].coefficient) for one in story.entries[0].fits] == [
        ("F002", 397, 1.3),
        ("F003", 396, 0.7),
    ]
    # Limits with n 397 and p 3, the fit with the row: 4/n and 3*p/n.
    assert story.flags == (
        Flag(measure="cooks_distance", value=0.5, limit=4 / 397, written="4/n", flagged=True),
        Flag(measure="leverage", value=0.02, limit=9 / 397, written="3*p/n", flagged=False),
        Flag(measure="studentized_residual", value=-3.5, limit=3.0, written="3.0", flagged=True),
    )
    assert [(one.alternative, one.verdict) for one in story.alternatives] == [("stricter", "stays")]


def test_a_flagged_row_that_stays_has_the_ruling_on_all_of_them(lock: Lock) -> None:
    """A row's story ends in the ruling by which the flagged rows stay."""
    story = trace(lock, "r0200")
    assert (story.kind, story.verdict, story.ruling) == ("row", "stays", "R005")
    assert story.says == "flagged rows: flagged_rows_stay."


def test_a_predictor_goes_before_a_row_of_the_same_name(lock: Lock) -> None:
    """A bare name is a predictor where there is one; rulings on the row are not in its story."""
    story = trace(lock, "r0147")
    assert (story.kind, story.entries) == ("predictor", ())


def test_the_outcome_has_a_story_of_its_own(lock: Lock) -> None:
    """The scale on which it was fitted."""
    story = trace(lock, "kwh")
    assert (story.kind, story.verdict, story.says) == ("outcome", "identity", "kwh is fitted as it was read.")


def test_alternatives_tell_how_the_same_predictor_ended(lock: Lock) -> None:
    """Each declared alternative has its line."""
    assert [(one.alternative, one.verdict) for one in trace(lock, "load").alternatives] == [
        ("stricter", "removed")
    ]


@pytest.mark.parametrize(
    ("subject", "said"),
    [
        ("laod", "is neither a predictor nor a row that was flagged or removed (nearest: 'load')"),
        ("r0148", "is neither a predictor nor a row that was flagged or removed (nearest: 'r0147')"),
        ("row:load", "is no row that was flagged or removed"),
        ("row:r0201", "is no row that was flagged or removed (nearest: 'r0200')"),
        ("", "is neither a predictor nor a row that was flagged or removed"),
    ],
)
def test_an_unknown_subject_is_told_with_the_nearest_name(lock: Lock, subject: str, said: str) -> None:
    """A slip of the pen costs one look."""
    with pytest.raises(LockError) as raised:
        trace(lock, subject)
    place = f"{subject}: " if subject else ""
    assert str(raised.value) == f"lock of cold-rooms.plan.yaml: {place}{said}"


def test_a_lock_with_hashed_labels_says_so(lock: Lock) -> None:
    """Who asks for a row by its label learns why it is not found."""
    text = lock_text(lock)
    hashed = lock.model_copy(update={"data": lock.data.model_copy(update={"labels": "hashed"})})
    assert lock_text(hashed) != text
    with pytest.raises(LockError) as raised:
        trace(hashed, "reading 9")
    assert str(raised.value) == (
        "lock of cold-rooms.plan.yaml: reading 9: is neither a predictor nor a row that was "
        "flagged or removed; labels of rows stand hashed in this lock"
    )


def test_a_story_is_the_same_from_the_file(lock: Lock) -> None:
    """It is told from the lock alone."""
    back = lock_from_text(lock_text(lock), "x")
    for subject in (*lock.predictors, "row:r0147", "r0200", "kwh"):
        assert trace(back, subject) == trace(lock, subject)
