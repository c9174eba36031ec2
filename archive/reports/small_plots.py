"""A small plot for each sweep: what it recorded, against what it went along."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from archive.reports.axis_units import axis_name, in_unit, offset_unit, symbol
from archive.reports.holdings import Holdings, Taken
from archive.reports.svg import Series, axis_of, plot
from schemas.kinds import KINDS
from schemas.lineage import ChannelEntry
from schemas.quantity import unit_factor

__all__ = ["Column", "sweep_plot", "temperature_of"]

Column = NDArray[np.float64]

# Along which kind, and which kinds are worth seeing, in order of liking.
_LIKED: dict[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "temperature-sweep": (("temperature",), ("period", "frequency", "dissipation", "amplitude", "resistance")),
    "dose-run": (("amount", "time"), ("period", "frequency")),
    "drive-sweep": (("drive",), ("amplitude", "voltage", "current")),
    "frequency-sweep": (("frequency",), ("amplitude", "voltage", "current")),
    "ringdown": (("time",), ("amplitude", "voltage", "current")),
    "isotherm": (("relative_pressure", "pressure_ratio", "pressure"), ("specific_amount", "amount")),
    "heat-capacity": (("temperature",), ("heat_capacity", "molar_heat_capacity", "specific_heat", "temperature_difference")),
    "persistent-current": (("time",), ("angular_momentum",)),
}  # fmt: skip


def temperature_of(held: Holdings, taken: Taken) -> tuple[Column, str] | None:
    """Return the temperatures of a sweep in K, from its reduction or its own channel."""
    for reduction in held.reductions_of(taken.sheet.name):
        if any(each.name == "temperature" and each.rows for each in reduction.outputs):
            found = held.column(reduction.address, "temperature")
            if found is not None:
                return found, "K"
    for channel in [] if taken.entry is None else taken.entry.channels:
        if channel.quantity == "temperature" and channel.use:
            found = held.column(_address(held, taken), channel.name)
            if found is not None:
                return found * unit_factor(channel.unit, "temperature"), "K"
    return None


def _address(held: Holdings, taken: Taken) -> str:
    return f"{held.view.newest.cooldown}/{taken.sheet.name}"


def _along(held: Holdings, taken: Taken, kind: str) -> tuple[Column, str, str] | None:
    """Return values, unit and kind of one column, reduced or as recorded."""
    if kind == "temperature":
        found = temperature_of(held, taken)
        return None if found is None else (*found, kind)
    if taken.entry is None:
        return None
    for reduction in held.reductions_of(taken.sheet.name):
        for output in reduction.outputs:
            if (
                output.quantity == kind
                and output.rows == taken.entry.rows
                and kind in ("amount", "relative_pressure")
            ):
                values = held.column(reduction.address, output.name)
                if values is not None:
                    return values, output.unit, kind
    wanted = "instant" if kind == "time" else kind
    channel = next((each for each in taken.entry.channels if each.quantity == wanted and each.use), None)
    if channel is None:
        return None
    values = held.column(_address(held, taken), channel.name)
    if values is None:
        return None
    return (values - np.nanmin(values), "s", "time") if wanted == "instant" else (values, channel.unit, kind)


def sweep_plot(held: Holdings, taken: Taken) -> str | None:
    """Return the plot of one sweep, or None where nothing can be drawn."""
    entry = taken.entry
    along, seen = _LIKED.get(taken.sheet.kind, (("time",), ()))
    x = next((found for kind in along if (found := _along(held, taken, kind)) is not None), None)
    if x is None or entry is None:
        return None
    if not seen:
        seen = tuple(
            channel.quantity for channel in entry.channels if channel.quantity not in ("instant", x[2])
        )
    channels = next((liked for kind in seen if (liked := _channels(entry.channels, kind))), [])
    columns = [(channel, held.column(_address(held, taken), channel.name)) for channel in channels[:2]]
    pairs = [
        (channel, values) for channel, values in columns if values is not None and values.shape == x[0].shape
    ]
    if not pairs:
        return None
    xs, x_unit = in_unit(x[0], x[1], x[2])
    ys = []
    unit = in_unit(pairs[0][1], pairs[0][0].unit, pairs[0][0].quantity)[1]
    for channel, values in pairs:
        factor = (
            unit_factor(channel.unit, channel.quantity) / unit_factor(unit, channel.quantity)
            if channel.quantity in KINDS
            else 1.0
        )
        ys.append(values * factor)
    ys, name = _less_offset(ys, pairs[0][0].quantity, unit)
    log = taken.sheet.kind == "ringdown" and all(bool((each[np.isfinite(each)] > 0).all()) for each in ys)
    x_axis, y_axis = axis_of(axis_name(x[2], x_unit), [xs]), axis_of(name, ys, log=log)
    if x_axis is None or y_axis is None:
        return None
    marks = taken.sheet.kind in ("drive-sweep", "dose-run", "isotherm")
    order = (
        np.arange(xs.size)
        if marks or taken.sheet.kind == "frequency-sweep"
        else np.argsort(xs, kind="stable")
    )
    series = [
        Series(xs[order], each[order], marks=marks, dash="0.8 0.5" if k else "") for k, each in enumerate(ys)
    ]
    names = " and ".join(channel.name for channel, _ in pairs)
    label = f"{taken.sheet.name}: {names} against {symbol(x[2])}, {x_axis.name} from {x_axis.low:.3g} to {x_axis.high:.3g}"
    return plot(x_axis, y_axis, series, label=label)


def _less_offset(columns: list[Column], kind: str, unit: str) -> tuple[list[Column], str]:
    """Return values less a round offset, in the unit that suits what is left, where they hardly differ; and the axis."""
    every = np.concatenate([each[np.isfinite(each)] for each in columns])
    if not every.size:
        return columns, axis_name(kind, unit)
    axis = offset_unit(float(every.min()), float(every.max()), kind, unit)
    return [(each - axis.offset) * axis.factor for each in columns], axis.name


def _channels(channels: tuple[ChannelEntry, ...], kind: str) -> list[ChannelEntry]:
    return [each for each in channels if each.quantity == kind and each.use]
