from __future__ import annotations

import pytest
from rich.cells import cell_len

from beforehand.screen.layout import (
    Column,
    Section,
    cells,
    labelled,
    on_point,
    pad,
    page,
    shorten,
    shown,
    table,
    wrapped,
)


def test_wide_signs_take_two_cells_and_accents_none() -> None:
    """Alignment counts what a terminal shows, not characters."""
    assert [cells(text) for text in ("load", "開花", "e\u0301", "🐝")] == [4, 4, 1, 2]
    assert pad("開花", 6) + "|" == "開花  |"
    assert pad("7.5", 6, "right") == "   7.5"


@pytest.mark.parametrize(
    ("text", "width", "short"),
    [
        ("outdoor_temp", 12, "outdoor_temp"),
        ("outdoor_temp", 9, "outd…temp"),
        ("outdoor_temp", 8, "outd…emp"),
        ("開花日数北側", 9, "開花…北側"),
        ("outdoor_temp", 2, "ou"),
        ("outdoor_temp", 0, ""),
    ],
)
def test_a_long_name_is_shortened_in_its_middle(text: str, width: int, short: str) -> None:
    """Both ends of a name stay, as its end is often what tells it from others."""
    assert shorten(text, width) == short
    assert cells(shorten(text, width)) <= width


def test_lines_break_at_spaces_and_never_before_a_percent_sign() -> None:
    """A number stays with its percent sign; later lines stand under the first one's text."""
    assert wrapped("a share of 95 % interval", 16, first="  - ") == (
        "  - a share of",
        "    95 %",
        "    interval",
    )


def test_a_word_wider_than_the_screen_is_cut_and_none_of_it_is_lost() -> None:
    """A name without a space cannot push the screen's edge, whatever its script."""
    for word in ("x" * 95, "開花日数" * 12):
        lines = wrapped(word, 40)
        assert max(cell_len(line) for line in lines) <= 40
        assert "".join(line.strip() for line in lines) == word


def test_prose_is_never_wider_than_a_reader_likes() -> None:
    """On a wide terminal sentences still break at 100 cells."""
    assert max(map(len, wrapped("word " * 60, 140))) <= 100


def test_control_signs_are_shown_and_not_obeyed() -> None:
    """A column name with an escape sequence cannot colour or clear a terminal."""
    assert shown("load\x1b[31m\n\x07") == "load\\x1b[31m \\x07"
    assert shown("größe ✓") == "größe ✓"


def test_labels_stand_in_one_column() -> None:
    """Texts begin at the same cell and wrap under themselves."""
    assert labelled([("Rows", "one two three"), ("開花", "four")], 18) == (
        "  Rows   one two",
        "         three",
        "  開花   four",
    )


def test_numbers_stand_on_their_points() -> None:
    """Decimal points are under each other, whole numbers end where points are."""
    assert on_point(["6.41", "-0.003", "12"]) == ("6.41 ", "-0.003", "12    ")


def test_numbers_stay_where_standing_on_points_would_be_too_wide_or_has_an_exponent() -> None:
    """Very different sizes are aligned on the right instead."""
    assert on_point(["1234567.5", "0.0000012"]) == ("1234567.5", "0.0000012")
    assert on_point(["1.2e-07", "3.5"]) == ("1.2e-07", "3.5")


COLUMNS = (
    Column(head="", texts=("a_rather_long_name", "b"), align="left", least=8),
    Column(head="Standard error", texts=("0.61", "1.20")),
)


@pytest.mark.parametrize(
    ("width", "lines"),
    [
        (
            40,
            (
                "                       Standard error",
                "  a_rather_long_name             0.61",
                "  b                              1.20",
            ),
        ),
        (
            32,
            (
                "                       Standard",
                "                          error",
                "  a_rather_long_name       0.61",
                "  b                        1.20",
            ),
        ),
        (
            22,
            (
                "              Standard",
                "                 error",
                "  a_rat…name      0.61",
                "  b               1.20",
            ),
        ),
    ],
)
def test_a_tight_table_breaks_its_heads_then_shortens_names(width: int, lines: tuple[str, ...]) -> None:
    """Words are given up in the order in which they are missed least."""
    assert table(COLUMNS, width) == tuple(line.rstrip() for line in lines)


def test_a_table_that_cannot_fit_says_so() -> None:
    """None, so that the caller can choose another form."""
    assert table(COLUMNS, 16) is None
    assert table(COLUMNS, 22, shortening=False) is None


def test_a_page_separates_sections_and_colours_headings_only_where_asked() -> None:
    """Colour adds nothing that the text does not say."""
    sections = [Section(title="One", lines=("  a ", ""), tone="good"), Section(title="Two", close=True)]
    assert page(sections) == "One\n  a\n\nTwo\n"
    assert page(sections, colour=True) == "\x1b[1;32mOne\x1b[0m\n  a\n\n\x1b[1mTwo\x1b[0m\n"
