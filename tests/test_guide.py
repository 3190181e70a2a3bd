"""The built-in pages."""

import re
from importlib.resources import files

import pytest

from beforehand.faults import InputError
from beforehand.guide import BLOCKS, page, pages
from beforehand.plan import Plan

NOT_BLOCKS = {"title", "question", "written_by"}


def test_every_key_of_a_plan_has_a_page() -> None:
    """A page can be asked for by any top-level key of the plan, title and question included."""
    for name, field in Plan.model_fields.items():
        assert f"`{field.alias or name}`" in page(field.alias or name)


def test_blocks_are_the_keys_of_a_plan_in_its_order() -> None:
    """The list of block pages follows the models of the plan."""
    assert tuple(name for name in Plan.model_fields if name not in NOT_BLOCKS) == BLOCKS


def test_every_page_that_is_packed_is_listed() -> None:
    """No page lies in the package without standing in the list, and none is missing."""
    packed = {entry.name for entry in files("beforehand.guide").iterdir() if entry.name.endswith(".md")}
    assert packed == {f"{one.name}.md" for one in pages()}


def test_pages_start_with_a_title_and_a_sentence() -> None:
    """Every page has a heading, a first sentence of its own, and ends with one line break."""
    for one in pages():
        text = page(one.name)
        assert text.startswith(f"# {one.title}\n\n{one.summary}\n\n")
        assert one.summary.endswith((".", "?"))
        assert len(one.summary) < 110
        assert text.endswith("\n")
        assert not text.endswith("\n\n")
        assert "{fields}" not in text
    assert len({one.summary for one in pages()}) == len(pages())


def test_the_first_page_is_the_way_in() -> None:
    """The list opens with the first plan and closes with what to do about bad input."""
    assert (pages()[0].name, pages()[-1].name) == ("first-plan", "bad-input")


def test_a_block_page_lists_every_field_of_its_block() -> None:
    """The list of fields is made from the models, defaults and choices included."""
    text = page("influence")
    assert "- `influence.flag_when.cooks_distance` (default 4/n): Cook's distance above this.\n" in text
    assert "- `influence.at_most` (default 0.05): " in text
    assert "- `transforms.try` (any of `square`, `cube`, `square_root`, " in page("transforms")
    assert "- `errors` (one of `classical`, `hc0`, `hc1`, `hc2`, `hc3`; default classical): " in page(
        "errors"
    )
    assert "- `keep[].rule.unless_p_above` (no default): " in page("keep")


def test_a_field_without_a_description_would_show() -> None:
    """Every field that a page lists has a description."""
    for name in BLOCKS:
        for line in page(name).split("\n"):
            if line.startswith("- `") and f"- `{name}" in line:
                assert re.search(r": \S.*[.?]$", line), line


@pytest.mark.parametrize("name", ["bad_input", "BAD-INPUT", " missing-data ", "Influence"])
def test_names_are_read_kindly(name: str) -> None:
    """Capitals, blanks around, hyphen for underscore: all find the page."""
    assert page(name).startswith("# ")


def test_an_unknown_page_names_the_nearest() -> None:
    """A mistyped name is one line with the right one."""
    with pytest.raises(InputError) as caught:
        page("influense")
    assert str(caught.value) == "guide: influense: there is no such page (nearest: 'influence')"
    assert caught.value.faults[0].code == "guide.page"


def test_a_name_like_nothing_is_refused_plainly() -> None:
    """Without a near name the message says no more than that there is no such page."""
    with pytest.raises(InputError) as caught:
        page("zzz")
    assert str(caught.value) == "guide: zzz: there is no such page"


def test_pages_use_only_what_a_terminal_shows() -> None:
    """Headings, paragraphs, lists and indented examples; no tables, no pictures, no links."""
    for one in pages():
        text = page(one.name)
        assert not re.search(r"^\||!\[|\]\(|^```", text, re.MULTILINE), one.name


def test_pages_speak_plainly() -> None:
    """No exclamation marks, and sentences stay short."""
    for one in pages():
        prose = [
            line for line in page(one.name).split("\n") if line and not line.startswith(("    ", "#", "- `"))
        ]
        text = " ".join(prose).replace("!=", "")
        assert "!" not in text
        for sentence in re.split(r"(?<=[.?:;]) ", text):
            assert len(sentence.split()) <= 45, (one.name, sentence)
