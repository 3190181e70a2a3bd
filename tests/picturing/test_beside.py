"""Pictures of a rehearsal and of a refresh show the numbers of their records."""

from __future__ import annotations

import pytest

from beforehand import plan_from_mapping, rehearse
from beforehand.picturing import drawn, figure_of, pictures_of
from beforehand.picturing.moved import moved
from beforehand.picturing.rehearsed import inclusion, models

PLAN = {
    "language": 1, "title": "Invented", "question": "What drives it?", "data": {"file": "invented.csv"},
    "outcome": {"column": "use"},
    "predictors": [{"column": "heat"}, {"column": "load"}, {"column": "idle"}],
}  # fmt: skip

COEFFICIENT = {
    "term": "heat", "old": 1.0, "new": 1.3, "shift_in_old_se": 3.0, "from_new_rows": 0.4,
    "from_gone_rows": -0.2, "from_revised_rows": 0.0, "from_other_form": 0.1,
}  # fmt: skip
NEW = {
    "term": "load", "old": None, "new": 2.0, "shift_in_old_se": None, "from_new_rows": None,
    "from_gone_rows": None, "from_revised_rows": None, "from_other_form": None,
}  # fmt: skip
REFRESH = {
    "verdict": "moved",
    "rows": {"new": ["a", "b"], "gone": [], "revised": ["c"], "same": ["d"], "matched_by": "label"},
    "coefficients": [COEFFICIENT, NEW],
}


def marked(picture, name):
    """Points of every line of a name."""
    return [
        (list(map(float, line.get_xdata())), list(map(float, line.get_ydata())))
        for axes in figure_of(picture).axes
        for line in axes.lines
        if line.get_gid() == name
    ]


@pytest.fixture(scope="module")
def rehearsal(table):
    """A small rehearsal of two worlds."""
    scenarios = ("noise", "resample")
    return rehearse(plan_from_mapping(PLAN), table, scenarios=scenarios, replicates=20, seed=1).record


def test_inclusion_is_that_of_the_rehearsal(rehearsal, lock):
    """Dots on halves of the rows, diamonds where nothing has an effect."""
    picture = inclusion(rehearsal, lock)
    halves = rehearsal.scenarios.resample.half_samples.inclusion
    assert [x[0] for x, _ in marked(picture, "halves")] == [one.value for one in halves.values()]
    noise = rehearsal.scenarios.noise.adopted
    assert [x[0] for x, _ in marked(picture, "noise")] == [one.value for one in noise.values()]


def test_models_are_those_of_the_rehearsal(rehearsal, lock):
    """Bars as long as the shares; told by their difference from the real answer."""
    picture = models(rehearsal, lock)
    bars = [p for axes in figure_of(picture).axes for p in axes.patches if p.get_gid() == "model"]
    shares = [one.share.value for one in rehearsal.scenarios.resample.half_samples.models[:10]]
    assert [bar.get_width() for bar in bars] == shares
    assert "− kind" in picture.alt
    assert "heat, load" in models(rehearsal).alt


def test_a_world_that_was_not_rehearsed_has_no_picture(rehearsal, lock):
    """No halves, no models; neither world, no inclusion."""
    left = rehearsal.scenarios.model_copy(update={"resample": None})
    without = rehearsal.model_copy(update={"scenarios": left})
    assert models(without, lock) is None
    assert inclusion(without, lock) is not None
    none = without.model_copy(update={"scenarios": left.model_copy(update={"noise": None})})
    assert inclusion(none, lock) is None
    assert "models" not in pictures_of(lock, rehearsal=without)
    assert "inclusion" not in pictures_of(lock)


def test_what_moved_is_divided_as_in_the_record():
    """The dot at the shift; bars that add up to it, in old standard errors (here 0.1)."""
    picture = moved(REFRESH, limit=2.0)
    assert marked(picture, "shift") == [([3.0], [0.0])]
    bars = [p for axes in figure_of(picture).axes for p in axes.patches if p.get_gid() == "part"]
    assert sorted(bar.get_width() for bar in bars) == pytest.approx([1.0, 2.0, 4.0])
    assert "Only in the new answer: load." in picture.alt
    assert "Rows: 2 new, 0 gone, 1 revised, 1 unchanged." in picture.alt
    assert len(marked(picture, "limit")) == 2


def test_a_refresh_without_coefficients_has_no_picture():
    """A table that no longer keeps the contract gives none."""
    assert moved({"verdict": "broken", "rows": None, "coefficients": []}) is None


def test_they_are_drawn_the_same_twice(rehearsal, lock):
    """As those of a lock."""
    for name in ("inclusion", "models", "moved"):
        one, other = (pictures_of(lock, rehearsal=rehearsal, refresh=REFRESH)[name] for _ in range(2))
        assert drawn(one) == drawn(other)
        assert drawn(one, "png") == drawn(other, "png")
