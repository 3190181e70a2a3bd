"""A sheet to draw on, measured in inches from its upper left corner, and the colours of all pictures.

Text and axes are in the page's own ink, so that an SVG is right on light and on dark pages; what
carries a meaning has one of a few mid-toned colours that people who see colours otherwise can tell
apart too (palette of Okabe & Ito 2008).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any, Literal

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Stands for the colour of the page's text: an SVG says currentColor in its place.
INK = "#1b1f24"

BLUE = "#0072b2"
VERMILION = "#d55e00"
GREEN = "#009e73"
ORANGE = "#e69f00"
PURPLE = "#cc79a7"

# How much of the ink secondary things have.
FAINT, QUIET = 0.16, 0.62

# Sizes of text, in points.
BODY, SMALL = 8.0, 7.0

# Width of every picture in inches: the text of a printed page.
WIDTH = 7.2

Anchor = Literal["left", "center", "right"]


class Sheet:
    """One picture while it is drawn.

    Parameters
    ----------
    figure : matplotlib Figure
    width, height : float
        Of the part to draw on, in inches.
    above : float
        What a title takes above it.
    """

    def __init__(self, figure: Figure, width: float, height: float, above: float) -> None:
        self.figure = figure
        self.width, self.height = width, height
        self._above = above

    def axes(self, left: float, top: float, width: float, height: float, *, lines: str = "") -> Axes:
        """Axes at a place in inches; ``lines`` names the axes, x or y, whose ticks run across."""
        whole = self.height + self._above
        box = (
            left / self.width,
            1.0 - (self._above + top + height) / whole,
            width / self.width,
            height / whole,
        )
        axes = self.figure.add_axes(box)
        axes.set_facecolor("none")
        for side in ("top", "right"):
            axes.spines[side].set_visible(False)
        for side in ("left", "bottom"):
            axes.spines[side].set(color=INK, alpha=QUIET, linewidth=0.6)
        axes.tick_params(
            colors=INK, labelcolor=INK, labelsize=SMALL, length=2.5, width=0.6, pad=2.0, which="both"
        )
        for axis in lines:
            axes.grid(visible=True, axis=axis, color=INK, alpha=FAINT, linewidth=0.5)  # type: ignore[arg-type]
        axes.set_axisbelow(True)
        return axes

    def canvas(self) -> Axes:
        """Axes over all of the sheet whose units are inches, downwards."""
        axes = self.axes(0.0, 0.0, self.width, self.height)
        axes.set_axis_off()
        axes.set(xlim=(0.0, self.width), ylim=(self.height, 0.0))
        return axes

    def width_of(self, words: str, size: float = BODY) -> float:
        """Width of a line of text in inches."""
        from matplotlib.font_manager import FontProperties
        from matplotlib.textpath import text_to_path

        font = FontProperties(size=size)
        width, _, _ = text_to_path.get_text_width_height_descent(words, font, ismath=False)
        return float(width) / 72.0

    def room_for(self, words: Iterable[str], least: float, most: float, size: float = BODY) -> float:
        """Width in inches for the longest of some lines of text, within bounds."""
        longest = max((self.width_of(one, size) for one in words), default=0.0)
        return min(max(longest, least), most)

    def fitted(self, words: str, width: float, size: float = BODY) -> str:
        """Text shortened until it fits into a width in inches."""
        if self.width_of(words, size) <= width:
            return words
        low, high = 0, len(words)
        while low < high:
            half = (low + high + 1) // 2
            if self.width_of(words[:half].rstrip() + "…", size) <= width:
                low = half
            else:
                high = half - 1
        return words[:low].rstrip() + "…"


def put(
    axes: Axes,
    x: float,
    y: float,
    words: str,
    *,
    at: Anchor = "left",
    size: float = BODY,
    colour: str = INK,
    strength: float = 1.0,
    upright: str = "center_baseline",
    **more: Any,
) -> None:
    """Text in the units of some axes."""
    axes.text(
        x, y, words, ha=at, va=upright, fontsize=size, color=colour, alpha=strength, parse_math=False,
        clip_on=False, **more,
    )  # fmt: skip


def stroke(
    axes: Axes,
    x: Sequence[float],
    y: Sequence[float],
    *,
    colour: str = INK,
    width: float = 1.0,
    strength: float = 1.0,
    dashes: Sequence[float] = (),
    name: str | None = None,
    above: float = 2.0,
) -> None:
    """A line through points."""
    style: Any = (0, tuple(dashes)) if dashes else "-"
    axes.plot(
        x, y, color=colour, linewidth=width, alpha=strength, linestyle=style, gid=name, zorder=above,
        solid_capstyle="round", solid_joinstyle="round",
    )  # fmt: skip


def mark(
    axes: Axes,
    x: float | Sequence[float],
    y: float | Sequence[float],
    *,
    shape: str = "o",
    size: float = 4.5,
    colour: str = BLUE,
    hollow: bool = False,
    name: str | None = None,
    above: float = 3.0,
) -> None:
    """A mark, or several of one kind."""
    xs = [x] if isinstance(x, int | float) else list(x)
    ys = [y] if isinstance(y, int | float) else list(y)
    axes.plot(
        xs, ys, linestyle="none", marker=shape, markersize=size, markeredgecolor=colour,
        markerfacecolor="none" if hollow else colour, markeredgewidth=1.1, gid=name, zorder=above,
        clip_on=False,
    )  # fmt: skip


def bar(
    axes: Axes, left: float, right: float, middle: float, thickness: float, *, colour: str = BLUE,
    strength: float = 0.85, name: str | None = None,
) -> None:  # fmt: skip
    """A bar lying from ``left`` to ``right``."""
    from matplotlib.patches import Rectangle

    axes.add_patch(
        Rectangle(
            (left, middle - thickness / 2.0), right - left, thickness, facecolor=colour, edgecolor="none",
            alpha=strength, gid=name,
        )
    )  # fmt: skip


def dots(
    axes: Axes, points: Iterable[tuple[float, float]], *, across: float, diameter: float,
    colour: str = BLUE, strength: float = 0.6, name: str | None = None,
) -> None:  # fmt: skip
    """Many dots of one size as one path, which keeps an SVG small.

    Parameters
    ----------
    axes : Axes
    points : pairs
    across : float
        Width of the axes in their own units.
    diameter : float
        In points.
    """
    from matplotlib.patches import PathPatch
    from matplotlib.path import Path

    corners: list[tuple[float, float]] = []
    for x, y in points:
        # A stroke too short to be seen, of which the round ends are left.
        corners += [(x, y), (x + across * 5e-4, y)]
    if corners:
        path = Path(corners, [Path.MOVETO, Path.LINETO] * (len(corners) // 2))
        axes.add_patch(
            PathPatch(
                path, facecolor="none", edgecolor=colour, linewidth=diameter, capstyle="round",
                alpha=strength, gid=name, zorder=1.5, snap=False,
            )
        )  # fmt: skip
