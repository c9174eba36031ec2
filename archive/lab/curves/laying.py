"""What may be laid over what: quantities of one kind, in one unit, of one convention; anything else is refused in words.

Rules: nothing is converted in silence. A temperature scale is told and not converted, since the difference of two scales is a
matter of how they were realised.
"""

from __future__ import annotations

from dataclasses import dataclass

from archive.lab.curves.columns import DrawnColumn
from archive.lab.curves.leaf import Leaf
from schemas.kinds import KINDS
from schemas.quantity import Quantity, unit_factor

__all__ = ["Laid", "laid", "partner"]


@dataclass(frozen=True)
class Laid:
    """Whether one column may be laid over another.

    Attributes
    ----------
    factor : float or None
        What the other's values are multiplied with; None if it may not.
    told : str
        A sentence where something is to be said; "" otherwise.
    """

    factor: float | None
    told: str = ""


def laid(first: DrawnColumn, other: DrawnColumn) -> Laid:
    """Whether a column may stand on the axis of another.

    Parameters
    ----------
    first, other : DrawnColumn

    Examples
    --------
    >>> P = DrawnColumn("2026-03/s017", "period", "period", "us", "", 3, "5f")
    >>> f = DrawnColumn("2025-11/s003", "frequency", "frequency", "Hz", "", 3, "a0")
    >>> print(laid(P, f).told)
    2025-11/s003#frequency is a frequency, 2026-03/s017#period a period: not laid over.
    """
    if first.kind != other.kind:
        kinds = (_with_article(other.kind), _with_article(first.kind))
        return Laid(None, f"{other.address} is {kinds[0]}, {first.address} {kinds[1]}: not laid over.")
    if other.convention != first.convention:
        said = [each.convention or "not stated to be one" for each in (other, first)]
        return Laid(
            None,
            f"{other.address} is {said[0]}, {first.address} {said[1]} (rms, peak, gauge and absolute are different numbers): not laid over.",
        )
    if first.unit == other.unit or first.kind == "instant":
        return Laid(1.0, _scales(first, other))
    if first.kind not in KINDS or _si(first) != _si(other):
        return Laid(
            None, f"{other.address} is in {other.unit}, {first.address} in {first.unit}: not laid over."
        )
    factor = unit_factor(other.unit, other.kind) / unit_factor(first.unit, first.kind)
    told = f"{other.address} is stored in {other.unit} and drawn in {first.unit}."
    return Laid(factor, " ".join(filter(None, (told, _scales(first, other)))))


def _si(column: DrawnColumn) -> str:
    return Quantity(value=1.0, unit=column.unit, kind=column.kind).si_unit


def _scales(first: DrawnColumn, other: DrawnColumn) -> str:
    if first.scale == other.scale:
        return ""
    names = [each.scale or "a scale that is not stated" for each in (other, first)]
    return (
        f"{other.address} is on {names[0]}, {first.address} on {names[1]}: drawn as recorded, not converted."
    )


def _with_article(kind: str) -> str:
    return KINDS[kind].words if kind in KINDS else f"a {kind.replace('_', ' ')}"


def partner(leaf: Leaf, name: str, of: DrawnColumn) -> DrawnColumn | None:
    """The column of another sweep or reduction that answers to one; None if it has none.

    Parameters
    ----------
    leaf : Leaf
        The other one.
    name : str
        The name under which the first leaf has its column.
    of : DrawnColumn
        That column.
    """
    bare = name.partition("@")[0]
    plan = of.owner.partition("@")[2].rpartition(".")[0]
    if plan:
        for each in leaf.columns.values():
            if each.name == bare and each.owner.partition("@")[2].rpartition(".")[0] == plan:
                return each
    if bare in leaf.columns:
        return leaf.columns[bare]
    same = [
        each for each in leaf.columns.values()
        if each.kind == of.kind and not each.why_not and ("@" in each.owner) == ("@" in of.owner)
    ]  # fmt: skip
    if not same and of.kind == "temperature":
        # A thermometer that was calibrated beforehand records what another is reduced to.
        same = [each for each in leaf.columns.values() if each.kind == of.kind]
    return same[0] if same else None
