"""The report: what stands in it, in which order, and that nothing in a lock can break out of it."""

from __future__ import annotations

import html.parser
import io
import re
import shutil
import zipfile
from collections import Counter
from itertools import pairwise
from pathlib import Path

import pandas as pd
import pytest
from typer.testing import CliRunner

from beforehand import read_lock, run, write_lock
from beforehand.cli.app import app
from beforehand.plan import plan_from_mapping
from beforehand.reporting import words
from beforehand.reporting.context import context_of
from beforehand.reporting.document import Grid
from beforehand.reporting.whole import document_of
from beforehand.reporting.writing import contents_of, report, report_path

PLANS = Path(__file__).parents[2] / "plans"
LOCKS = {path.name.removesuffix(".lock.yaml"): path for path in sorted(PLANS.glob("*/*.lock.yaml"))}
NOTHING: frozenset[str] = frozenset()


def parsed(page: str) -> html.parser.HTMLParser:
    """What a browser would find: tags, their attributes, the text."""

    class Reader(html.parser.HTMLParser):
        def __init__(self) -> None:
            super().__init__()
            self.tags: list[tuple[str, dict[str, str | None]]] = []
            self.text: list[str] = []

        def handle_starttag(self, tag, attrs):
            self.tags.append((tag, dict(attrs)))

        def handle_data(self, data):
            self.text.append(data)

    reader = Reader()
    reader.feed(page)
    return reader


@pytest.fixture(scope="module", params=sorted(LOCKS))
def made(request):
    """Every ready plan's lock in every form."""
    path = LOCKS[request.param]
    return contents_of(context_of(read_lock(path), path), ("html", "docx", "md"))


def test_the_key_finding_stands_first_and_the_record_last(made):
    """For who decides, then for who reviews."""
    page = made["html"].decode()
    heads = re.findall(r'<h[23] id="part-(\w+)-title">', page)
    assert heads[:3] == ["key", "text", "question"]
    assert heads[-2:] == ["record", "references"]
    assert "Association is not causation." in page
    assert "need qualified review and local rules" in page


def test_the_page_needs_nothing_else(made):
    """No script, no style sheet, no picture and no font from elsewhere."""
    page = made["html"].decode()
    assert "<script" not in page
    assert not re.search(r'(src|href)="(?!data:|#)', page)
    assert "@import" not in page
    assert "url(" not in page.split("</style>")[0]
    assert len(made["html"]) < 2_000_000


def test_the_page_is_whole_for_a_screen_reader(made):
    """One first heading, no level left out, a language, captions, scopes, text alternatives, no id twice."""
    reader = parsed(made["html"].decode())
    levels = [int(tag[1]) for tag, _ in reader.tags if re.fullmatch("h[1-6]", tag)]
    assert levels.count(1) == 1
    assert all(after <= before + 2 for before, after in pairwise(levels))
    assert ("html", {"lang": "en"}) in reader.tags
    tables = sum(tag == "table" for tag, _ in reader.tags)
    assert sum(tag == "caption" for tag, _ in reader.tags) == tables
    assert all(attrs.get("scope") in ("row", "col") for tag, attrs in reader.tags if tag == "th")
    assert all(len(attrs.get("alt") or "") > 20 for tag, attrs in reader.tags if tag == "img")
    ids = Counter(attrs["id"] for _, attrs in reader.tags if "id" in attrs)
    assert [one for one, count in ids.items() if count > 1] == []
    targets = {attrs["href"][1:] for tag, attrs in reader.tags if tag == "a" and attrs["href"]}
    assert targets <= set(ids)


def test_every_number_in_brackets_is_a_ruling_fit_or_check_of_the_lock():
    """Nothing is told that does not stand in the record."""
    for path in LOCKS.values():
        lock = read_lock(path)
        known = {one.id for one in (*lock.rulings, *lock.fits, *lock.checks.assumptions)}
        for section in document_of(context_of(lock, path), NOTHING).sections:
            for block in section.blocks:
                for said in getattr(block, "sentences", getattr(block, "items", ())):
                    assert set(said.rests_on) <= known, said


def test_numbers_of_the_final_table_are_those_of_the_lock():
    """Each coefficient, its interval and its p, told with sensible digits."""
    path = LOCKS["jobs"]
    lock = read_lock(path)
    sections = {one.key: one for one in document_of(context_of(lock, path), NOTHING).sections}
    table = next(block for block in sections["answer"].blocks if isinstance(block, Grid))
    cells = {column.head: column.cells for column in table.columns}
    assert lock.answer is not None
    for place, term in enumerate(lock.answer.terms):
        told = float(cells["Coefficient"][place])
        assert told == pytest.approx(term.coefficient, abs=term.standard_error)
        low, high = map(float, cells["95 % interval"][place].split(" to "))
        assert low == pytest.approx(term.low, abs=term.standard_error / 2)
        assert high == pytest.approx(term.high, abs=term.standard_error / 2)


# Where each item of the published guidance is answered: SAMPL (Lang & Altman 2013) for regression, STROBE
# (von Elm et al. 2007) items on regression, the APA's standards for quantitative studies (Appelbaum et al.
# 2018). Items in our own words; several guidances share one.
GUIDANCE = {
    "purpose of the analysis": ("key", "question"),
    "variables with units and summary statistics": ("variables",),
    "missing data by variable and how they were handled": ("checks", "text"),
    "which rows were left out, at each stage, with reasons": ("removed",),
    "confounders and why they were kept": ("question",),
    "how continuous variables were transformed": ("building",),
    "how the model was selected": ("text", "building"),
    "treatment of outliers": ("text", "removed"),
    "collinearity was looked at": ("correlations",),
    "assumptions were checked and what came out": ("checks",),
    "regression equation": ("key",),
    "coefficient, standard error, interval and exact p of each predictor": ("answer",),
    "unadjusted beside adjusted estimates": ("answer",),
    "goodness of fit and variation explained": ("answer", "key"),
    "validation beyond the rows of the fit": ("answer", "honest"),
    "sensitivity analyses": ("alternatives",),
    "level of the tests, several tests": ("text",),
    "primary, secondary and exploratory kept apart; deviations from the plan": ("question",),
    "software": ("record",),
    "cautions on causes": ("key",),
}


def test_every_item_of_the_reporting_guidance_has_its_place(tmp_path):
    """The rich ready plan, rehearsed: each place is a section with something in it."""
    for one in LOCKS["cold-rooms"].parent.iterdir():
        shutil.copy(one, tmp_path / one.name)
    done = CliRunner().invoke(
        app,
        ["rehearse", str(tmp_path / "cold-rooms.plan.yaml"), "--replicates", "100", "--scenario", "resample"],
    )
    assert done.exit_code == 0, done.stderr
    path = tmp_path / "cold-rooms.lock.yaml"
    sections = {one.key: one for one in document_of(context_of(read_lock(path), path), NOTHING).sections}
    for item, places in GUIDANCE.items():
        for place in places:
            assert place in sections, (item, place)
            assert sections[place].blocks, (item, place)
    page = contents_of(context_of(read_lock(path), path), ("html",))["html"].decode()
    for said in ("95 % interval", "Alone", "Standardized", "numpy", "Because", "without its optimism"):
        assert said in page


HOSTILE = '<script>alert("x")</script> | *a* $b$ =1+1'


@pytest.fixture
def hostile(tmp_path) -> Path:
    """A lock in which every word that a person chooses is markup."""
    n = 40
    frame = pd.DataFrame(
        {HOSTILE: [float(at % 7) for at in range(n)], "b": [float(at * at % 11) for at in range(n)]}
    )
    frame["y"] = frame[HOSTILE] * 2 + frame["b"] + [(-1) ** at * 0.5 for at in range(n)]
    plan = plan_from_mapping(
        {
            "language": 1, "title": HOSTILE, "question": HOSTILE, "data": {"file": "t.csv"},
            "outcome": {"column": "y", "unit": HOSTILE},
            "predictors": [{"column": HOSTILE, "unit": "<b>"}, {"column": "b"}],
            "keep": [{"predictor": "b", "rule": "always", "because": HOSTILE}],
        }
    )  # fmt: skip
    path = tmp_path / "hostile.lock.yaml"
    write_lock(run(plan, frame).lock, path)
    return path


def test_no_text_of_a_plan_is_markup(hostile):
    """Not on the page, not in Word's XML, not in Markdown."""
    made = contents_of(context_of(read_lock(hostile), hostile), ("html", "docx", "md"))
    page = made["html"].decode()
    tags = {tag for tag, _ in parsed(page).tags}
    assert "script" not in tags
    assert "b" not in tags
    assert "&lt;script&gt;" in page
    with zipfile.ZipFile(io.BytesIO(made["docx"])) as packed:
        assert b"<script" not in packed.read("word/document.xml")
    text = made["md"].decode()
    assert "<script" not in text.replace("\\<script", "")
    rows = [line for line in text.splitlines() if line.startswith("|")]
    assert all(len(re.findall(r"(?<!\\)\|", line)) >= 3 for line in rows)


def test_the_same_lock_gives_the_same_bytes():
    """In every form, twice."""
    path = LOCKS["jobs"]
    context = context_of(read_lock(path), path)
    forms = ("html", "docx", "md")
    assert contents_of(context, forms) == contents_of(context, forms)


def test_a_word_document_has_real_headings_tables_captions_and_alternatives():
    """What a reader's own navigation and a screen reader need."""
    import docx

    path = LOCKS["cold-rooms"]
    content = contents_of(context_of(read_lock(path), path), ("docx",))["docx"]
    document = docx.Document(io.BytesIO(content))
    styles = Counter(one.style.name for one in document.paragraphs)
    assert styles["Heading 1"] >= 3
    assert styles["Heading 2"] >= 8
    assert styles["Caption"] >= len(document.tables)
    assert len(document.tables) >= 10
    assert document.core_properties.author == "beforehand"
    assert all(shape._inline.docPr.get("descr") for shape in document.inline_shapes)
    assert len(document.inline_shapes) >= 5


def test_where_the_report_is_written(tmp_path, monkeypatch):
    """Beside the lock under its name, or elsewhere; a person's own file is left alone."""
    path = tmp_path / "jobs.lock.yaml"
    shutil.copy(LOCKS["jobs"], path)
    assert report(path) == (tmp_path / "jobs.report.html",)
    assert report_path(path, "docx").name == "jobs.report.docx"
    runner = CliRunner()
    done = runner.invoke(app, ["report", str(path), "--to", "md", "--to", "docx"])
    assert done.exit_code == 0, done.stderr
    assert {one.name for one in tmp_path.iterdir()} == {
        "jobs.lock.yaml", "jobs.report.html", "jobs.report.md", "jobs.report.docx",
    }  # fmt: skip
    again = runner.invoke(app, ["report", str(path), "--to", "md", "--to", "docx", "--to", "html"])
    assert again.exit_code == 0, again.stderr
    mine = tmp_path / "mine.html"
    mine.write_text("<p>mine</p>", encoding="utf-8")
    refused = runner.invoke(app, ["report", str(path), "-o", str(mine)])
    assert refused.exit_code == 2
    assert mine.read_text(encoding="utf-8") == "<p>mine</p>"
    both = runner.invoke(app, ["report", str(path), "--to", "md", "--to", "html", "-o", str(mine)])
    assert both.exit_code == 2


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (("rows: 180", "rows: 181"), "changed after it was written"),
        (("lock: 1", "lock: 2"), "newer"),
    ],
)
def test_a_lock_that_is_not_whole_is_refused_in_one_line(tmp_path, change, said):
    """Nothing is written."""
    path = tmp_path / "jobs.lock.yaml"
    path.write_text(LOCKS["jobs"].read_text(encoding="utf-8").replace(*change, 1), encoding="utf-8")
    done = CliRunner().invoke(app, ["report", str(path)])
    assert done.exit_code == 2
    assert said in done.stderr
    assert len(done.stderr.strip().splitlines()) == 1
    assert [one.name for one in tmp_path.iterdir()] == ["jobs.lock.yaml"]


def test_row_labels_stand_as_the_plan_lets_them(tmp_path):
    """With hashed labels no label of the table is in any form of the report."""
    n = 40
    frame = pd.DataFrame({"who": [f"person-{at}" for at in range(n)], "x": [float(at) for at in range(n)]})
    frame["y"] = frame["x"] * 2 + [(-1.0) ** at for at in range(n)]
    frame.loc[3, "y"] = 400.0
    frame.to_csv(tmp_path / "t.csv", index=False)
    (tmp_path / "t.plan.yaml").write_text(
        "language: 1\ntitle: T\nquestion: Q?\n"
        "data: {file: t.csv, row_label: who, labels_in_lock: hashed}\n"
        "outcome: {column: y}\npredictors: [{column: x}]\ninfluence: {at_most: 10%}\n",
        encoding="utf-8",
    )
    runner = CliRunner()
    assert runner.invoke(app, ["run", str(tmp_path / "t.plan.yaml"), "--quiet"]).exit_code == 0
    lock = tmp_path / "t.lock.yaml"
    assert read_lock(lock).rows_removed
    for content in contents_of(context_of(read_lock(lock), lock), ("html", "md")).values():
        assert b"person-" not in content


def test_a_run_without_an_answer_is_reported_as_one(tmp_path):
    """A stopped run says which rule stopped it, and has no empty section."""
    frame = pd.DataFrame(
        {"x": [1.0, None, None, None, 2.0, 3.0, None, None], "y": [float(at) for at in range(8)]}
    )
    plan = plan_from_mapping(
        {
            "language": 1, "title": "Stops", "question": "Q?", "data": {"file": "t.csv"},
            "outcome": {"column": "y"}, "predictors": [{"column": "x"}],
            "keep": [{"predictor": "x", "rule": "always", "because": "it must"}],
        }
    )  # fmt: skip
    path = tmp_path / "stops.lock.yaml"
    write_lock(run(plan, frame).lock, path)
    document = document_of(context_of(read_lock(path), path), NOTHING)
    assert "Stopped" in document.sections[0].blocks[0].sentences[0].text
    assert all(section.blocks for section in document.sections)
    assert words.TITLES["answer"] not in [section.title for section in document.sections]


@pytest.mark.parametrize(("form", "package"), [("html", "matplotlib"), ("docx", "python-docx")])
def test_without_the_library_that_a_form_needs_one_line_says_what_to_install(
    tmp_path, monkeypatch, form, package
):
    """And nothing is written; Markdown needs neither."""
    import importlib.util

    path = tmp_path / "jobs.lock.yaml"
    shutil.copy(LOCKS["jobs"], path)
    gone = {"matplotlib": "matplotlib", "python-docx": "docx"}[package]
    found = importlib.util.find_spec

    def spec(name, package=None):
        return None if name == gone else found(name, package)

    for module in ("beforehand.picturing.drawing", "beforehand.reporting.word"):
        monkeypatch.setattr(f"{module}.find_spec", spec)
    done = CliRunner().invoke(app, ["report", str(path), "--to", form])
    assert done.exit_code == 2
    assert f"needs the package {package}" in done.stderr or f"need the package {package}" in done.stderr
    assert [one.name for one in tmp_path.iterdir()] == ["jobs.lock.yaml"]
    assert CliRunner().invoke(app, ["report", str(path), "--to", "md"]).exit_code == 0


def test_numbers_in_markdown_are_numbers():
    """A decimal is no list; only what would begin one is."""
    from beforehand.reporting.markdown import plain

    assert plain("36.6") == "36.6"
    assert plain("-8.7 to 3.1") == "-8.7 to 3.1"
    assert plain("- a") == "\\- a"
    assert plain("1. a") == "1\\. a"
