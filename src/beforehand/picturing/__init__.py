"""Pictures of a run, each answering one question: drawn from the record alone."""

from __future__ import annotations

from beforehand.picturing.drawing import Kind, drawn, figure_of, require_matplotlib
from beforehand.picturing.picture import Picture
from beforehand.picturing.table import OF_A_LOCK, OF_A_REHEARSAL, pictures_of

__all__ = [
    "OF_A_LOCK",
    "OF_A_REHEARSAL",
    "Kind",
    "Picture",
    "drawn",
    "figure_of",
    "pictures_of",
    "require_matplotlib",
]
