"""Lineage as a picture for pages: what a sweep became, or the graph behind one thing and that of what rests on it."""

from __future__ import annotations

from collections.abc import Callable

from archive.lab.forward import forward as lineage_forward
from archive.lab.marks import marked
from archive.lab.source import LabSource
from archive.lab.tracing import backward
from archive.reduction.facts import SweepFacts
from schemas.address import parse_address

__all__ = ["lineage_picture", "sweep_picture"]

Link = Callable[[str], str | None]


def sweep_picture(source: LabSource, facts: SweepFacts, *, link: Link) -> str | None:
    """Draw a sweep, its current reductions, and what these took.

    Parameters
    ----------
    source : LabSource
    facts : SweepFacts
    link : callable
        Page of an address.

    Returns
    -------
    str or None
        SVG; None where nothing is reduced.
    """
    from archive.reports.lineage_graph import cooldown_graph

    rows = source.index.reductions(sweep=facts.address, newest_only=True)
    documents = [source.reduction(row.address) for row in rows if not row.withdrawn]
    return cooldown_graph(facts.cooldown, [facts.entry], documents, link=link)


def lineage_picture(source: LabSource, address: str, *, forwards: bool, link: Link) -> str:
    """Draw the lineage of a thing down to raw files, or all that rests on it.

    Parameters
    ----------
    source : LabSource
    address : str
    forwards : bool
    link : callable
        Page of an address.

    Raises
    ------
    UnknownAddress
        If the archive holds no such thing.
    """
    from archive.reports.lineage_graph import trace_graph

    found = marked(source, lineage_forward(source, address) if forwards else backward(source, address))

    def page(key: str) -> str | None:
        # A step is shown on the page of its reduction.
        owner, step, number = key.partition(" step ")
        try:
            parse_address(owner)
        except ValueError:
            return None
        target = link(owner)
        return f"{target}#step-{number}" if target and step else target

    return trace_graph(found, forwards=forwards, link=page)
