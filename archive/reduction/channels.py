"""Channels of a sweep as estimates in SI units: the one place where a column's unit is turned into SI.

Also: which channel a plan means (``@thermometer``, ``@period``), what a stated uncertainty is, and oscillating
quantities as rms values.
"""

from __future__ import annotations

import math
import re

import numpy as np

from archive.errors import BadRequest
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.facts import SweepFacts
from archive.reduction.source import Source
from schemas.lineage import SourceEntry, Value
from schemas.quantity import Quantity, canonical, unit_factor
from schemas.sweep import Channel

__all__ = [
    "CONVERTED",
    "channel_estimate",
    "channel_meant",
    "rms_factor",
    "rms_value",
    "stated_convention",
    "stated_uncertainty",
]

CONVERTED = {"period": "frequency", "dissipation": "quality_factor"}
"""A kind that a plan asks for, and the kind whose inverse serves as well."""

_RMS = {"rms": 1.0, "peak": 1 / math.sqrt(2), "peak-to-peak": 1 / (2 * math.sqrt(2)), None: 1.0}
"""Factor to the rms value of a sine."""

_OSCILLATING = frozenset({"amplitude", "drive", "voltage", "current", "velocity"})
_SHARE = re.compile(r"^\s*([0-9]+(?:\.[0-9]*)?(?:[eE][-+]?[0-9]+)?)\s*(%|ppm|ppb)\s*$")
_SHARES = {"%": 1e-2, "ppm": 1e-6, "ppb": 1e-9}


def channel_meant(facts: SweepFacts, name: str) -> str | None:
    """Return the channel that a plan means, or None if the sweep has none.

    Parameters
    ----------
    facts : SweepFacts
    name : str
        A channel's name, ``@thermometer``, ``@calibrates`` (that of the thermometer under calibration), or ``@KIND`` for the only channel of a quantity kind (or of the kind whose
        inverse serves as well).

    Raises
    ------
    BadRequest
        Several channels fit, or the one meant is not to be used.
    """
    used = {
        n: c for n, c in facts.channels.items() if c.use and any(e.name == n for e in facts.entry.channels)
    }
    if name == "@thermometer":
        return _thermometer(facts, used)
    if name == "@calibrates":
        return None if facts.sweep.calibrates is None else channel_meant(facts, facts.sweep.calibrates)
    if not name.startswith("@"):
        if name in facts.channels and not facts.channels[name].use:
            raise BadRequest(
                f"channel {facts.address}#{name} is kept and not to be reduced with: {facts.channels[name].why_not}",
                remedy="take another channel, or supplement the cooldown with a sheet that says why it may be used",
            )
        return name if name in used else None
    kind = name[1:]
    for wanted in (kind, CONVERTED.get(kind)):
        fitting = [n for n, c in used.items() if c.quantity == wanted]
        if len(fitting) == 1:
            return fitting[0]
        if wanted in fitting:
            return wanted
        if fitting:
            raise BadRequest(
                f"sweep {facts.address} has {len(fitting)} channels of {wanted}: {', '.join(fitting)}",
                expected=f"one, or one named {wanted}",
                remedy=f"copy the plan and write channel:{fitting[0]} in place of channel:{name}",
            )
    return None


def _thermometer(facts: SweepFacts, used: dict[str, Channel]) -> str | None:
    stated = facts.sweep.thermometer
    if stated is not None:
        return channel_meant(facts, stated)
    fitting = [n for n, c in used.items() if c.quantity == "temperature" or c.thermometer or c.calibration]
    if len(fitting) > 1:
        raise BadRequest(
            f"sweep {facts.address} has {len(fitting)} channels that read a temperature: {', '.join(fitting)}",
            field=f"sweep[{facts.sweep.name}].thermometer",
            expected="the channel whose temperature counts",
            remedy="name it in the sheet and supplement the cooldown",
        )
    return fitting[0] if fitting else None


def channel_estimate(
    source: Source, facts: SweepFacts, name: str
) -> tuple[Estimate, tuple[SourceEntry, ...]]:
    """Return a channel in SI units with its uncertainty, and the sources that it introduces.

    Raises
    ------
    BadRequest
        The unit is missing or not one of the kind, a pressure is a gauge pressure, or an uncertainty cannot be read.
    """
    stored, channel = facts.stored(name), facts.channels[name]
    place = f"{facts.address}#{name}"
    raw = np.asarray(source.column(facts.accession.address, facts.entry.name, name), dtype=np.float64)
    if channel.quantity == "instant":
        return Estimate(raw, "time"), ()
    if not stored.unit:
        raise BadRequest(
            f"channel {place} has no unit", field=f"channels.{name}.unit", expected=f"a unit of {channel.quantity}",
            remedy="add the unit to the sheet and supplement the cooldown",
        )  # fmt: skip
    if channel.convention == "gauge":
        raise BadRequest(
            f"channel {place} is a gauge pressure, and the ambient pressure of each reading is not recorded",
            expected="absolute pressures",
            remedy="record absolute pressures, or a correction of kind zero with the ambient pressure and its uncertainty",
        )
    try:
        factor = unit_factor(stored.unit, channel.quantity)
    except ValueError as error:
        raise BadRequest(
            f"channel {place}: {error}", field=f"channels.{name}.unit", remedy="correct the unit"
        ) from None
    factor *= rms_factor(facts, channel)
    value = raw * factor
    part = _uncertainty(channel, value, factor, place)
    if channel.uncertainty_is == "point" or not np.any(part > 0):
        return Estimate(value, channel.quantity, point=part, scale=channel.scale), ()
    entry = SourceEntry(
        name=f"uncertainty of {place}", description=f"stated uncertainty of channel {name}, common to all rows", level="run",
        address=place, stated=_common(part, channel.quantity),
    )  # fmt: skip
    return Estimate(value, channel.quantity, shared={entry.name: part}, scale=channel.scale), (entry,)


def _common(part: FloatArray, kind: str) -> Value | None:
    """Return an uncertainty that is the same for all rows; None where it grows with the value."""
    if np.ptp(part) > 0:
        return None
    return Value(value=None, uncertainty=float(part[0]), unit=canonical(kind))


def rms_factor(facts: SweepFacts, channel: Channel) -> float:
    """Return the factor that takes a channel's readings to rms values; 1 for a channel that does not oscillate."""
    if channel.quantity not in _OSCILLATING:
        return 1.0
    return _RMS.get(stated_convention(facts, channel), 1.0)


def stated_convention(facts: SweepFacts, channel: Channel) -> str | None:
    """Return what a channel's readings are (``rms``, ``peak``, ``gauge``, ...) as the sheet says it; None if it does not."""
    detection = facts.accession.sheet.detection_of(facts.sweep)
    if channel.convention is None and channel.quantity == "amplitude" and detection is not None:
        return detection.amplitude_convention
    return channel.convention


def stated_uncertainty(facts: SweepFacts, name: str, readings: FloatArray) -> FloatArray | None:
    """Return the standard uncertainty that the sheet states of a channel's readings, in the unit they are stored in.

    Parameters
    ----------
    facts : SweepFacts
    name : str
        A channel with a unit.
    readings : ndarray
        As stored.

    Returns
    -------
    ndarray or None
        None where none is stated.

    Raises
    ------
    BadRequest
        The uncertainty cannot be read.
    """
    channel = facts.channels[name]
    if channel.uncertainty is None:
        return None
    factor = unit_factor(facts.stored(name).unit, channel.quantity) * rms_factor(facts, channel)
    return _uncertainty(channel, readings * factor, factor, f"{facts.address}#{name}") / factor


def rms_value(quantity: Quantity, unstated: str | None = None) -> float:
    """Return the factor that takes an oscillating quantity's SI value to its rms value; 1 for any other.

    Parameters
    ----------
    quantity : Quantity
    unstated : str, optional
        Convention of an amplitude that states none: that of the detection.
    """
    if quantity.kind not in _OSCILLATING:
        return 1.0
    stated = quantity.convention or (unstated if quantity.kind == "amplitude" else None)
    return _RMS.get(stated, 1.0)


def _uncertainty(channel: Channel, value: FloatArray, factor: float, place: str) -> FloatArray:
    if channel.uncertainty is None:
        return np.zeros(value.shape)
    share = _SHARE.match(channel.uncertainty)
    if share is not None:
        part = np.abs(value) * float(share[1]) * _SHARES[share[2]]
        return np.where(np.isnan(part), 0.0, part)
    kind = "temperature_difference" if channel.quantity == "temperature" else channel.quantity
    try:
        stated = Quantity.parse(channel.uncertainty, kind)
    except ValueError as error:
        raise BadRequest(
            f"uncertainty of channel {place}: {error}",
            expected="a quantity such as `2 ns` or a share such as `0.01 %`",
        ) from None
    # A convention written beside the uncertainty itself counts; otherwise it is that of the channel.
    unit_si = unit_factor(channel.unit or "1", channel.quantity)
    own = rms_value(stated) if stated.convention else factor / unit_si
    return np.full(value.shape, abs(stated.si) * own)
