from __future__ import annotations

import copy
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from rich.cells import cell_len

from beforehand.lock import Lock
from beforehand.screen.answer import answer_text

HERE = Path(__file__).parent
RECORD = "plans/hives.lock.yaml"
LockOf = Callable[[dict[str, Any]], Lock]


def section(text: str, title: str) -> list[str]:
    """Lines beneath a heading that starts so, without their indent."""
    blocks = [block.split("\n") for block in text.split("\n\n")]
    return next(([line.strip() for line in lines[1:]] for lines in blocks if lines[0].startswith(title)), [])


@pytest.mark.parametrize("width", [100, 60])
def test_the_answer_of_the_hives_is_this_text(width: int, hives: dict[str, Any], lock_of: LockOf) -> None:
    """The whole screen, wide and narrow, as it was looked at and found right."""
    expected = (HERE / f"hives.answer.{width}.txt").read_text(encoding="utf-8")
    assert answer_text(lock_of(hives), RECORD, width=width) == expected


def named_widely(data: dict[str, Any]) -> dict[str, Any]:
    """The same lock with wide, long and hostile names."""
    names = {
        "bloom_days": "開花日数（谷の北側）",
        "altitude": "höhe_über_dem_meeresspiegel_gemessen_am_stand_der_beuten_im_frühjahr",
        "mites": "varroe\u0301 🐝 count",
        "humidity": "humidity\x1b[31m",
    }

    def renamed(value: Any) -> Any:
        if isinstance(value, str):
            for old, new in names.items():
                value = value.replace(old, new)
            return value
        if isinstance(value, list):
            return [renamed(item) for item in value]
        if isinstance(value, dict):
            return {renamed(key): renamed(item) for key, item in value.items()}
        return value

    changed: dict[str, Any] = renamed(data)
    return changed


def forty(data: dict[str, Any]) -> dict[str, Any]:
    """The same lock with forty predictors whose coefficients differ by powers of ten."""
    answer = data["answer"]
    bloom, whole = answer["terms"][1], answer["predictors"][0]
    for place in range(40):
        name, scale = f"reading_{place:02d}", 10.0 ** (place % 9 - 4)
        numbers = {key: bloom[key] * scale for key in ("coefficient", "standard_error", "low", "high")}
        answer["terms"].append(bloom | numbers | {"term": name, "predictor": name, "unit": None})
        answer["predictors"].append(whole | {"predictor": name, "alone": None})
        data["predictors"][name] = data["predictors"]["bloom_days"]
        data["predictors"][f"other_{place:02d}"] = data["predictors"]["rain"]
    return data


@pytest.mark.parametrize("width", [60, 72, 80, 100, 120, 140])
@pytest.mark.parametrize("change", [copy.deepcopy, named_widely, forty])
def test_no_line_passes_the_edge(
    width: int, change: Callable[[dict[str, Any]], dict[str, Any]], hives: dict[str, Any], lock_of: LockOf
) -> None:
    """Whatever the names, a terminal never has to wrap a line; commands to copy are the exception."""
    lines = answer_text(lock_of(change(hives)), RECORD, width=width).split("\n")
    wide = [line for line in lines if cell_len(line) > width and not line.startswith("  beforehand ")]
    assert wide == []


def test_no_name_steers_the_terminal(hives: dict[str, Any], lock_of: LockOf) -> None:
    """An escape sequence in a column name is shown, not obeyed."""
    text = answer_text(lock_of(named_widely(hives)), RECORD)
    assert "\x1b" not in text
    assert "humidity\\x1b[31m" in text


def test_colour_adds_nothing_but_colour(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Without its escape sequences the coloured text is the plain one."""
    lock = lock_of(hives)
    coloured = answer_text(lock, RECORD, colour=True)
    assert coloured != answer_text(lock, RECORD)
    assert re.sub(r"\x1b\[[0-9;]*m", "", coloured) == answer_text(lock, RECORD)


def test_a_mean_is_written_up_as_an_answer(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Mean only: the mean with unit, interval and spread; no table, no finding about predictors."""
    answer = hives["answer"]
    hives["status"] = "mean_only"
    answer["terms"], answer["predictors"] = answer["terms"][:1], []
    answer["mean"] = {"mean": 21.40311742, "low": 20.33011744, "high": 22.4761174, "sd": 7.811044213}
    for fate in hives["predictors"].values():
        fate.update(verdict="removed", ruling="R010")
    hives["rulings"][9].update(
        ground="weak_without_theory", says="No theory backs a predictor, so the mean is the answer."
    )
    hives["alternatives"] = {}
    text = answer_text(lock_of(hives), RECORD)
    assert text.split("\n")[2:5] == [
        "Mean only: no predictor stands",
        "  The mean of honey is the answer: 21.40 kg per season (95 % interval 20.33 to 22.48); the rows",
        "  spread about it by 7.81 kg per season (standard deviation).",
    ]
    assert section(text, "What was removed")[:2] == [
        "R010  No theory backs a predictor, so the mean is the answer. Out by it: bloom_days, altitude,",
        "rain, humidity, colony_age, mites and strain.",
    ]
    assert section(text, "Coefficients") == section(text, "Key finding") == []


def test_an_inconclusive_run_claims_nothing(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Inconclusive: the model is shown as not adopted, with near misses and the rows they need."""
    answer = hives["answer"]
    hives["status"] = "inconclusive"
    answer["f_p"] = 0.2130417744
    answer["near_misses"] = [
        {"predictor": "altitude", "p": 0.1046018823, "partial_f2": 0.0133, "rows_needed": 1612},
        {"predictor": "rain", "p": 0.19, "partial_f2": 1e-9, "rows_needed": None},
    ]
    text = answer_text(lock_of(hives), RECORD)
    assert text.split("\n")[2:5] == [
        "Inconclusive: the model as a whole is not significant",
        "  Its p 0.213 is above 0.05. Rules keep predictors in it, so it is reported and not adopted: these",
        "  rows neither show nor exclude what the plan asks about.",
    ]
    assert "The model that is reported, not adopted, in kg per season per unit of each predictor\n" in text
    assert section(text, "Look twice")[1:3] == [
        "Near miss             altitude: p 0.105; its effect would need 1,612 rows to show, here are 207.",
        "Near miss             rain: p 0.190; no sample of a practical size would show an effect so small.",
    ]
    assert section(text, "Key finding") == []


def test_a_stopped_run_names_the_ruling_and_gives_no_answer(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Stopped before any fit: the ruling, the rows so far, the record; nothing that looks like a result."""
    says = "The run stops: mites is kept by rule, 52 % of it is missing, and the plan has no fill for it."
    hives.update(status="stopped", answer=None, fits=[], alternatives={}, rows_removed=[])
    hives["rulings"] = [
        hives["rulings"][0],
        hives["rulings"][1] | {"ground": "kept_without_fill", "says": says},
    ]
    hives["ledger"] = hives["ledger"][:3]
    for fate in hives["predictors"].values():
        fate.update(verdict="in_model", ruling=None, says="The run stopped.")
    assert answer_text(lock_of(hives), RECORD) == (
        "Honey yield of hives along a valley (invented)\n"
        "  Which conditions of a site go with the honey of a season, and by how much?\n"
        "Stopped: there is no answer\n"
        "  R002: The run stops: mites is kept by rule, 52 % of it is missing, and the plan has no fill for\n"
        "  it.\n"
        "\n"
        "Rows\n"
        "  Rows used: 212 of 220 read; 6 not eligible (a colony without a queen gathers nothing), 2 without\n"
        "  an outcome.\n"
        "\n"
        "The record\n"
        "  plans/hives.lock.yaml holds 0 fits and 2 rulings. The plan is not sealed, so the record cannot\n"
        "  show that it came first.\n"
        "  beforehand trace plans/hives.lock.yaml bloom_days\n"
        "  beforehand replay plans/hives.lock.yaml\n"
    )


def test_contradictions_and_knife_edges_are_shown(hives: dict[str, Any], lock_of: LockOf) -> None:
    """A sign against the plan's expectation and a ruling on a knife edge stand under Look twice."""
    hives["answer"]["knife_edges"] = ["R011"]
    hives["answer"]["sign_contradictions"] = [
        {
            "predictor": "altitude",
            "expected": "positive",
            "coefficient": -0.003120417713,
            "p": 0.1046018823,
            "because": "Thyme grows higher up.",
        }
    ]
    assert section(answer_text(lock_of(hives), RECORD), "Look twice") == [
        "Against expectation   altitude should be positive and is -0.00312 (p 0.105). The plan expects it",
        "because: Thyme grows higher up.",
        "Turns its sign        altitude: 0.00601 alone (p 0.012), -0.00312 beside the others.",
        "Knife edge            R011: rain leaves: p 0.413 is above 0.0500.",
        "Nearest to flipping   R008, 31.0 % of its limit away.",
    ]


def test_that_nothing_was_removed_is_said(hives: dict[str, Any], lock_of: LockOf) -> None:
    """An empty list would leave a reader in doubt."""
    hives["rows_removed"] = []
    for name in ("rain", "humidity"):
        del hives["predictors"][name]
    assert section(answer_text(lock_of(hives), RECORD), "What was removed") == ["Nothing was removed."]


def test_every_caution_is_shown_whatever_the_status(hives: dict[str, Any], lock_of: LockOf) -> None:
    """No caution is left out for want of room."""
    hives["answer"]["cautions"] = [f"Caution number {place}." for place in range(12)]
    assert section(answer_text(lock_of(hives), RECORD), "Cautions") == [
        f"- Caution number {place}." for place in range(12)
    ]


@pytest.mark.parametrize(
    ("state", "changes", "sentence"),
    [
        ("sealed", [], "The plan was sealed before this run."),
        (
            "amended",
            [{"clause": "alpha", "class": "looser", "says": "alpha 0.05, was 0.01."}],
            "The plan was amended after its seal: alpha 0.05, was 0.01.",
        ),
        ("deviates", [], "The plan deviates from its seal."),
    ],
)
def test_the_record_says_whether_the_plan_came_first(
    state: str, changes: list[dict[str, str]], sentence: str, hives: dict[str, Any], lock_of: LockOf
) -> None:
    """The state of the seal stands beside the name of the record."""
    hives["seal"] = {"state": state, "changes": changes}
    text = " ".join(section(answer_text(lock_of(hives), "a.lock.yaml"), "The record"))
    assert text.startswith(f"a.lock.yaml holds 10 fits and 14 rulings. {sentence}")


def test_commands_can_be_copied(hives: dict[str, Any], lock_of: LockOf) -> None:
    """Names with spaces are quoted for a shell."""
    text = answer_text(lock_of(hives), "my plans/hives.lock.yaml", width=60)
    assert text.endswith(
        "  beforehand trace 'my plans/hives.lock.yaml' rain\n  beforehand replay 'my plans/hives.lock.yaml'\n"
    )
