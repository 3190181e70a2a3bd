"""Files of pictures: the same bytes every time, safe to put into a page, whatever names a table has."""

from __future__ import annotations

import subprocess
import sys
import xml.etree.ElementTree as ET

import matplotlib
import numpy as np
import pandas as pd
import pytest

from beforehand.faults import InputError
from beforehand.lock import write_lock
from beforehand.picturing import drawing, drawn, figure_of, pictures_of

PNG = b"\x89PNG\r\n\x1a\n"

# Markup, formulas of a text setter, a formula of a spreadsheet, right-to-left text, turning marks, line
# breaks, letters that no font here has.
HOSTILE = [
    "<script>alert(1)</script>",
    'a" onload="x',
    "$\\frac{1}{0}$ and $x_1",
    "]]> & {brace} %s",
    "עברית וערבית العربية",
    "turn\u202eed around",
    "測定値 ひらがな",
    "very long name " * 15,
    "tab\tand\u2028break",
]


@pytest.fixture(scope="module")
def hostile(make_lock):
    """A lock whose columns have such names."""
    rng = np.random.default_rng(6)
    table = pd.DataFrame(rng.normal(size=(90, len(HOSTILE))).round(3), columns=HOSTILE)
    table["y $\\bad"] = (table.to_numpy() @ np.arange(1.0, len(HOSTILE) + 1.0) + rng.normal(size=90)).round(3)
    return make_lock(table, outcome="y $\\bad")


@pytest.mark.parametrize("kind", ["svg", "png"])
def test_fresh_processes_give_the_same_bytes(lock, tmp_path, kind):
    """Twice anew, and once here, after other pictures were drawn."""
    path = tmp_path / "a.lock.yaml"
    write_lock(lock, path)
    code = (
        "import hashlib, sys\n"
        "from beforehand import read_lock\n"
        "from beforehand.picturing import drawn, pictures_of\n"
        f"for p in pictures_of(read_lock({str(path)!r})).values():\n"
        f"    print(p.name, hashlib.sha256(drawn(p, {kind!r})).hexdigest())\n"
        "print('pyplot' if 'matplotlib.pyplot' in sys.modules else 'none')\n"
    )
    outs = [
        subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
        for _ in range(2)
    ]
    assert outs[0] == outs[1]
    assert outs[0].endswith("none\n")
    import hashlib

    here = [f"{p.name} {hashlib.sha256(drawn(p, kind)).hexdigest()}" for p in pictures_of(lock).values()]
    assert outs[0].splitlines()[:-1] == here


def test_settings_of_a_person_change_nothing_and_are_left_alone(lock):
    """A matplotlibrc does not reach the pictures."""
    picture = pictures_of(lock)["pull"]
    plain = drawn(picture)
    with matplotlib.rc_context({"font.size": 30.0, "lines.linewidth": 9.0, "axes.facecolor": "red"}):
        assert drawn(picture) == plain
        assert matplotlib.rcParams["font.size"] == 30.0


def test_an_svg_can_stand_in_a_page(lock):
    """It begins with its element, has words, takes the page's colour, and shares no id with another."""
    seen: set[str] = set()
    for picture in pictures_of(lock).values():
        text = drawn(picture).decode()
        assert text.startswith("<svg")
        assert "currentColor" in text
        assert "#1b1f24" not in text
        assert "<!DOCTYPE" not in text
        assert "<metadata" not in text
        assert "background" not in text
        root = ET.fromstring(text)
        assert root.attrib["role"] == "img"
        assert root[0].text == picture.title
        assert root[1].text == picture.alt
        ids = {element.attrib["id"] for element in root.iter() if "id" in element.attrib}
        assert not ids & seen
        seen |= ids
        links = {v.removeprefix("#") for e in root.iter() for k, v in e.attrib.items() if k.endswith("href")}
        assert links <= ids


def test_no_ground_is_painted(lock):
    """The page shows through."""
    root = ET.fromstring(drawn(pictures_of(lock)["spread"]))
    fills = [e.attrib.get("style", "") for e in root.iter()]
    assert not any("fill: #ffffff" in style for style in fills)


def test_a_title_can_be_left_to_the_page(lock):
    """Without it the picture is as tall as its body."""
    picture = pictures_of(lock)["normal"]
    assert figure_of(picture, titled=False).get_size_inches()[1] == pytest.approx(picture.height)
    assert figure_of(picture).get_size_inches()[1] > picture.height
    assert f">{picture.title}</text>" not in drawn(picture, titled=False).decode()


@pytest.mark.parametrize("kind", ["svg", "png"])
def test_hostile_names_are_only_text(hostile, kind):
    """No markup, no formula, no mark that turns text, no warning; every picture is drawn."""
    found = pictures_of(hostile)
    assert {"trail", "coefficients", "straight", "correlations"} <= set(found)
    for picture in found.values():
        made = drawn(picture, kind)
        if kind == "png":
            assert made.startswith(PNG)
            continue
        text = made.decode()
        root = ET.fromstring(text)
        assert not [e for e in root.iter() if e.tag.endswith("script")]
        assert not [k for e in root.iter() for k in e.attrib if k.startswith("on")]
        assert "\u202e" not in text
        assert "\u2028" not in text
    if kind == "svg":
        assert "$\\frac{1}{0}$ and $x_1" in drawn(found["trail"]).decode()
        assert "測定値" in drawn(found["trail"]).decode()


def test_without_matplotlib_one_line_says_what_to_install(lock, monkeypatch):
    """A fault, no traceback; the words of a picture are there all the same."""
    monkeypatch.setattr(drawing, "find_spec", lambda name: None)
    picture = pictures_of(lock)["trail"]
    assert picture.alt
    with pytest.raises(InputError, match=r"pip install 'beforehand\[report\]'") as caught:
        drawn(picture)
    assert len(caught.value.faults) == 1


def test_words_of_pictures_need_no_matplotlib(lock, tmp_path):
    """A report in plain text loads nothing heavy."""
    path = tmp_path / "a.lock.yaml"
    write_lock(lock, path)
    code = (
        "import sys\nfrom beforehand import read_lock\nfrom beforehand.picturing import pictures_of\n"
        f"pictures_of(read_lock({str(path)!r}))\nprint('matplotlib' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
