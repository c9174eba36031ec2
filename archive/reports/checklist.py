"""The checklist of what methods chapters report: one item, one sentence, or the statement that its record does not exist.

Rules: no item vanishes. An item whose record is there gives its sentence; else a negative sentence stands in its place, and
completeness falls by one. Completeness is a count, never a grade.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from archive.reports.scope import Scope

__all__ = ["Item", "Said", "absence", "completeness", "sentence", "told"]

EXPERIMENTS = {
    "TO": "torsional oscillator",
    "FS": "adsorption",
    "PG": "porous substrate",
    "HC": "heat capacity",
    "TS": "third sound",
}


@dataclass(frozen=True)
class Said:
    """One sentence: its text, the record behind it, and whether the item is present."""

    text: str
    record: str
    present: bool = True


@dataclass(frozen=True)
class Item:
    """One item of the checklist.

    Parameters
    ----------
    code : str
        ``R01`` and so on.
    item : str
        What is reported, as the subject of a negative sentence.
    needed : tuple of str
        Experiments that need it; empty for all.
    section : str
        Key of the section it stands in.
    says : callable
        Sentences of a scope.
    """

    code: str
    item: str
    needed: tuple[str, ...]
    section: str
    says: Callable[[Scope], Iterable[Said]]

    def applies(self, experiments: tuple[str, ...]) -> bool:
        """Whether one of the experiments needs this item."""
        return not self.needed or any(each in self.needed for each in experiments)


def sentence(text: str, record: str) -> Said:
    """Return a positive sentence."""
    return Said(text, record)


def absence(item: str, record: str, *, reason: str = "not recorded") -> Said:
    """Return the negative sentence of an item (d.5: not possible to know)."""
    return Said(f"The record needed for {item} does not exist ({reason}).", record, present=False)


def told(item: Item, scope: Scope) -> list[Said]:
    """Return the sentences of an item; where nothing can be said, its negative sentence."""
    return list(item.says(scope)) or [absence(item.item, "the records of these cooldowns")]


def completeness(items: Iterable[Item], said: dict[str, list[Said]], scope: Scope) -> list[str]:
    """Return one count per experiment, such as ``torsional oscillator: 38 of 41 present, 3 stated as not recorded``."""
    lines = []
    for experiment in scope.experiments or ("",):
        needed = [
            each for each in items if each.code in said and (not each.needed or experiment in each.needed)
        ]
        present = sum(all(one.present for one in said[each.code]) for each in needed)
        name = EXPERIMENTS.get(experiment, "this work")
        lines.append(
            f"{name}: {present} of {len(needed)} present, {len(needed) - present} stated as not recorded or not done"
        )
    return lines
