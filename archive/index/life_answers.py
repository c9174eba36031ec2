"""What a life story is told from: what was found of a thing, where it was used, and what rests on it."""

from __future__ import annotations

from datetime import datetime
from typing import NamedTuple

__all__ = ["LifeResult", "Resting", "Use"]


class LifeResult(NamedTuple):
    """A result of a current reduction in its own unit, with the revision of the thing that its sweep names, and when the sweep began."""

    reduction: str
    cooldown: str
    sweep: str
    name: str
    quantity: str
    unit: str
    description: str
    scale: str | None
    value: float | None
    uncertainty: float | None
    verdict: str | None
    record: str
    begin: datetime | None
    empty_cell: bool


class Use(NamedTuple):
    """A cooldown that used a revision of a thing: in how many sweeps, and when these began and ended."""

    cooldown: str
    record: str
    sweeps: int
    begin: datetime | None
    end: datetime | None


class Resting(NamedTuple):
    """A reduction that took a record, or followed it if it is a plan."""

    reduction: str
    cooldown: str
    plan: str
    newest: bool
    withdrawn: bool
