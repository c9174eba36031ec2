"""Outputs of a reduction as stored arrays and entries, and back.

``arrays/<name>`` holds the values, ``arrays/<name>.uncertainty`` the combined standard uncertainty,
``arrays/<name>.point`` the part that nothing shares, ``arrays/<name>.shared/<k>`` the signed contribution of the k-th
source of the document, from 0. Scalars stand in the document alone.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from archive.errors import UnknownAddress
from archive.reduction.digest import array_digest
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.source import ArrayReader
from schemas.lineage import OutputEntry, ReductionDocument, Value
from schemas.quantity import canonical, ucum

__all__ = ["Found", "Stored", "estimate_from", "output_arrays", "output_entry", "value_of"]

Stored = dict[str, tuple[FloatArray, dict[str, str]]]
"""Array and attributes by path."""


@dataclass(frozen=True)
class Found:
    """An output of a step under its name in the plan.

    Attributes
    ----------
    name, description : str
    estimate : Estimate
    step : int
        Number of the step, from 1.
    verdict : str or None
    """

    name: str
    description: str
    estimate: Estimate
    step: int
    verdict: str | None = None


def output_entry(found: Found) -> OutputEntry:
    """Return the entry of an output for the document."""
    estimate = found.estimate
    unit = canonical(estimate.quantity)
    common: dict[str, Any] = {
        "name": found.name, "quantity": estimate.quantity, "unit": unit, "ucum": ucum(unit), "description": found.description,
        "step": found.step, "scale": estimate.scale, "verdict": found.verdict, "digest": array_digest(estimate.value),
    }  # fmt: skip
    if not estimate.scalar:
        # A column's entry names its sources with their rms size; the columns themselves are arrays.
        sizes = {source: _rms(part) for source, part in estimate.shared.items()}
        return OutputEntry(**common, rows=int(estimate.value.size), shared=sizes)
    return OutputEntry(
        **common,
        value=_finite(float(estimate.value)),
        uncertainty=_finite(float(estimate.uncertainty)),
        point=_finite(float(estimate.points)),
        shared={source: float(part) for source, part in estimate.shared.items()},
    )


def output_arrays(found: Sequence[Found], sources: Sequence[str]) -> Stored:
    """Return the arrays of all outputs that are columns, with their attributes."""
    arrays: Stored = {}
    for each in found:
        estimate = each.estimate
        if estimate.scalar:
            continue
        unit = canonical(estimate.quantity)
        attributes = {
            "units": unit, "ucum": ucum(unit), "quantity": estimate.quantity, "description": each.description,
            "scale": estimate.scale or "", "step": str(each.step),
        }  # fmt: skip
        path = f"arrays/{each.name}"
        spread_kind = "temperature_difference" if estimate.quantity == "temperature" else estimate.quantity
        beside = {**attributes, "quantity": spread_kind}
        arrays[path] = (estimate.value, attributes)
        arrays[f"{path}.uncertainty"] = (
            estimate.uncertainty, {**beside, "description": f"combined standard uncertainty of {each.name}"},
        )  # fmt: skip
        arrays[f"{path}.point"] = (
            estimate.points, {**beside, "description": f"standard uncertainty of {each.name} that nothing else shares"},
        )  # fmt: skip
        for k, source in enumerate(sources):
            if source in estimate.shared:
                described = {**beside, "description": f"contribution to {each.name} of: {source}"}
                arrays[f"{path}.shared/{k}"] = (estimate.shared[source], described)
    return arrays


def estimate_from(document: ReductionDocument, reader: ArrayReader, name: str) -> Estimate:
    """Return an output of a reduction as it was stored.

    Parameters
    ----------
    document : ReductionDocument
    reader : callable
        Path to array; called only for columns.
    name : str

    Raises
    ------
    UnknownAddress
        The reduction has no such output.
    """
    entry = next((each for each in document.outputs if each.name == name), None)
    if entry is None:
        names = ", ".join(each.name for each in document.outputs)
        raise UnknownAddress(f"{document.address} has no output {name!r}", expected=f"one of {names}")
    if entry.rows is None:
        value = math.nan if entry.value is None else entry.value
        shared = {source: np.asarray(part) for source, part in entry.shared.items()}
        return Estimate(
            np.asarray(value), entry.quantity, np.asarray(entry.point or 0.0), shared, entry.scale
        )
    path = f"arrays/{name}"
    shared = {
        source.name: np.asarray(reader(f"{path}.shared/{k}"), dtype=np.float64)
        for k, source in enumerate(document.sources)
        if source.name in entry.shared
    }
    point = np.asarray(reader(f"{path}.point"), dtype=np.float64)
    return Estimate(np.asarray(reader(path), dtype=np.float64), entry.quantity, point, shared, entry.scale)


def value_of(estimate: Estimate) -> Value | None:
    """Return a scalar as programs read it; None for a column."""
    if not estimate.scalar:
        return None
    return Value(
        value=_finite(float(estimate.value)), uncertainty=_finite(float(estimate.uncertainty)),
        unit=canonical(estimate.quantity), scale=estimate.scale,
    )  # fmt: skip


def _finite(number: float) -> float | None:
    return number if math.isfinite(number) else None


def _rms(part: FloatArray) -> float:
    finite = part[np.isfinite(part)]
    return float(np.sqrt(np.mean(np.square(finite)))) if finite.size else 0.0
