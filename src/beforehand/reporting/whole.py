"""The whole report, section by section, and the pictures that it asks for."""

from __future__ import annotations

from beforehand.reporting import words
from beforehand.reporting.beside import references_section, refresh_section, rehearsal_section
from beforehand.reporting.context import Context
from beforehand.reporting.details import (
    building_section,
    checks_section,
    correlations_section,
    question_section,
    record_section,
    removed_section,
    variables_section,
)
from beforehand.reporting.document import Document, Picture, Section
from beforehand.reporting.final import (
    alternatives_section,
    answer_section,
    fragile_section,
    honest_section,
    pictures_section,
)
from beforehand.reporting.finding import key_section, text_section

# The order of the report: what the decision maker needs first, then everything behind it.
SECTIONS = (
    key_section,
    text_section,
    question_section,
    variables_section,
    correlations_section,
    building_section,
    removed_section,
    checks_section,
    answer_section,
    pictures_section,
    honest_section,
    fragile_section,
    alternatives_section,
    rehearsal_section,
    refresh_section,
    record_section,
    references_section,
)


def document_of(context: Context, pictures: frozenset[str]) -> Document:
    """The report of a lock.

    Parameters
    ----------
    context : Context
    pictures : frozenset of str
        Names of the pictures that there are; the others are left out, and so is a section without any.
    """
    made = [one for part in SECTIONS if (one := part(context)) is not None]
    kept = [_with_pictures(one, pictures) for one in made]
    return Document(
        title=context.lock.plan.title,
        question=context.lock.plan.question,
        sections=tuple(one for one in kept if one.blocks),
        foot=words.made_from(context.name, context.lock.digest),
    )


def _with_pictures(one: Section, pictures: frozenset[str]) -> Section:
    """The section without pictures that do not exist."""
    blocks = tuple(block for block in one.blocks if not isinstance(block, Picture) or block.name in pictures)
    return Section(key=one.key, title=one.title, blocks=blocks, appendix=one.appendix)
