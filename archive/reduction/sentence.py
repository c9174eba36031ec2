"""Sentences of steps, filled with the actual numbers.

A placeholder that nothing fills says so in words; it is never left out silently.
"""

from __future__ import annotations

import math
import string
from collections.abc import Mapping
from typing import Any

import numpy as np
from typing_extensions import override

from archive.reduction.estimate import Estimate
from schemas.quantity import Quantity, canonical
from schemas.uncertain_text import in_preferred_unit, plain_text

__all__ = ["filled", "number_text", "quantity_text"]


class _Words(string.Formatter):
    """Formatter that takes names only: no attribute or index access."""

    def __init__(self, words: Mapping[str, str]) -> None:
        self._words = words

    @override
    def get_field(self, field_name: str, args: Any, kwargs: Any) -> tuple[str, str]:
        """Return the words for a name, or the statement that it is not recorded."""
        return self._words.get(field_name, f"[{field_name} is not recorded]"), field_name


def filled(template: str, words: Mapping[str, str]) -> str:
    """Return the template with each ``{name}`` replaced.

    Examples
    --------
    >>> filled("Q is {Q}, from {n} points.", {"Q": "5.1(2)e5"})
    'Q is 5.1(2)e5, from [n is not recorded] points.'
    """
    return _Words(words).vformat(template, (), {})


def quantity_text(estimate: Estimate) -> str:
    """Return a scalar with uncertainty and unit, e.g. ``0.7312(12) K``, or a column as its range."""
    if not estimate.scalar:
        return _range_text(estimate)
    value = float(estimate.value)
    if not math.isfinite(value):
        return "no value"
    spread = float(estimate.uncertainty)
    if 0 < spread < math.inf:
        stated = Quantity(
            value=value, unit=canonical(estimate.quantity), kind=estimate.quantity, uncertainty=spread
        )
        return plain_text(in_preferred_unit(stated))
    return _rounded_text(value, estimate.quantity, digits=6)


def _rounded_text(value: float, kind: str, *, digits: int) -> str:
    return plain_text(
        in_preferred_unit(Quantity(value=float(f"{value:.{digits}g}"), unit=canonical(kind), kind=kind))
    )


def _range_text(estimate: Estimate) -> str:
    finite = estimate.value[np.isfinite(estimate.value)]
    if finite.size == 0:
        return "no value"
    low, high = (
        _rounded_text(float(value), estimate.quantity, digits=5) for value in (finite.min(), finite.max())
    )
    return low if low == high else f"{low} to {high}"


def number_text(value: object) -> str:
    """Return a parameter or fact as it stands in a sentence."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.5g}"
    if isinstance(value, (list, tuple)):
        return ", ".join(number_text(each) for each in value)
    return "none" if value is None else str(value)
