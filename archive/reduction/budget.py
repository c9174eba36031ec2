"""The uncertainty budget of a result, from the contributions that its record keeps.

References
----------
JCGM 100:2008, Guide to the expression of uncertainty in measurement, H.1.4 and table H.1 (the form of a budget), from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from schemas.lineage import OutputEntry, ReductionDocument, SourceEntry, Value

__all__ = ["BudgetRow", "budget"]

OWN_POINTS = "the points of this result alone"


@dataclass(frozen=True)
class BudgetRow:
    """One line of a budget.

    Attributes
    ----------
    source, description : str
    level : str
        Whom it is common to: ``point`` is nobody else, then ``run``, ``cell``, ``laboratory``.
    stated : Value or None
        What is uncertain, with its standard uncertainty, where that is one number.
    distribution : str
    sensitivity : float or None
        Contribution over the standard uncertainty of what is stated: unit of the result over its unit.
    contribution : float
        To the combined standard uncertainty, with its sign, in the unit of the result; without sign for a fit, whose
        independent axes are one line.
    share : float
        Of the variance.
    """

    source: str
    description: str
    level: Literal["point", "run", "cell", "laboratory"]
    stated: Value | None
    distribution: str
    sensitivity: float | None
    contribution: float
    share: float


def budget(document: ReductionDocument, output: OutputEntry) -> tuple[BudgetRow, ...]:
    """Return the budget of a scalar result, the largest share first.

    Parameters
    ----------
    document : ReductionDocument
    output : OutputEntry
        One of its scalars.

    Returns
    -------
    tuple of BudgetRow
        Sources are independent of each other by construction, so the squares of the contributions add up to that of the
        combined standard uncertainty and the shares to 1; nothing for a result without a stated uncertainty.
    """
    if not output.uncertainty or output.value is None or output.rows is not None:
        return ()
    known = {each.name: each for each in document.sources}
    rows: list[BudgetRow] = []
    fits: dict[tuple[str | None, str], list[float]] = {}
    for name, part in output.shared.items():
        entry = known.get(name)
        if entry is not None and entry.description.startswith("fit of step "):
            fits.setdefault((entry.address, entry.description), []).append(part)
        elif part:
            rows.append(_row(name, entry, part, output.uncertainty))
    for (address, description), parts in fits.items():
        part = math.hypot(*parts)
        if part:
            row = SourceEntry(name=f"{address}, {description}", description=description, level="run")
            rows.append(_row(row.name, row, part, output.uncertainty))
    if output.point:
        rows.append(_row(OWN_POINTS, None, output.point, output.uncertainty))
    return tuple(sorted(rows, key=lambda each: (-each.share, each.source)))


def _row(name: str, entry: SourceEntry | None, part: float, uncertainty: float) -> BudgetRow:
    stated = None if entry is None else entry.stated
    u = None if stated is None else stated.uncertainty
    return BudgetRow(
        source=name,
        description="" if entry is None else entry.description,
        level="point" if entry is None else entry.level,
        stated=stated,
        distribution="normal" if entry is None else entry.distribution,
        sensitivity=part / u if u else None,
        contribution=part,
        share=(part / uncertainty) ** 2,
    )
