"""The page of a cell, substrate, thermometer, calibration, sample, cryostat or plan: its life over all cooldowns."""

from __future__ import annotations

import json
from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from starlette.requests import Request
from starlette.responses import Response

from archive.errors import UnknownAddress
from archive.index import LifeResult, Resting
from archive.lab import Archive
from archive.lab.life import Life, Rests
from archive.reduction.calibration_comparison import Drift
from archive.reports.numbers import Shown, shown_value
from archive.web.life_drawing import calibrations_drawn, courses_drawn
from archive.web.page import page
from archive.web.site import lab_of
from archive.web.strips import Drawn, dash_of, mark_path
from archive.web.thing import thing
from schemas.address import Address
from schemas.lineage import Value
from schemas.plan import Plan
from schemas.thermometer import Calibration

__all__ = ["life"]

_LINKED = ("substrate", "thermometer", "made_from", "cell", "sample")
"""Fields of records that hold an address."""

_EVERY = 3


@dataclass(frozen=True)
class _Calibrations:
    """Calibrations of a thermometer as the page shows them."""

    every: tuple[Calibration, ...]
    drawn: Drawn | None
    against: list[Drift]
    drifts: list[Drift]


def life(request: Request, address: Address) -> Response:
    """Answer with the life story of a thing, or with what one revision of it says.

    Parameters
    ----------
    request : Request
    address : Address
        Of the thing or of a revision.

    Raises
    ------
    UnknownAddress
        If there is none.
    """
    lab = lab_of(request)
    try:
        found = lab.life(address.head)
    except UnknownAddress:
        # The refusal there says what else there is.
        return thing(request, address)
    one = address.text if address.kind == "record" else None
    chosen = [row for row in found.revisions if one in (None, row.address)]
    if not chosen:
        held = ", ".join(row.address for row in found.revisions)
        raise UnknownAddress(f"there is no {one} in this archive", expected=f"one of: {held}")
    calibrations = _calibrations(lab, found) if one is None else None
    # Temperatures are taken from calibrations, not from the thermometer.
    made = [] if calibrations is None else [each.address for each in calibrations.every]
    looks = {row.address: k for k, row in enumerate(found.revisions)}
    return page(
        request,
        "life.html.j2",
        address=address.text,
        life=found,
        one=one,
        chosen=chosen,
        marks={row.address: lab.marks(row.address) for row in found.revisions if found.kind != "plan"},
        looks=looks,
        mark_path=mark_path,
        dash_of=dash_of,
        drawn=courses_drawn(found.courses, found.uses, looks, name=found.name),
        shown=_shown,
        shown_mK=_shown_mK,
        calibrations=calibrations,
        resting={each: _grouped(lab.resting(each)) for each in (*(row.address for row in chosen), *made)},
        plan=Plan.model_validate_json(json.dumps(chosen[-1].content)) if found.kind == "plan" else None,
        linked=_LINKED,
        rows_told=_rows_told,
    )


def _shown(point: LifeResult) -> Shown:
    value = Value(value=point.value, uncertainty=point.uncertainty, unit=point.unit, scale=point.scale)
    return shown_value(value, point.quantity)


def _shown_mK(value: float, uncertainty: float) -> Shown:  # noqa: N802 - K is the unit
    """Return a difference of temperatures, given in K, in mK."""
    found = Value(value=value, uncertainty=uncertainty, unit="K")
    return shown_value(found, "temperature_difference", unit="mK")


def _calibrations(lab: Archive, found: Life) -> _Calibrations | None:
    if found.kind != "thermometer":
        return None
    every, against = lab.calibrations_against_last(found.name)
    if not every:
        return None
    return _Calibrations(
        every, calibrations_drawn(every, against), against, lab.calibration_drift(found.name)
    )


def _grouped(found: Rests) -> dict[str, object]:
    return {"direct": _by_cooldown(found.direct), "behind": _by_cooldown(found.behind), "cut": found.cut}


def _by_cooldown(rows: tuple[Resting, ...]) -> Mapping[str, Mapping[str, list[Resting]]]:
    """Reductions by cooldown and plan."""
    by: dict[str, dict[str, list[Resting]]] = defaultdict(lambda: defaultdict(list))
    for row in rows:
        by[row.cooldown][row.plan].append(row)
    return {cooldown: dict(plans) for cooldown, plans in sorted(by.items())}


def _rows_told(drift: Drift) -> Iterator[int]:
    """Yield the rows of a comparison that tell its course: every third, the last, and the most significant one."""
    if drift.found is not None:
        count = drift.found.difference.size
        yield from sorted({*range(0, count, _EVERY), count - 1, drift.found.worst})
