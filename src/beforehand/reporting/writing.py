"""From a lock's file to the file of its report."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Literal

from beforehand.lock import read_lock
from beforehand.lock.files import write_whole
from beforehand.picturing import drawn, require_matplotlib
from beforehand.picturing import pictures_of as all_pictures
from beforehand.reporting.context import Context, context_of
from beforehand.reporting.drawn import Drawn
from beforehand.reporting.html import html_of
from beforehand.reporting.markdown import markdown_of
from beforehand.reporting.whole import document_of
from beforehand.reporting.word import word_of

Form = Literal["html", "docx", "md"]
FORMS: tuple[Form, ...] = ("html", "docx", "md")

_PICTURE_KIND: Mapping[Form, Literal["svg", "png", "none"]] = {"html": "svg", "docx": "png", "md": "none"}

Progress = Callable[[str], None]


def report(
    lock: str | os.PathLike[str],
    to: Form | Sequence[Form] = "html",
    *,
    output: str | os.PathLike[str] | None = None,
    progress: Progress | None = None,
) -> tuple[Path, ...]:
    """Write the report of a lock.

    Parameters
    ----------
    lock : path
    to : str or sequence of str
        ``html``, ``docx``, ``md``; pictures are drawn once for all of them.
    output : path, optional
        For one form, the file; without it ``NAME.report.html`` and so on beside the lock.
    progress : callable, optional

    Returns
    -------
    tuple of Path
        The files that were written.

    Raises
    ------
    LockError
        The lock cannot be read, was changed after it was written, or is of a newer version.
    InputError
        A library that the form needs is not installed.
    WriteError
    """
    forms = (to,) if isinstance(to, str) else tuple(to)
    path = Path(lock)
    context = context_of(read_lock(path), path)
    made = contents_of(context, forms, progress)
    written = []
    for form, content in made.items():
        target = Path(output) if output is not None and len(forms) == 1 else report_path(path, form)
        write_whole(target, content)
        written.append(target)
    return tuple(written)


def contents_of(
    context: Context, forms: Sequence[Form], progress: Progress | None = None
) -> dict[Form, bytes]:
    """The bytes of a report in each form; the same lock gives the same bytes with the same libraries."""
    kinds = {_PICTURE_KIND[form] for form in forms}
    pictures = pictures_of(context, svg="svg" in kinds, png="png" in kinds, progress=progress)
    document = document_of(context, frozenset(pictures))
    made: dict[Form, bytes] = {}
    for form in forms:
        if progress is not None:
            progress(f"writing {form}")
        if form == "html":
            made[form] = html_of(document, pictures).encode()
        elif form == "docx":
            made[form] = word_of(document, pictures)
        else:
            made[form] = markdown_of(document, pictures).encode()
    return made


def report_path(lock: Path, form: Form) -> Path:
    """``NAME.report.html`` beside ``NAME.lock.yaml``."""
    name = lock.name
    for end in (".lock.yaml", ".lock.yml", ".yaml", ".yml"):
        if name.endswith(end):
            name = name.removesuffix(end)
            break
    return lock.with_name(f"{name}.report.{form}")


def pictures_of(
    context: Context, *, svg: bool, png: bool, progress: Progress | None = None
) -> dict[str, tuple[Drawn, ...]]:
    """Every picture that there is something for, drawn in the forms that are asked for.

    Raises
    ------
    InputError
        When the library that draws is not installed.
    """
    if not svg and not png:
        # Markdown has the words of a picture only.
        made = all_pictures(context.lock, rehearsal=context.rehearsal, refresh=context.refresh)
        return {name: (Drawn(title=one.title, alt=one.alt, note=one.note),) for name, one in made.items()}
    require_matplotlib()
    found: dict[str, tuple[Drawn, ...]] = {}
    made = all_pictures(context.lock, rehearsal=context.rehearsal, refresh=context.refresh)
    for name, one in made.items():
        if progress is not None:
            progress(f"drawing {name}")
        found[name] = (
            Drawn(
                title=one.title,
                alt=one.alt,
                note=one.note,
                svg=drawn(one, "svg", titled=False) if svg else b"",
                png=drawn(one, "png", titled=False) if png else b"",
            ),
        )
    return found
