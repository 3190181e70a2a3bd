"""The record of a rehearsal: its file, its schema, and what is said of a file that is none."""

from __future__ import annotations

import re
from pathlib import Path

import jsonschema
import pytest
import yaml
from ruamel.yaml import YAML

from beforehand.faults import LockError
from beforehand.lock.writing import digest_of
from beforehand.rehearsing.models import RehearsalRecord, Scenarios
from beforehand.rehearsing.reading import read_rehearsal, rehearsal_from_bytes
from beforehand.rehearsing.text import (
    rehearsal_record_text,
    rehearsal_schema,
    rehearsal_schema_text,
    with_digest,
    write_rehearsal,
)

FILE = Path(__file__).parents[2] / "schemas" / "rehearsal.schema.json"


def test_a_record_comes_back_from_its_file(record: RehearsalRecord, tmp_path: Path) -> None:
    """What was written is read, equal, and written again it has the same bytes."""
    path = tmp_path / "greenhouse.rehearsal.yaml"
    write_rehearsal(record, path)
    back = read_rehearsal(path)
    assert back == record
    before = path.read_bytes()
    write_rehearsal(back, path)
    assert path.read_bytes() == before


def test_the_order_of_the_file_is_fixed(record: RehearsalRecord) -> None:
    """Version first, digest last, the false finds first among the expected."""
    content = yaml.safe_load(rehearsal_record_text(record))
    assert list(content) == [
        "rehearsal", "plan", "data", "lock", "seed", "replicates", "scenarios", "left_out", "environment",
        "digest",
    ]  # fmt: skip
    assert list(content["scenarios"]) == ["scrambled", "noise", "expected", "resample", "hold_out"]
    assert next(iter(content["scenarios"]["expected"])) == "any_without_effect_adopted"


def test_every_estimate_is_a_value_and_its_error_on_one_line(record: RehearsalRecord) -> None:
    """No estimate is broken over lines or has another key."""
    text = rehearsal_record_text(record)
    assert text.count("value:") == text.count("mc_error:") - text.count("percentile_mc_error:") - text.count(
        "bias_corrected_mc_error:"
    )
    assert len(re.findall(r"\{value: [-\d.e+]+, mc_error: (?:[\d.e+-]+|null)\}", text)) == text.count(
        "value:"
    )


def test_other_readers_read_the_same(record: RehearsalRecord) -> None:
    """YAML 1.1 and 1.2 give the same numbers and names."""
    text = rehearsal_record_text(record)
    assert YAML(typ="safe").load(text) == yaml.safe_load(text)


def test_what_was_not_rehearsed_is_left_out_or_said(record: RehearsalRecord) -> None:
    """No scenario stands empty; sentences have a line each."""
    few = record.model_copy(
        update={
            "data": None,
            "lock": None,
            "scenarios": Scenarios(),
            "not_rehearsed": ("noise was not rehearsed: there is no table.", "hold_out was not: no table."),
        }
    )
    text = rehearsal_record_text(few)
    content = yaml.safe_load(text)
    assert content["left_out"] == list(few.not_rehearsed)
    assert (content["data"], content["lock"]) == (None, None)
    assert '\n  - "noise was not rehearsed: there is no table."\n' in text


def test_a_record_without_scenarios_is_still_one(record: RehearsalRecord) -> None:
    """A rehearsal that was interrupted at once can be read again."""
    few = with_digest(record.model_copy(update={"scenarios": Scenarios()}))
    assert rehearsal_from_bytes(rehearsal_record_text(few).encode(), "x.rehearsal.yaml") == few


def said_of(text: str) -> str:
    """What is said when it is read."""
    with pytest.raises(LockError) as raised:
        rehearsal_from_bytes(text.encode(), "x.rehearsal.yaml")
    assert len(raised.value.faults) == 1
    return str(raised.value)


def resealed(text: str) -> str:
    """A changed text with a digest that fits."""
    covered, rest = text.split("environment:\n")
    return f'{covered}environment:\n{rest.split("digest:")[0]}digest: "{digest_of(covered.encode())}"\n'


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("value: 0.97,", "value: 0.05,", "it was changed after it was written: its digest does not fit"),
        (
            "rehearsal: 1\n",
            "rehearsal: 2\n",
            "it is of version 2 of the rehearsal, this program reads 1: a newer program wrote it",
        ),
        (
            "rehearsal: 1\n",
            "lock: 1\n",
            "it is no rehearsal: it does not begin with 'rehearsal: 1'",
        ),
        ('\ndigest: "', "\nthe end: ", "it is cut short: its last line should be its digest"),
        (
            "seed: 20261201",
            "<<<<<<< ours\nseed: 1\n=======\nseed: 2\n>>>>>>> theirs",
            "it holds an unfinished merge; take one side or rehearse the plan again",
        ),
        (
            "\n",
            "\r\n",
            "its line ends were changed to CRLF; store it as it was written, with LF",
        ),
    ],
)
def test_a_file_that_is_not_as_written_is_refused(
    record: RehearsalRecord, old: str, new: str, said: str
) -> None:
    """One line says what is wrong."""
    text = rehearsal_record_text(record)
    assert old in text
    assert said_of(text.replace(old, new)) == f"x.rehearsal.yaml: {said}"


def test_a_change_with_a_digest_that_fits_is_still_judged(record: RehearsalRecord) -> None:
    """Unknown keys, numbers in another layout and values of another kind are found behind a good digest."""
    text = rehearsal_record_text(record)
    assert said_of(resealed(text.replace("\nseed: 2", "\nseed:  2"))).startswith("x.rehearsal.yaml:")
    assert said_of(resealed(text.replace("replicates: 400", "replicates: many"))) == (
        "x.rehearsal.yaml: replicates: Input should be a valid integer"
    )
    assert "more: Extra inputs" in said_of(resealed(text.replace("\nseed: 2", "\nmore: 1\nseed: 2")))


def test_a_path_to_nothing_is_refused(tmp_path: Path) -> None:
    """No file, and a folder."""
    for path, said in (
        (tmp_path / "no", "there is no such file"),
        (tmp_path, "it is a folder, not a rehearsal"),
    ):
        with pytest.raises(LockError) as raised:
            read_rehearsal(path)
        assert str(raised.value) == f"{path}: {said}"
        assert raised.value.faults[0].code == "rehearsal.no_file"


def test_the_digest_does_not_cover_the_environment(record: RehearsalRecord) -> None:
    """Another version of a library leaves it alone; another figure does not."""
    other = record.environment.model_copy(update={"numpy": "9.9.9"})
    assert with_digest(record.model_copy(update={"environment": other})).digest == record.digest
    assert with_digest(record.model_copy(update={"seed": 1})).digest != record.digest


def test_the_schema_on_file_is_the_one_of_the_models() -> None:
    """schemas/rehearsal.schema.json is generated; rehearsal_schema_text() makes it true again."""
    assert FILE.read_text(encoding="utf-8") == rehearsal_schema_text()


def test_the_schema_takes_a_record_and_refuses_what_is_none(record: RehearsalRecord) -> None:
    """A record on file fits as YAML reads it; without its digest, or with more keys, it does not."""
    schema = rehearsal_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    judge = jsonschema.Draft202012Validator(schema)
    content = yaml.safe_load(rehearsal_record_text(record))
    assert [error.message for error in judge.iter_errors(content)] == []
    for field, value in (("digest", ""), ("rehearsal", 2), ("more", 1), ("scenarios", {"noise": {}})):
        assert not judge.is_valid({**content, field: value})
    assert not judge.is_valid({key: value for key, value in content.items() if key != "left_out"})
