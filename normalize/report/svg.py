"""A drawing surface that gives the same SVG bytes for the same figure.

matplotlib draws without pyplot (whose import costs more than the drawing); text stays text;
no date is written; ids are short and own to each figure, so that several can stand in one
page.  Colours leave as the tokens of ``look``, which a page may redefine for the dark.
"""

from __future__ import annotations

import re
import threading
import warnings
from contextlib import contextmanager
from dataclasses import dataclass
from io import StringIO
from typing import TYPE_CHECKING, Final

from normalize.report import look
from normalize.report import numbers as n

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_LOCK = threading.Lock()  # matplotlib's settings are global; the page draws from several threads

_SETTINGS: Final = {
    "svg.fonttype": "none",  # text stays text
    "svg.hashsalt": "normalize",  # ids from content alone
    "font.family": ["DejaVu Serif"],  # comes with matplotlib; used for measuring only
    "text.parse_math": False,  # "$" is money here
    "axes.unicode_minus": True,
    "path.simplify": True,
}

_HEAD = re.compile(r"^.*?(?=<svg)", re.DOTALL)
_METADATA = re.compile(r"\s*<metadata>.*?</metadata>", re.DOTALL)
_STYLE_DEFS = re.compile(r'\s*<defs>\s*<style type="text/css">.*?</style>\s*</defs>', re.DOTALL)
_OPENING = re.compile(r"<svg[^>]*>")
_FAMILY = re.compile(r"\s*font-family:[^;\"]*;?")
_NO_TURN = re.compile(r' transform="rotate\(-0 [^)]*\)"')
_ID = re.compile(r' id="([^"]*)"')
_REF = re.compile(r'(?:xlink:href="#|url\(#)([^")]*)')
_EMPTY_GROUP = re.compile(r"<g>\s*</g>\s*")
_SPACE = re.compile(r"\s*\n\s*")


@dataclass(frozen=True, slots=True)
class Picture:
    """A drawn figure.

    key : unique in a report, fit for an id.  title : the finding.  alt : what a listener
    needs instead of the picture.  caption : the sentence beneath.  body : SVG elements.
    """

    key: str
    title: str
    alt: str
    caption: str
    width: float
    height: float
    body: str

    def inline(self) -> str:
        """The figure for a page that brings its own type and colours."""
        return self._wrapped("").replace(" xlink:href=", " href=")

    def standalone(self) -> str:
        """The figure as a file of its own."""
        spaces = (
            ' xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink"'
            f' font-family="{escaped(look.SERIF)}" fill="{look.INK}"'
        )
        return f'<?xml version="1.0" encoding="UTF-8"?>\n{self._wrapped(spaces)}\n'

    def _wrapped(self, attributes: str) -> str:
        key, box = self.key, f"0 0 {self.width:g} {self.height:g}"
        return (
            f'<svg{attributes} viewBox="{box}" width="{self.width:g}" height="{self.height:g}" '
            f'role="img" aria-labelledby="{key}-t {key}-d">'
            f'<title id="{key}-t">{escaped(n.clean(self.title))}</title>'
            f'<desc id="{key}-d">{escaped(n.clean(self.alt))}</desc>{self.body}</svg>'
        )


def escaped(text: str) -> str:
    """Text fit for SVG and HTML, in elements and in quotes.

    >>> escaped('<b> & "x"')
    '&lt;b&gt; &amp; &quot;x&quot;'
    """
    from html import escape

    return escape(text, quote=True)


def drawn(text: str) -> str:
    """Text fit for a figure: cleaned, and without quotes that could look like markup."""
    return n.name(text).replace('"', "\u201d")


@contextmanager
def surface(height: float, width: float = look.WIDTH) -> Iterator[Figure]:
    """An empty figure of that size in px; the settings hold while it is drawn."""
    import matplotlib as mpl
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    with _LOCK, warnings.catch_warnings(), mpl.rc_context(_SETTINGS):  # type: ignore[arg-type]
        # Scripts and emoji that the measuring font lacks are drawn by the reader's fonts.
        warnings.filterwarnings("ignore", message="Glyph ")
        warnings.filterwarnings("ignore", message="Matplotlib currently does not support")
        figure = Figure(figsize=(width / 72.0, height / 72.0), dpi=72)
        FigureCanvasSVG(figure)
        figure.patch.set_visible(False)
        yield figure


def panel(
    figure: Figure, left: float, bottom: float, width: float, height: float, *, of: float
) -> Axes:
    """Axes at a place given in px from the lower left corner of a figure ``of`` px high."""
    axes = figure.add_axes(
        (left / look.WIDTH, bottom / of, width / look.WIDTH, height / of), facecolor="none"
    )
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(look.QUIET)
        axes.spines[side].set_linewidth(0.8)
    axes.xaxis.set_visible(False)  # report/axes.py draws them
    axes.yaxis.set_visible(False)
    return axes


def title(figure: Figure, text: str, under: str = "", *, height: float) -> None:
    """The finding at the upper left and, smaller, what is drawn."""
    lines = (
        (text, 17.0, look.TITLE_SIZE, look.INK, 700),
        (under, 37.0, look.TEXT_SIZE, look.QUIET, 400),
    )
    for line, down, size, colour, weight in lines:
        if line:
            y = 1.0 - down / height
            figure.text(0.0, y, drawn(line), fontsize=size, color=colour, fontweight=weight)


def picture(
    figure: Figure,
    key: str,
    *,
    title: str,
    alt: str,
    caption: str,
    width: float = look.WIDTH,
    height: float,
) -> Picture:
    """The figure as text, cleaned of what changes from run to run or page to page."""
    target = StringIO()
    nothing = {"Date": None, "Creator": None, "Format": None, "Type": None}
    figure.savefig(target, format="svg", metadata=nothing, transparent=True)
    return Picture(key, title, alt, caption, width, height, tidy(target.getvalue(), key))


def tidy(svg: str, key: str) -> str:
    """The inside of matplotlib's SVG: ids kept only where something refers to them."""
    svg = _HEAD.sub("", svg)
    svg = _METADATA.sub("", svg)
    svg = _STYLE_DEFS.sub("", svg)
    svg = _OPENING.sub("", svg, count=1)
    svg = svg[: svg.rindex("</svg>")]
    svg = _FAMILY.sub("", svg)
    svg = _NO_TURN.sub("", svg)
    used = sorted(set(_REF.findall(svg)))
    short = {old: f"{key}-{i}" for i, old in enumerate(used)}
    svg = _ID.sub(lambda m: f' id="{short[m[1]]}"' if m[1] in short else "", svg)
    svg = _REF.sub(lambda m: m[0].replace(m[1], short[m[1]]), svg)
    svg = _EMPTY_GROUP.sub("", svg)
    return _SPACE.sub("\n", svg).strip()


def with_classes(body: str, classes: dict[str, str]) -> str:
    """Inline styles replaced by classes, collected in ``classes`` (style → class name).

    A page can then carry one style sheet whose hash its content policy names, and redefine
    colours for the dark.
    """

    def classed(match: re.Match[str]) -> str:
        style = match.group(1).strip().rstrip(";")
        if not style:
            return ""
        return f' class="{classes.setdefault(style, f"f{len(classes)}")}"'

    return re.sub(r' style="([^"]*)"', classed, body)


def style_rules(classes: dict[str, str]) -> str:
    """The style sheet of those classes, with colours as the page's tokens."""
    by_colour = {light: f"var(--{token})" for token, (light, _) in look.TOKENS.items()}
    tokens: Callable[[re.Match[str]], str] = lambda m: by_colour.get(m[0], m[0])  # noqa: E731
    return "\n".join(
        f".{name}{{{re.sub('#[0-9a-f]{6}', tokens, style)}}}" for style, name in classes.items()
    )
