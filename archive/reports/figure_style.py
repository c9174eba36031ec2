"""How figures of the appendix look and are saved, and where their columns come from.

Rules
-----
* Series differ by marker and line, not by colour alone; text is 8 pt at print size; axes are quantity over unit.
* The same data give the same bytes: no dates, fixed metadata.
"""

from __future__ import annotations

import io
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.figure import Figure
from numpy.typing import NDArray

from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument
from schemas.quantity import unit_factor

__all__ = ["LOOKS", "STYLE", "WIDTH", "Column", "Drawn", "channel_of", "column_of", "name_of", "saved"]

Column = NDArray[np.float64]

STYLE: dict[str, Any] = {
    "font.size": 8, "axes.labelsize": 8, "xtick.labelsize": 8, "ytick.labelsize": 8, "legend.fontsize": 8, "font.family": "DejaVu Sans",
    "axes.linewidth": 0.5, "lines.linewidth": 0.8, "lines.markersize": 2.6, "xtick.direction": "in", "ytick.direction": "in", "xtick.top": True,
    "ytick.right": True, "xtick.major.width": 0.5, "ytick.major.width": 0.5, "legend.frameon": False, "pdf.fonttype": 42, "pdf.compression": 6,
    "axes.formatter.useoffset": False, "savefig.dpi": 300, "path.simplify": True,
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
WIDTH = 4.6  # inches: fits a text width of 120 mm


@dataclass(frozen=True)
class Drawn:
    """A figure: its file name, bytes, caption as plain text, and the reductions it shows."""

    name: str
    content: bytes
    caption: str
    sources: tuple[str, ...]


def column_of(scope: Scope, reduction: ReductionDocument, name: str) -> Column | None:
    """Return the values of an output, or None where the archive holds none."""
    return scope.holdings_of(reduction).column(reduction.address, name)


def channel_of(scope: Scope, reduction: ReductionDocument, quantity: str) -> Column | None:
    """Return a recorded channel in SI units."""
    entry = scope.taken_of(reduction).entry
    found = (
        None
        if entry is None
        else next((each for each in entry.channels if each.quantity == quantity and each.use), None)
    )
    values = None if found is None else scope.holdings_of(reduction).column(reduction.sweep, found.name)
    if values is None or found is None:
        return None
    return np.asarray(values * (1.0 if quantity == "instant" else unit_factor(found.unit, quantity)))


def saved(figure: Figure) -> bytes:
    """Return a figure as PDF without dates."""
    FigureCanvasPdf(figure)
    buffer = io.BytesIO()
    figure.savefig(
        buffer, format="pdf", metadata={"CreationDate": None, "Producer": "stillroom", "Creator": "stillroom"}
    )
    return buffer.getvalue()


def name_of(kind: str, reduction: ReductionDocument) -> str:
    """Return the file name of the figure of one reduction."""
    return f"figures/{kind}-{reduction.cooldown}-{reduction.sweep.partition('/')[2]}.pdf"
