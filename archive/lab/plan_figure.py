"""The figure that a plan has for one reduction of it, as the methods appendix prints it."""

from __future__ import annotations

from dataclasses import dataclass

from archive.lab.reporting import view
from archive.lab.source import LabSource
from schemas.address import parse_address

__all__ = ["PlanFigure", "plan_figure"]


@dataclass(frozen=True)
class PlanFigure:
    """A figure with its caption, or why there is none.

    Attributes
    ----------
    content : bytes or None
    caption : str
        What it shows; where there is no figure, the reason.
    """

    content: bytes | None
    caption: str


def plan_figure(source: LabSource, address: str, *, kind: str = "svg") -> PlanFigure:
    """Draw the figure of a reduction.

    Parameters
    ----------
    source : LabSource
    address : str
    kind : {"svg", "pdf"}

    Raises
    ------
    UnknownAddress
        If the archive holds no such reduction.
    """
    from archive.reports.figures import Undrawn, figure_of
    from archive.reports.scope import Scope

    document = source.reduction(address)
    scope = Scope([view(source, "", parse_address(address).head)], [document.address])
    drawn = figure_of(scope, document, kind=kind)
    if isinstance(drawn, Undrawn):
        return PlanFigure(None, f"There is no figure of {address}: {drawn.why}.")
    return PlanFigure(drawn.content, drawn.caption)
