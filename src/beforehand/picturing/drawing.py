"""From a picture to the bytes of a file, the same bytes every time."""

from __future__ import annotations

import io
import re
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from html import escape
from importlib.util import find_spec
from typing import TYPE_CHECKING, Any, Literal

from beforehand.faults import Fault, InputError
from beforehand.picturing.picture import Picture
from beforehand.picturing.sheet import INK, Sheet

if TYPE_CHECKING:
    from matplotlib.figure import Figure

Kind = Literal["svg", "png"]

# Dots to the inch of a PNG: sharp in print.
DPI = 200

TITLE_HEIGHT = 0.27
TITLE_SIZE = 10.0

# The same letters and widths wherever an SVG is shown: the first is drawn with, the next is its like.
_FONTS = ("DejaVu Sans", "Verdana", "sans-serif")

_OURS: Any = {
    "font.family": "sans-serif",
    "font.sans-serif": list(_FONTS),
    "font.size": 8.0,
    "text.color": INK,
    "text.parse_math": False,
    "axes.formatter.limits": (-4, 6),
    "axes.formatter.use_mathtext": False,
    "axes.labelsize": 7.5,
    "axes.labelcolor": INK,
    "path.simplify": False,
    "svg.fonttype": "none",
    "svg.hashsalt": "beforehand",
}

_HEAD = re.compile(r"\A.*?(?=<svg\b)", re.DOTALL)
_METADATA = re.compile(r"\s*<metadata>.*?</metadata>", re.DOTALL)
_OPENING = re.compile(r"<svg\b[^>]*>")
_ID = re.compile(r'\bid="([^"]*)"')
_LINK = re.compile(r'\b((?:xlink:)?href)="#([^"]*)"')
_CLIP = re.compile(r"url\(#([^)]*)\)")
_PATH = re.compile(r'\bd="[^"]*"')
_LONG = re.compile(r"(\.\d{3})\d+")
_PAINT = re.compile(rf"\b(fill|stroke): {INK}", re.IGNORECASE)


def drawn(picture: Picture, kind: Kind = "svg", *, titled: bool = True) -> bytes:
    """Draw a picture.

    Parameters
    ----------
    picture : Picture
    kind : "svg" or "png"
    titled : bool
        Whether the question stands above it.

    Returns
    -------
    bytes
        An SVG begins with its ``<svg`` element, so that it can stand in a page: its ground is
        clear, its text has the colour of the page's, its ids begin with the picture's name. A PNG
        is on white, at 200 dots to the inch.

    Raises
    ------
    InputError
        matplotlib is not installed.
    """
    require_matplotlib()
    with _settings():
        figure = figure_of(picture, titled=titled)
        out = io.BytesIO()
        if kind == "png":
            figure.savefig(out, format="png", dpi=DPI, facecolor="white", metadata={"Software": None})
            return out.getvalue()
        figure.savefig(out, format="svg", transparent=True, metadata={"Date": None, "Creator": None})
    return _for_a_page(out.getvalue().decode(), picture).encode()


def figure_of(picture: Picture, *, titled: bool = True) -> Figure:
    """The picture as a matplotlib figure of its own; no window, no global figure."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    with _settings():
        above = TITLE_HEIGHT if titled else 0.0
        figure = Figure(figsize=(picture.width, picture.height + above))
        FigureCanvasAgg(figure)
        if titled:
            figure.text(
                0.02 / picture.width, 1.0 - 0.05 / (picture.height + above), picture.title, ha="left",
                va="top", fontsize=TITLE_SIZE, fontweight="bold", color=INK, parse_math=False,
            )  # fmt: skip
        picture.draw(Sheet(figure, picture.width, picture.height, above))
    return figure


def require_matplotlib() -> None:
    """See that there is what draws.

    Raises
    ------
    InputError
        There is not: one line that says what to install.
    """
    if find_spec("matplotlib") is None:
        what = "need the package matplotlib: pip install 'beforehand[report]'"
        fault = Fault(file="pictures", line=None, place="", what=what, code="no_matplotlib")
        raise InputError([fault])


@contextmanager
def _settings() -> Iterator[None]:
    """The settings of all pictures, whatever a person's own settings of matplotlib are."""
    import matplotlib

    with matplotlib.rc_context(), warnings.catch_warnings():
        # A letter that the font lacks is drawn as a box in a PNG, and by the reader's font in an SVG.
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        warnings.filterwarnings("ignore", message="Matplotlib currently does not support")
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_OURS)
        yield


def _for_a_page(text: str, picture: Picture) -> str:
    """An SVG that can stand in a page beside others."""
    text = _METADATA.sub("", _HEAD.sub("", text, count=1), count=1)
    prefix = f"{picture.name}-"
    seen: dict[str, int] = {}

    def own(found: re.Match[str]) -> str:
        # Many marks of a kind have one name; in a page each has a number too.
        name = found.group(1)
        seen[name] = seen.get(name, 0) + 1
        number = "" if seen[name] == 1 else f"-{seen[name]}"
        return f'id="{prefix}{name}{number}"'

    text = _ID.sub(own, text)
    text = _LINK.sub(rf'\1="#{prefix}\2"', text)
    text = _CLIP.sub(rf"url(#{prefix}\1)", text)
    # A thousandth of a point is finer than any eye.
    text = _PATH.sub(lambda found: _LONG.sub(r"\1", found.group(0)), text)
    text = _PAINT.sub(r"\1: currentColor", text)
    words = (
        f'<title id="{prefix}title">{escape(picture.title)}</title>'
        f'<desc id="{prefix}words">{escape(picture.alt)}</desc>'
    )

    def opened(found: re.Match[str]) -> str:
        start = found.group(0)[:-1]
        return f'{start} role="img" aria-labelledby="{prefix}title {prefix}words">\n{words}'

    return _OPENING.sub(opened, text, count=1)
