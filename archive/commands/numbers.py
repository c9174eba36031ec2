"""Numbers for people: rounded to their uncertainty, with their unit."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

__all__ = ["shown_number", "shown_quantity"]


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


def shown_quantity(content: Mapping[str, Any]) -> str:
    """Quantity of a JSON-like record, with unit and scale.

    Examples
    --------
    >>> shown_quantity({"value": 0.73124, "uncertainty": 0.00119, "unit": "K", "scale": "ITS-90"})
    '0.7312(12) K on ITS-90'
    """
    unit = content.get("unit") or ""
    parts = [shown_number(content["value"], content.get("uncertainty")), "" if unit == "1" else unit]
    parts += [content.get("convention") or "", f"on {content['scale']}" if content.get("scale") else ""]
    return " ".join(part for part in parts if part)
