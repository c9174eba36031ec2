"""What differs between two contents, field by field.

Rules: numbers are compared as what they mean, so `0.1 mm` and `100 um` are no difference; a quantity whose value is the same
and whose uncertainty, scale, convention or source is not, differs. A list of named things is compared by name, any other by
place. What is nothing on both sides is not told.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from schemas.acts import Difference
from schemas.quantity import Quantity

__all__ = ["differences"]

_LONGEST = 300
# Two spellings of one value go through different products of floats.
_ALIKE = 1e-12


def differences(before: Any, after: Any, *, leave_out: Sequence[str] = ()) -> list[Difference]:
    """Fields that differ, in the order of the fields.

    Parameters
    ----------
    before, after : JSON values
        Such as `model_dump(mode="json")` of two records.
    leave_out : sequence of str
        Fields at the top that are not compared.

    Examples
    --------
    >>> old = {"gap": {"value": 0.1, "unit": "mm", "kind": "length"}, "seal": "indium"}
    >>> new = {"gap": {"value": 100.0, "unit": "um", "kind": "length"}, "seal": "none"}
    >>> [(each.field, each.before, each.after) for each in differences(old, new)]
    [('seal', 'indium', 'none')]
    """
    return [each for each in _walk("", before, after) if each.field.partition(".")[0] not in leave_out]


def _walk(path: str, before: Any, after: Any) -> Iterator[Difference]:
    if _empty(before) and _empty(after):
        return
    if _is_quantity(before) and _is_quantity(after):
        if not _same_quantity(before, after):
            yield _said(path, before, after)
    elif isinstance(before, Mapping) and isinstance(after, Mapping) and not _is_quantity({**before, **after}):
        for name in dict.fromkeys([*before, *after]):
            yield from _walk(f"{path}.{name}" if path else str(name), before.get(name), after.get(name))
    elif isinstance(before, list | tuple) and isinstance(after, list | tuple):
        yield from _lists(path, before, after)
    elif not _same(before, after):
        yield _said(path, before, after)


def _lists(path: str, before: Sequence[Any], after: Sequence[Any]) -> Iterator[Difference]:
    if _all_named(before) and _all_named(after):
        old = {each["name"]: each for each in before}
        new = {each["name"]: each for each in after}
        for name in dict.fromkeys([*old, *new]):
            yield from _walk(f"{path}.{name}", old.get(name), new.get(name))
        return
    for place in range(max(len(before), len(after))):
        one = before[place] if place < len(before) else None
        other = after[place] if place < len(after) else None
        yield from _walk(f"{path}[{place + 1}]", one, other)


def _all_named(things: Sequence[Any]) -> bool:
    return all(isinstance(each, Mapping) and isinstance(each.get("name"), str) for each in things)


def _empty(value: Any) -> bool:
    return value is None or (isinstance(value, list | tuple | Mapping | str) and not value)


def _is_quantity(value: Any) -> bool:
    return isinstance(value, Mapping) and {"value", "unit", "kind"} <= set(value)


def _same_quantity(before: Mapping[str, Any], after: Mapping[str, Any]) -> bool:
    words = ("kind", "scale", "convention", "known", "source")
    if any((before.get(word) or None) != (after.get(word) or None) for word in words):
        return False
    one, other = Quantity.read(dict(before), before["kind"]), Quantity.read(dict(after), after["kind"])
    return _close(one.si, other.si) and _close(one.si_uncertainty, other.si_uncertainty)


def _close(one: float | None, other: float | None) -> bool:
    if one is None or other is None:
        return one is other
    return math.isclose(one, other, rel_tol=_ALIKE)


def _same(before: Any, after: Any) -> bool:
    # In Python True equals 1.
    numbers = all(isinstance(each, int | float) and not isinstance(each, bool) for each in (before, after))
    return bool(before == after and (numbers or type(before) is type(after)))


def _said(path: str, before: Any, after: Any) -> Difference:
    return Difference(field=path or ".", before=_text(before), after=_text(after))


def _text(value: Any) -> str | None:
    if _empty(value):
        return None
    if _is_quantity(value):
        text = str(value.get("text") or Quantity.read(dict(value), value["kind"]).format())
        source = value.get("source")
        value = f"{text} ({source})" if source else text
    if isinstance(value, Mapping):
        value = ", ".join(f"{name} {_text(each)}" for name, each in value.items() if not _empty(each))
    text = value if isinstance(value, str) else json.dumps(value, ensure_ascii=False)
    return text if len(text) <= _LONGEST else text[: _LONGEST - 3] + "..."
