"""Files that a person might really hand over: read exactly, or refused in a line that names the place."""

from __future__ import annotations

import gzip
from typing import Any

import numpy as np
import pytest

from beforehand import DataError, plan_from_mapping
from beforehand.table import read_table, reading

PLAN: dict[str, Any] = {
    "language": 1,
    "title": "Kettles",
    "question": "Does scale slow a kettle?",
    "data": {"file": "kettles.csv", "row_label": "kettle"},
    "outcome": {"column": "minutes"},
    "predictors": [{"column": "scale"}, {"column": "lid", "kind": "category", "levels": ["on", "off"]}],
}
GOOD = "kettle,minutes,scale,lid\nk1,3.5,0.25,on\nk2,4,1e-1,off\nk3,,2,on\nk4,5.5,NA,off\n"


def table_of(tmp_path, content, **data):
    """Read a file's content under the plan, with its data block changed."""
    path = tmp_path / "kettles.csv"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return read_table(plan_from_mapping({**PLAN, "data": {**PLAN["data"], **data}}), path)


def faults_of(tmp_path, content, **data):
    """The faults of a file: line, place, code and what is said."""
    with pytest.raises(DataError) as caught:
        table_of(tmp_path, content, **data)
    return [(one.line, one.place, one.code, one.what) for one in caught.value.faults]


def test_a_plain_file(tmp_path):
    """Numbers, levels, labels and gaps, in the order of the labels."""
    table = table_of(tmp_path, GOOD)
    assert table.labels.tolist() == ["k1", "k2", "k3", "k4"]
    assert table.columns["scale"].values.tolist()[:3] == [0.25, 0.1, 2.0]
    assert np.isnan(table.columns["scale"].values[3])
    assert np.isnan(table.columns["minutes"].values[2])
    assert table.columns["lid"].values.tolist() == [0, 1, 0, 1]


@pytest.mark.parametrize(
    "content",
    [
        GOOD.replace("\n", "\r\n"),
        "\ufeff" + GOOD,
        GOOD.rstrip("\n"),
        GOOD.replace("k1", '"k1"').replace("on", '"on"'),
        GOOD.replace(",", ", "),
        GOOD.replace("0.25", " 0.250 ").replace("1e-1", "+.1"),
        GOOD + "\n\n",
        gzip.compress(GOOD.encode()),
        "\n".join([GOOD.splitlines()[0], *reversed(GOOD.splitlines()[1:])]),
        "\n".join(
            f"{line.split(',')[3]},no,{','.join(line.split(',')[:3])}" for line in GOOD.splitlines()
        ).replace("lid,no", "lid,unused"),
    ],
    ids=[
        "crlf",
        "bom",
        "no-last-end",
        "quotes",
        "blanks",
        "digits",
        "empty-lines",
        "gzip",
        "rows",
        "columns",
    ],
)
def test_what_must_not_matter(tmp_path, content):
    """Line ends, byte-order mark, quotes, packing, order of rows and columns, an unused column."""
    assert table_of(tmp_path, content).fingerprint == table_of(tmp_path, GOOD).fingerprint


def test_a_declared_separator_decimal_mark_and_encoding(tmp_path):
    """As many a spreadsheet writes it: semicolons, decimal commas, Windows' letters."""
    text = GOOD.replace(",", ";").replace(".", ",").replace("k1", "Kännchen")
    found = table_of(tmp_path, text.encode("cp1252"), separator=";", decimal=",", encoding="cp1252")
    assert found.labels.tolist() == ["Kännchen", "k2", "k3", "k4"] or "Kännchen" in found.labels.tolist()
    assert sorted(found.columns["scale"].values[~np.isnan(found.columns["scale"].values)]) == [0.1, 0.25, 2.0]


@pytest.mark.parametrize(
    ("content", "line", "place", "code", "word"),
    [
        ("", None, "", "empty", "empty"),
        (" \n\n", None, "", "empty", "empty"),
        ("kettle,minutes,scale,lid\n", None, "", "no_rows", "no rows"),
        (b"PK\x03\x04rest", None, "", "not_text", "save the sheet as CSV"),
        (b"\x1f\x8bbroken", None, "", "gzip", "damaged"),
        (GOOD.replace("k2", "\x00"), 3, "", "not_text", "NUL"),
        (GOOD.encode() + b"k5,1,1,\xff\n", 6, "", "encoding", "byte"),
        (GOOD.replace("k2,4,", "k2,4,4,"), 3, "", "ragged", "5 cells and the header 4"),
        (GOOD.replace("k2,4,1e-1,off", "k2,4"), 3, "", "ragged", "2 cells"),
        (GOOD.replace("k2", '"k2'), None, "", "quoting", "cannot be read as cells"),
        (GOOD.replace("kettle,minutes", "kettle,minute"), 1, "minutes", "no_column", "minute"),
        (GOOD.replace("scale", "lid"), 1, "lid", "repeated_column", "twice"),
        (GOOD.replace("k2", "k1"), 3, "kettle", "repeated_label", "line 2"),
        (GOOD.replace("k2", ""), 3, "kettle", "missing_label", "missing"),
        (GOOD.replace("1e-1", "about 1"), 3, "scale", "not_a_number", "'about 1' is not a number (row k2)"),
        (GOOD.replace("1e-1", "0,1"), 3, "", "ragged", "5 cells"),
        (GOOD.replace("1e-1", "inf"), 3, "scale", "not_a_number", "infinite"),
        (GOOD.replace("1e-1", "1e999"), 3, "scale", "not_a_number", "beyond the largest"),
        (GOOD.replace("1e-1", "1_000"), 3, "scale", "not_a_number", "not a number"),
        (GOOD.replace("1e-1", "٣"), 3, "scale", "not_a_number", "not a number"),
        (GOOD.replace("off", "of"), 3, "lid", "unknown_level", "off"),
    ],
)
def test_each_fault_names_its_place(tmp_path, content, line, place, code, word):
    """One fault, its line, its column and what is wrong."""
    found = faults_of(tmp_path, content)
    assert found, content
    first = found[0]
    assert first[1:3] == (place, code)
    assert line is None or first[0] == line
    assert word in first[3]


def test_all_faults_come_at_once(tmp_path):
    """A wrong number, an unknown level and a repeated label in one file are three lines."""
    bad = GOOD.replace("1e-1", "x").replace("k4", "k1").replace("k3,,2,on", "k3,,2,ajar")
    codes = {code for _, _, code, _ in faults_of(tmp_path, bad)}
    assert {"not_a_number", "repeated_label"} <= codes


def test_many_wrong_rows_are_named_in_part(tmp_path):
    """Five rows by name and the number of the rest."""
    rows = "".join(f"k{row},1,?,on\n" for row in range(100, 1100))
    (found,) = faults_of(tmp_path, GOOD + rows)
    assert "k100, k101, k102, k103, k104 and 995 more" in found[3]


def test_no_such_file(tmp_path):
    """A missing file and a folder are told apart."""
    plan = plan_from_mapping(PLAN)
    for path, what in ((tmp_path / "none.csv", "no such file"), (tmp_path, "folder")):
        with pytest.raises(DataError, match=what):
            read_table(plan, path)


ODD = [
    "k1,3.5,0.25,on\n",
    "k2,4,,off\n",
    "k3,nan,2,on\n",
    "k4,5,NaN,off\n",
    "k5,5, 7 ,on\n",
    "k6,6,1.0e+3,off\n",
    "k7,7,.5,on\n",
    "k8,8,5.,on\n",
    "k9,9,-0.0,off\n",
    "ka,10,1e400,on\n",
    "kb,11,0x1A,on\n",
    "kc,12,1 2,on\n",
    "kd,13,TRUE,on\n",
    "ke,14,1\n",
    "kf,15,1,on,9\n",
    "\n",
    'kg,16,"1",on\n',
    'kh,17,1,"o""n"\n',
    "ki,18,1,on \n",
    "kj,19,1,\n",
    "kk,20,#N/A,off\n",
    "kl,21,1e-320,on\n",
    "km,22,0.1234567890123456789,on\n",
    "kn,23,١,on\n",
    "ko,24,1d5,on\n",
    "kp,25,--1,on\n",
    "kq,26,+1,on\n",
    "kr,27,inf,on\n",
    "ks,28,Infinity,on\n",
    "kt,29,1,on\r\n",
    "ku,30,1,o\rn\n",
    "k1,31,1,on\n",
    "kv,32,2,NA\n",
    " kw ,33,2,on\n",
    "kx,34,1e,on\n",
    "ky,35,12345678901234567890,off\n",
    "kz,36,9007199254740993,off\n",
    '"k\nA",37,1,on\n',
]


@pytest.mark.parametrize(
    "head", ["kettle,minutes,scale,lid", "kettle,lid,minutes,scale", "x,kettle,lid,minutes,scale"]
)
@pytest.mark.parametrize("last_end", [True, False])
@pytest.mark.parametrize("odd", [None, *range(len(ODD))])
def test_the_quick_way_reads_as_the_strict_way(tmp_path, monkeypatch, odd, head, last_end):
    """A large file goes through pandas; whatever stands in it, the outcome is that of the strict way."""
    lines = ["k1,3.5,0.25,on\n", "k2x,4,0.75,off\n", "k3x,4.25,2,on\n"]
    if odd is not None:
        lines.insert(1, ODD[odd])
    if head.startswith("kettle,lid"):
        lines = [_turned(line) for line in lines]
    if head.startswith("x,"):
        lines = ["0," + _turned(line) if line != "\n" else line for line in lines]
    content = (head + "\n" + "".join(lines)).encode()
    content = content if last_end else content.rstrip(b"\n")
    outcomes = []
    for smallest in (0, 1 << 30):
        monkeypatch.setattr(reading, "SMALLEST", smallest)
        try:
            table = table_of(tmp_path, content)
            outcomes.append((table.fingerprint, table.labels.tolist(), table.n_rows))
        except DataError as error:
            outcomes.append([str(fault) for fault in error.faults])
    assert outcomes[0] == outcomes[1]


def _turned(line: str) -> str:
    """The same cells in the order label, lid, minutes, scale, where there are four."""
    cells = line.rstrip("\n").split(",")
    if len(cells) != 4:
        return line
    return ",".join([cells[0], cells[3], cells[1], cells[2]]) + "\n"


def test_the_quick_way_is_taken(tmp_path, monkeypatch):
    """The comparison above would be of no use if plain files were handed back."""
    taken = []
    quick = reading.quick_columns
    monkeypatch.setattr(reading, "SMALLEST", 0)
    monkeypatch.setattr(
        reading, "quick_columns", lambda *given: taken.append(quick(*given) is not None) or quick(*given)
    )
    table_of(tmp_path, GOOD)
    table_of(tmp_path, GOOD.replace("k1", '"k1"'))
    assert taken == [True, True]
