"""The life story of a cell, substrate, thermometer, calibration, sample, cryostat or plan over all cooldowns.

What was found of it in the course of time, where it was used, how its revisions differ, and what rests on each of them.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import groupby, pairwise
from typing import Any, Final, cast

from archive.errors import UnknownAddress
from archive.index import LifeResult, RecordRow, Resting, RevisionRow, Use
from archive.index.life_queries import Role
from archive.lab.reducing import plans
from archive.lab.source import LabSource
from schemas.differences import differences

__all__ = ["Course", "Field", "Life", "Rests", "life", "resting"]

_COURSES: Final[Mapping[str, tuple[str, ...]]] = {
    "cell": (
        "empty_period", "empty_quality_factor", "quality_factor", "mass_sensitivity", "chi", "linear_velocity", "linear_amplitude",
        "dead_volume", "addenda_at_low", "resolution",
    ),
    "substrate": ("area", "onset_coverage", "monolayer"),
}  # fmt: skip
"""Headline results that tell of the thing itself, whatever plan found them; every other tells of what was in it."""
_EMPTY_ONLY: Final = ("quality_factor",)
"""What tells of the cell only while it is empty."""
_MOST_RESTING: Final = 300
# More points, or rows below them, are read by nobody.
_MOST_POINTS: Final = 400
# A list of more than this is told by its length: a calibration has hundreds of points.
_MOST_LISTED: Final = 8


@dataclass(frozen=True)
class Course:
    """One result in the course of time, oldest first; not empty, all of one kind and unit.

    Attributes
    ----------
    name : str
    points : tuple of LifeResult
        The newest 400.
    left_out : int
        How many are older.
    """

    name: str
    points: tuple[LifeResult, ...]
    left_out: int = 0


@dataclass(frozen=True)
class Field:
    """A field of all revisions side by side, as people write it; None where a revision says nothing.

    Attributes
    ----------
    name : str
    texts : tuple of str or None
        One for each revision.
    changed : tuple of bool
        Whether a revision says something else than the one before it.
    """

    name: str
    texts: tuple[str | None, ...]
    changed: tuple[bool, ...]


@dataclass(frozen=True)
class Rests:
    """What rests on something: reductions that took of it, and those that took of these.

    Attributes
    ----------
    direct, behind : tuple of Resting
    cut : bool
        Whether there are more.
    """

    direct: tuple[Resting, ...]
    behind: tuple[Resting, ...]
    cut: bool


@dataclass(frozen=True)
class Life:
    """A life story.

    Attributes
    ----------
    name, kind : str
    revisions : tuple of RecordRow
        Oldest first; plans are told in the same form.
    acts : mapping
        By address: how a revision came in, where that was outside a cooldown.
    fields : tuple of Field
    courses : tuple of Course
    uses : tuple of Use
        Cooldowns in order of time, the newest 400.
    more_uses : int
        How many are older.
    """

    name: str
    kind: str
    revisions: tuple[RecordRow, ...]
    acts: Mapping[str, RevisionRow]
    fields: tuple[Field, ...]
    courses: tuple[Course, ...]
    uses: tuple[Use, ...]
    more_uses: int = 0


def life(source: LabSource, name: str) -> Life:
    """Return the life story of a thing.

    Parameters
    ----------
    source : LabSource
    name : str
        Without a revision.

    Raises
    ------
    UnknownAddress
        If the archive holds no record or plan of that name.
    """
    revisions = _revisions(source, name)
    if not revisions:
        raise UnknownAddress(f"there is no record or plan {name} in this archive")
    kind = revisions[-1].kind
    uses = tuple(_uses(source, kind, name))
    return Life(
        name=name,
        kind=kind,
        revisions=revisions,
        acts={row.address: row for row in source.index.revisions(name=name)},
        fields=tuple(_fields([_content(source, row) for row in revisions])),
        courses=tuple(_courses(source, kind, name)),
        uses=uses[-_MOST_POINTS:],
        more_uses=max(len(uses) - _MOST_POINTS, 0),
    )


def _revisions(source: LabSource, name: str) -> tuple[RecordRow, ...]:
    rows = {row.address: row for row in source.index.records(name=name)}
    if not rows:
        found = {plan.address: plan for plan in plans(source) if plan.name == name}
        rows = {
            address: RecordRow(
                name, plan.revision, "plan", address, "", json.loads(plan.model_dump_json()), None
            )
            for address, plan in found.items()
        }
    return tuple(sorted(rows.values(), key=lambda row: row.revision))


def _content(source: LabSource, row: RecordRow) -> dict[str, Any]:
    """Content of a revision with its fields in the order of the sheet; the index keeps none."""
    return row.content if row.kind == "plan" else source.record(row.address).model_dump(mode="json")


def _fields(contents: Sequence[Mapping[str, Any]]) -> Iterator[Field]:
    texts = [
        {each.field: each.after for each in differences({}, _listed(content), leave_out=("name", "revision"))}
        for content in contents
    ]
    changed = [set[str]()] + [
        {each.field.partition(".")[0].partition("[")[0] for each in differences(one, other)}
        for one, other in pairwise(contents)
    ]
    for name in dict.fromkeys(name for content in contents for name in content):
        said = tuple(each.get(name) for each in texts)
        if any(said):
            yield Field(name, said, tuple(name in each for each in changed))


def _listed(content: Mapping[str, Any]) -> dict[str, Any]:
    return {name: _told(value) for name, value in content.items()}


def _told(value: Any) -> Any:
    """A list in words; what a list of words or numbers says is said without its brackets."""
    if isinstance(value, Mapping):
        return {name: _told(each) for name, each in value.items()}
    if not isinstance(value, list):
        return value
    if len(value) > _MOST_LISTED:
        return f"{len(value)} entries"
    return value if any(isinstance(each, Mapping | list) for each in value) else ", ".join(map(str, value))


def _courses(source: LabSource, kind: str, name: str) -> Iterator[Course]:
    if kind not in _COURSES:
        return
    found = source.index.life_results("cell" if kind == "cell" else "substrate", name, _COURSES[kind])
    for result in _COURSES[kind]:
        points = [
            each
            for each in found
            if each.name == result
            and each.value is not None
            and (each.empty_cell or result not in _EMPTY_ONLY)
        ]
        # A laboratory's own plan may call something else by the same name.
        points.sort(key=lambda each: (each.quantity, each.unit))
        for _, same in groupby(points, key=lambda each: (each.quantity, each.unit)):
            every = tuple(same)
            yield Course(result, every[-_MOST_POINTS:], max(len(every) - _MOST_POINTS, 0))


def _uses(source: LabSource, kind: str, name: str) -> Iterator[Use]:
    if kind in ("cell", "substrate", "sample", "thermometer", "calibration"):
        yield from source.index.uses(cast("Role", kind), name)
    elif kind == "cryostat":
        for row in source.index.cooldowns():
            if row.cryostat is not None and row.cryostat.partition(".r")[0] == name:
                yield Use(row.name, row.cryostat, row.sweeps, row.begin, row.end)


def resting(source: LabSource, address: str) -> Rests:
    """Return what rests on a record or plan, up to 300 reductions.

    Parameters
    ----------
    source : LabSource
    address : str
        Of a revision.
    """
    direct = source.index.resting_reductions(address, most=_MOST_RESTING + 1)
    seen = {each.reduction for each in direct}
    behind: list[Resting] = []
    waiting = [each.reduction for each in direct]
    while waiting and len(seen) <= _MOST_RESTING:
        for each in source.index.resting_reductions(waiting.pop(0), most=_MOST_RESTING + 1):
            if each.reduction not in seen:
                seen.add(each.reduction)
                behind.append(each)
                waiting.append(each.reduction)
    return Rests(
        tuple(direct[:_MOST_RESTING]),
        tuple(sorted(_first(behind, _MOST_RESTING - len(direct)), key=lambda each: each.reduction)),
        len(seen) > _MOST_RESTING,
    )


def _first(rows: Iterable[Resting], most: int) -> list[Resting]:
    return list(rows)[: max(most, 0)]
