"""How figures of the appendix look and are saved.

Rules
-----
* Series differ by marker and line, not by colour alone; text is at least 8 pt at print size; axes are quantity over unit.
* The same data give the same bytes: no dates, fixed metadata.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass
from typing import Any, Final

import matplotlib as mpl
import numpy as np
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure
from numpy.typing import NDArray

from schemas.lineage import ReductionDocument

__all__ = [
    "HEIGHTS",
    "LOOKS",
    "STYLE",
    "WIDTH",
    "Column",
    "Drawn",
    "NoFigure",
    "Undrawn",
    "as_svg",
    "name_of",
    "raised",
    "saved",
]

Column = NDArray[np.float64]

STYLE: dict[str, Any] = {
    "font.size": 9, "axes.labelsize": 9, "xtick.labelsize": 8.5, "ytick.labelsize": 8.5, "legend.fontsize": 8.5, "font.family": "STIXGeneral",
    "axes.linewidth": 0.5, "lines.linewidth": 0.8, "lines.markersize": 2.6, "xtick.direction": "in", "ytick.direction": "in", "xtick.top": True,
    "ytick.right": True, "xtick.major.width": 0.5, "ytick.major.width": 0.5, "xtick.minor.width": 0.3, "ytick.minor.width": 0.3, "legend.frameon": False,
    "pdf.fonttype": 42, "pdf.compression": 6, "axes.formatter.useoffset": False, "savefig.dpi": 300, "path.simplify": True, "mathtext.fontset": "stix",
    "legend.handlelength": 2.2, "legend.markerscale": 1.7, "legend.borderaxespad": 0.3, "figure.constrained_layout.h_pad": 0.02, "figure.constrained_layout.w_pad": 0.03,
}  # fmt: skip
LOOKS = (
    ("o", "-", "black"),
    ("s", "--", "#444444"),
    ("^", "-.", "#0b5394"),
    ("v", ":", "#a61c00"),
    ("D", "-", "#38761d"),
    ("x", "--", "#674ea7"),
    ("+", "-.", "#7f6000"),
)
"""Marker, line and colour of each series; marker and line alone tell them apart in grey."""

_SVG: ContextVar[bool] = ContextVar("figures as SVG", default=False)
_SHEET: Final = re.compile(r"<style\b[^>]*>[^<]*</style>")
_STYLED: Final = re.compile(r'\bstyle="([^"]*)"')

WIDTH: Final = 4.6
"""Inches: fits a text width of 120 mm without being scaled."""

POINTS_PER_INCH: Final = 72
"""In which PDF and SVG measure, and the layout must."""

HEIGHTS: Final = (2.2, 3.4, 5.2)
"""Inches: one panel, a panel with its residuals, two of those."""


_RAISED = re.compile("[\u207b\u2070\u00b9\u00b2\u00b3\u2074-\u2079]+")
_LEVEL = str.maketrans("\u207b\u2070\u00b9\u00b2\u00b3\u2074\u2075\u2076\u2077\u2078\u2079", "-0123456789")


class NoFigure(Exception):
    """A figure's numbers are not all there; the text ends the sentence "there is no figure of ...: "."""


@dataclass(frozen=True)
class Drawn:
    """A figure: its file name, bytes, caption as plain text, and the addresses of the reductions or records it shows."""

    name: str
    content: bytes
    caption: str
    sources: tuple[str, ...]


@dataclass(frozen=True)
class Undrawn:
    """A figure that could not be drawn: of which reduction, and why."""

    address: str
    why: str
    what: str = "figure"


@contextmanager
def as_svg() -> Iterator[None]:
    """Return a context in which `saved` gives SVG instead of PDF."""
    token = _SVG.set(True)
    try:
        yield
    finally:
        _SVG.reset(token)


def saved(figure: Figure) -> bytes:
    """Return a figure as PDF without dates; as SVG within `as_svg`."""
    buffer = io.BytesIO()
    if not _SVG.get():
        FigureCanvasPdf(figure)
        _lay_out(figure)
        figure.savefig(
            buffer,
            format="pdf",
            metadata={"CreationDate": None, "Producer": "stillroom", "Creator": "stillroom"},
        )
        return buffer.getvalue()
    FigureCanvasSVG(figure)
    _lay_out(figure)
    with mpl.rc_context({"svg.hashsalt": "stillroom", "svg.fonttype": "path"}):
        figure.savefig(buffer, format="svg", metadata={"Date": None, "Creator": "stillroom"})
    return _unstyled(buffer.getvalue().decode()).encode()


def _unstyled(svg: str) -> str:
    """SVG with presentation attributes in the place of style sheets and style attributes, which many a page forbids."""
    bare = _SHEET.sub("", svg)
    if bare != svg:
        # The sheet that was taken out says this of everything.
        bare = bare.replace("<svg ", '<svg stroke-linejoin="round" stroke-linecap="butt" ', 1)
    return _STYLED.sub(lambda found: " ".join(_attributes(found[1])), bare)


def _attributes(style: str) -> Iterator[str]:
    for each in filter(None, map(str.strip, style.split(";"))):
        name, _, value = each.partition(":")
        yield f'{name.strip()}="{value.strip()}"'


def _lay_out(figure: Figure) -> None:
    """Place the panels here: a figure that still has its layout engine is drawn twice by ``savefig``, the first time for nothing else."""
    engine = figure.get_layout_engine()
    if engine is not None:
        figure.set_dpi(POINTS_PER_INCH)
        engine.execute(figure)
        figure.set_layout_engine(None)


def name_of(kind: str, reduction: ReductionDocument) -> str:
    """Return the file name of the figure of one reduction."""
    return f"figures/{kind}-{reduction.cooldown}-{reduction.sweep.partition('/')[2]}.pdf"


def raised(text: str) -> str:
    """Return a text with its superscripts as mathematics: the text font has few of them, and no superscript minus.

    Examples
    --------
    >>> raised("µmol·m⁻²")
    'µmol·m$^{-2}$'
    """
    return _RAISED.sub(lambda run: f"$^{{{run[0].translate(_LEVEL)}}}$", text)
