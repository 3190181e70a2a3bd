"""The layout of a lock: what stands on a line of its own, and what does not."""

from __future__ import annotations

import hashlib
import time
from pathlib import Path
from typing import Any

import pytest
import yaml

from beforehand.faults import WriteError
from beforehand.lock import FitRecord, FitTerm, Lock, lock_from_text, lock_text, sealed_lock, write_lock


def changed(lock: Lock, **fields: Any) -> Lock:
    """Give the lock with other fields, checked like any other."""
    return Lock(**{**{name: getattr(lock, name) for name in Lock.model_fields}, **fields})


def test_a_lock_begins_with_its_version_and_plan(lock: Lock) -> None:
    """The head of the file, line by line."""
    digest = "sha256:" + "0123456789abcdef" * 4
    assert lock_text(lock).split("\nstatus:")[0].split("\n") == [
        "# Written by beforehand. "
        "Do not edit: the digest at the end covers every line above the environment.",
        "lock: 1",
        "plan:",
        "  file: cold-rooms.plan.yaml",
        "  title: Cold rooms",
        '  question: "Which conditions go with electricity use, and by how much?"',
        f'  decisions: "{digest}"',
        f'  whole: "{digest}"',
        "  written:",
        "    language: 1",
        "    title: Cold rooms",
        "    outcome: {column: kwh, unit: kWh per day}",
        "    predictors:",
        "      - {column: outdoor_temp}",
        "      - {column: load}",
        "      - {column: pallets}",
        "      - {column: r0147}",
        "    products: [[outdoor_temp, load]]",
        "    keep:",
        "      - {at_least_one_of: [load, pallets], because: Product mass must be represented.}",
        "    alpha: 0.05",
        '    influence: {flag_when: {cooks_distance: "4/n", leverage: "3*p/n", studentized_residual: 3.0}}',
        "    steps: []",
        "seal:",
        "  state: unsealed",
        "  changes: []",
        "data:",
        "  file: cold-rooms.csv",
        f'  fingerprint: "{digest}"',
        "  rows: 412",
        "  labelled: true",
        "  labels: shown",
    ]


def test_a_ruling_has_a_line_for_each_field(lock: Lock) -> None:
    """A reviewer sees in a difference which part of a ruling moved; its sentence is one line."""
    text = lock_text(lock)
    assert text[text.index("  - id: R002") : text.index("  - id: R003")].split("\n") == [
        "  - id: R002",
        "    step: collinearity",
        "    clause: collinearity.when_one_significant",
        "    subject: pallets",
        "    fits: [F001, F002]",
        "    checks: []",
        "    evidence: {partner: load, correlation: 0.91, p: 0.412}",
        "    limit: 0.05",
        "    margin: 0.362",
        "    knife_edge: false",
        "    verdict: remove",
        "    ground: weaker_leaves",
        "    because: null",
        '    says: "pallets: weaker_leaves."',
        "",
    ]


def test_a_term_is_one_line(lock: Lock) -> None:
    """A row of a table stands on one line, however long, in the order of the fields."""
    lines = lock_text(lock).split("\n")
    assert (
        "      - {term: load, predictor: load, coefficient: 0.7, standard_error: 0.5, t: 1.4, p: 0.01}"
    ) in lines
    assert "      - {predictor: load, df: 1, statistic: 1.4, p: 0.01}" in lines


def test_the_digest_covers_every_byte_above_the_environment(lock: Lock) -> None:
    """The last line is the SHA-256 of all bytes up to the line of the environment."""
    raw = lock_text(lock).encode()
    covered = raw[: raw.index(b"\nenvironment:") + 1]
    assert raw.split(b"\n")[-2].decode() == f'digest: "sha256:{hashlib.sha256(covered).hexdigest()}"'
    assert raw.endswith(b"\n")


def test_what_a_run_was_made_with_changes_no_covered_byte(lock: Lock) -> None:
    """Two machines write the same digest."""
    other = changed(lock, environment=lock.environment.model_copy(update={"numpy": "9.9"}))
    assert lock_text(other) != lock_text(lock)
    assert sealed_lock(other).digest == sealed_lock(lock).digest


def test_order_of_fields_in_the_file_is_that_of_the_models(lock: Lock) -> None:
    """A reader of YAML meets the fields of each record in their declared order."""
    found = yaml.safe_load(lock_text(lock))
    assert list(found) == [name for name in Lock.model_fields if name not in Lock.left_out]
    assert list(found["fits"][0]) == list(FitRecord.model_fields)
    written = [name for name in FitTerm.model_fields if name not in FitTerm.left_out]
    assert list(found["fits"][0]["terms"][0]) == written


def test_the_plans_own_numbers_keep_all_their_digits(lock: Lock) -> None:
    """A run from the lock's plan has the same numbers as a run from the file."""
    written = {"range": [0.12345678901234567, 1e-7], "seed": 20261201, "share": 0.1}
    other = changed(lock, plan=lock.plan.model_copy(update={"written": written}))
    assert yaml.safe_load(lock_text(other))["plan"]["written"] == written


def test_long_parts_of_the_plan_stand_in_blocks(lock: Lock) -> None:
    """What does not fit on a line has a line for each entry; texts never wrap."""
    reason = "long " * 30
    written = {
        "no": {"a": reason, "b": [reason, {"c": [[1, 2], reason], "d": {}}]},
        "e": [{"f": reason, "g": 1}, [reason]],
    }
    other = changed(lock, plan=type(lock.plan)(**{**vars(lock.plan), "written": written}))
    text = lock_text(other)
    quoted = f'"{reason}"'
    assert text[text.index("  written:") : text.index("\nseal:")].split("\n") == [
        "  written:",
        '    "no":',
        f"      a: {quoted}",
        "      b:",
        f"        - {quoted}",
        "        - c:",
        "            - [1, 2]",
        f"            - {quoted}",
        "          d: {}",
        "    e:",
        f"      - f: {quoted}",
        "        g: 1",
        f"      - [{quoted}]",
    ]
    assert yaml.safe_load(text)["plan"]["written"] == written
    assert lock_text(lock_from_text(text, "x")) == text


def test_a_lock_is_written_through_the_one_way_of_writing_files(lock: Lock, tmp_path: Path) -> None:
    """A lock that cannot be written leaves nothing behind and says why."""
    path = tmp_path / "none" / "x.lock.yaml"
    with pytest.raises(WriteError) as raised:
        write_lock(lock, path)
    assert str(raised.value) == f"{path}: cannot be written: its folder does not exist"


def test_large_locks_are_written_and_read_in_seconds(lock: Lock) -> None:
    """A thousand fits of twenty terms: far above any plan, and far below the time of a general reader."""
    fit = lock.fits[0]
    terms = tuple(
        fit.terms[1].model_copy(update={"term": f"x{place}", "coefficient": place / 7}) for place in range(20)
    )
    fits = tuple(fit.model_copy(update={"id": f"F{number:03d}", "terms": terms}) for number in range(1, 1001))
    large = changed(lock, fits=fits)
    start = time.perf_counter()
    text = lock_text(large)
    written = time.perf_counter()
    back = lock_from_text(text, "x")
    read = time.perf_counter()
    assert len(back.fits) == 1000
    # About 0.1 s and 0.4 s on one core of 2020; the bounds allow for a busy machine.
    assert written - start < 2.0
    assert read - written < 5.0
