"""Numbers for people: rounded to their uncertainty, with their unit."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

__all__ = ["readable", "shown_number", "shown_quantity"]

# Temperatures of one table are compared with each other, so they keep one unit.
_KEPT = frozenset({"K", "1"})


def shown_number(value: float | None, uncertainty: float | None = None) -> str:
    """Value with its standard uncertainty in brackets; six digits where none is stated, "-" where there is no value.

    Examples
    --------
    >>> shown_number(0.73124, 0.00119), shown_number(0.5), shown_number(None)
    ('0.7312(12)', '0.5', '-')
    """
    from schemas.uncertain_text import rounded

    if value is None or not math.isfinite(value):
        return "-"
    if uncertainty is not None and math.isfinite(uncertainty) and uncertainty > 0:
        return rounded(value, uncertainty).plain()
    return f"{value:.6g}"


def readable(value: float | None, uncertainty: float | None, unit: str) -> str:
    """Value with uncertainty and unit, in the unit that reads best when `unit` is the SI unit of a kind.

    Examples
    --------
    >>> readable(0.00100321409, 2.9e-13, "s"), readable(4.8213e-6, 5.5e-9, "mol"), readable(0.4587, 0.0011, "K")
    ('1.00321409000(29) ms', '4.8213(55) umol', '0.4587(11) K')
    """
    from schemas.kinds import kind_of_si
    from schemas.quantity import Quantity
    from schemas.uncertain_text import in_preferred_unit

    kind = kind_of_si(unit, value)
    if kind is not None and unit not in _KEPT and value is not None and math.isfinite(value):
        known = (
            uncertainty
            if uncertainty is not None and math.isfinite(uncertainty) and uncertainty > 0
            else None
        )
        best = in_preferred_unit(Quantity(value=value, uncertainty=known, unit=unit, kind=kind))
        value, uncertainty, unit = best.value, best.uncertainty, best.unit
    return " ".join(part for part in (shown_number(value, uncertainty), "" if unit == "1" else unit) if part)


def shown_quantity(content: Mapping[str, Any]) -> str:
    """Quantity of a JSON-like record, with unit and scale.

    Examples
    --------
    >>> shown_quantity({"value": 0.73124, "uncertainty": 0.00119, "unit": "K", "scale": "ITS-90"})
    '0.7312(12) K on ITS-90'
    """
    parts = [readable(content["value"], content.get("uncertainty"), content.get("unit") or "1")]
    parts += [content.get("convention") or "", f"on {content['scale']}" if content.get("scale") else ""]
    return " ".join(part for part in parts if part)
