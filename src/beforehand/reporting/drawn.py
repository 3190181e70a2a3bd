"""A picture that was drawn once, for every form of the report."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawn:
    """A picture with its words.

    Attributes
    ----------
    title : str
        The question that it answers.
    alt : str
        What it shows, for who cannot see it.
    note : str
        How it is read.
    svg, png : bytes
        Empty where that form was not asked for.
    """

    title: str
    alt: str
    note: str = ""
    svg: bytes = b""
    png: bytes = b""
