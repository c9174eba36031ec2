"""Conversions at the bench: any quantity kind, temperature scales, layers of a substrate.

Rules: what has no fixed relation is refused with the reason; the convention of a value (rms, gauge) and its scale are
kept or converted on purpose, never dropped.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final, Literal, cast

from schemas.kind_units import accepted_unit
from schemas.kinds import KINDS, kind_of
from schemas.layers import LAYER_WORDS, Layer, no_substrate
from schemas.quantity import Quantity
from schemas.quantity_text import StatedText, stated_text
from schemas.units import parse_unit

if TYPE_CHECKING:
    from collections.abc import Sequence

__all__ = ["Converted", "converted", "in_display_units", "on_its90"]

_SINE: Final = frozenset({"rms", "peak", "peak-to-peak"})
_TARGET: Final = re.compile(r"(?P<unit>.*?)(?: (?P<convention>rms|peak-to-peak|peak|absolute|gauge))?$")
# The names that this trade gives to temperature scales, with or without a conversion here.
_SCALE_NAME: Final = re.compile(r"(ITS|IPTS|PLTS|EPT|PTB|NBS|T|L)-?[0-9]{2,4}|55E|local:\S+", re.IGNORECASE)


@dataclass(frozen=True)
class Converted:
    """A converted quantity and how it came about.

    Attributes
    ----------
    before, after : str
        For people.
    value, uncertainty, unit : float, float or None, str
        The result.
    kind : str
        Quantity kind.
    scale, convention : str or None
        Of the result.
    method : str or None
        One sentence, where the conversion is more than a change of unit.
    """

    before: str
    after: str
    value: float
    uncertainty: float | None
    unit: str
    kind: str
    scale: str | None = None
    convention: str | None = None
    method: str | None = None


def converted(
    text: str,
    target: str,
    *,
    scale: str | None = None,
    kind: str | None = None,
    layer: Callable[[], Layer] | None = None,
) -> Converted:
    """Quantity of a text in another unit, convention or temperature scale.

    Parameters
    ----------
    text : str
        Such as `31.4(6) umol/m^2`, `5 V rms`, `1.5 K`, `2.4 layers`.
    target : str
        A unit, with a convention if one is wanted (`V peak`), or a temperature scale.
    scale : str, optional
        Temperature scale of the text.
    kind : str, optional
        Quantity kind, where a unit alone leaves it open.
    layer : callable, optional
        Gives the layer of the substrate that was named.

    Raises
    ------
    ValueError
        If there is no such conversion; the sentence says why.
    """
    goal = target.strip()
    stated = stated_text(text, expectation="a quantity such as 31.4 umol/m^2")
    if _SCALE_NAME.fullmatch(goal):
        return _to_scale(text, stated, goal, scale)
    if stated.unit in LAYER_WORDS or goal in LAYER_WORDS:
        return _layers(text, stated, goal, layer)
    found = _TARGET.match(goal)
    unit, convention = (found["unit"], found["convention"]) if found else (goal, None)
    quantity = _quantity(text, stated, unit, kind)
    if scale is not None:
        quantity = replace(quantity, scale=_one_scale(quantity, scale), text="")
    result = _in_convention(quantity, convention).to(unit)
    return Converted(
        _written(text, scale), _shown(result), result.value, result.uncertainty, result.unit, result.kind, result.scale,
        result.convention,
    )  # fmt: skip


def in_display_units(text: str, *, kind: str | None = None) -> list[Converted]:
    """Quantity of a text in every unit that this trade reads its kind in.

    Raises
    ------
    ValueError
        If the text is no quantity.
    """
    stated = stated_text(text, expectation="a quantity such as 31.4 umol/m^2")
    quantity = _quantity(text, stated, stated.unit, kind)
    units = dict.fromkeys(
        (quantity.si_unit, *kind_of(quantity.kind).display, *kind_of(quantity.kind).examples)
    )
    same = [unit for unit in units if accepted_unit(unit, quantity.kind)[2] == quantity.si_unit]
    results = [quantity.to(unit) for unit in same]
    return [
        Converted(
            text, _shown(one), one.value, one.uncertainty, one.unit, one.kind, one.scale, one.convention
        )
        for one in results
    ]


def on_its90(text: str) -> tuple[Quantity, str | None]:
    """Temperature on ITS-90, and the sentence on the conversion if it was on another scale.

    Raises
    ------
    ValueError
        If the text is no temperature, or its scale has no conversion there.
    """
    quantity = Quantity.parse(text, "temperature")
    if quantity.scale in (None, "ITS-90"):
        return replace(quantity, scale="ITS-90", text=""), None
    result = _to_scale(text, stated_text(text, expectation="a temperature"), "ITS-90", None)
    there = Quantity(
        value=result.value,
        uncertainty=result.uncertainty,
        unit=result.unit,
        kind="temperature",
        scale="ITS-90",
    )
    return there, result.method


def _written(text: str, scale: str | None) -> str:
    """Return what a person wrote, with the scale that an option added."""
    return text if scale is None or f"on {scale}" in text else f"{text} on {scale}"


def _shown(quantity: Quantity) -> str:
    return replace(quantity, text="").format()


def _fitting(unit: str) -> tuple[list[str], list[str]]:
    """Kinds that take a unit, and the reasons of those that have its dimension and do not."""
    dimension = parse_unit(unit or "1").dimension
    takes, reasons = [], []
    for name, kind in KINDS.items():
        try:
            accepted_unit(unit, name)
        except ValueError as error:
            if any(parse_unit(si).dimension == dimension for si in kind.si):
                reasons.append(str(error))
        else:
            takes.append(name)
    return takes, reasons


def _quantity(text: str, stated: StatedText, unit: str, kind: str | None) -> Quantity:
    """Quantity of the first kind that takes both units; the factor is the same for every such kind."""
    if kind is not None:
        quantity = Quantity.parse(text, kind)
        accepted_unit(unit, kind)
        return quantity
    parse_unit(unit)
    mine, why_not = _fitting(stated.unit)
    if not mine:
        raise ValueError(
            why_not[0] if why_not else f"found {text!r}; no quantity of this trade has the unit {stated.unit}"
        )
    theirs, _ = _fitting(unit)
    refused: list[str] = []
    for name in (name for name in mine if name in theirs):
        try:
            if accepted_unit(stated.unit, name)[2] == accepted_unit(unit, name)[2]:
                return Quantity.parse(text, name)
        except ValueError as error:
            refused.append(str(error))
    raise ValueError(refused[0] if refused else _no_relation(stated.unit, mine, unit, theirs))


def _no_relation(mine: str, kinds: Sequence[str], theirs: str, others: Sequence[str]) -> str:
    """Why two units do not convert: the answer that a kind has ready, else what each of them measures."""
    for kind, unit in ((kinds[0], theirs), *((other, mine) for other in others)):
        try:
            accepted_unit(unit, kind)
        except ValueError as error:
            if str(error).count(";") > 1:
                return str(error)
    second = kind_of(others[0]).words if others else "no quantity of this trade"
    return (
        f"{mine or 'a number without a unit'} measures {kind_of(kinds[0]).words} and {theirs} measures {second}; "
        "no fixed relation turns one into the other"
    )


def _in_convention(quantity: Quantity, wanted: str | None) -> Quantity:
    if wanted is None or wanted == quantity.convention:
        return quantity
    if wanted in _SINE:
        return replace(quantity.for_sine(cast("Literal['rms', 'peak', 'peak-to-peak']", wanted)), text="")
    if quantity.convention is None:
        raise ValueError(
            f"found {quantity.text!r}, which does not say whether it is absolute or gauge; write it after the unit"
        )
    raise ValueError(
        f"a {quantity.convention} pressure becomes {wanted} only with the pressure of the room; measure it, then add or subtract"
    )


def _one_scale(quantity: Quantity, scale: str) -> str:
    if not kind_of(quantity.kind).scaled:
        raise ValueError(
            f"found scale {scale!r} with {kind_of(quantity.kind).words}; only a temperature is on a scale"
        )
    if quantity.scale is not None and quantity.scale != scale:
        raise ValueError(
            f"found two scales, {quantity.scale} in {quantity.text!r} and {scale} in --scale; keep the one that is true"
        )
    return scale


def _to_scale(text: str, stated: StatedText, target: str, scale: str | None) -> Converted:
    from archive.physics.scales import convert

    if stated.unit in LAYER_WORDS or "temperature" not in _fitting(stated.unit)[0]:
        raise ValueError(f"found {text!r} to be put on {target}; only a temperature is on a scale")
    quantity = Quantity.parse(text, "temperature")
    if scale is not None:
        quantity = replace(quantity, scale=_one_scale(quantity, scale), text="")
    if quantity.scale is None:
        raise ValueError(f"found {text!r} without its scale; name it with --scale, such as --scale T58")
    result = convert(quantity.si, source=quantity.scale, target=target)
    added = float(result.uncertainty)
    spread: float | None = None
    if quantity.si_uncertainty is not None:
        slope = _slope(
            lambda T: float(convert(T, source=quantity.scale or "", target=target).temperature), quantity.si
        )
        spread = math.hypot(slope * quantity.si_uncertainty, added)
    elif added > 0:
        spread = added
    there = Quantity(
        value=float(result.temperature), uncertainty=spread, unit="K", kind="temperature", scale=target
    )
    there = there.to(quantity.unit)
    method = result.method
    if added > 0:
        method += f"; the conversion adds a standard uncertainty of {added * 1e3:.2g} mK"
        if quantity.si_uncertainty is None:
            method += ", and that of the temperature itself was not stated"
    return Converted(
        _written(text, scale),
        _shown(there),
        there.value,
        there.uncertainty,
        there.unit,
        "temperature",
        target,
        method=method,
    )


def _slope(function: Callable[[float], float], at: float) -> float:
    """Slope of a conversion by the difference over 2 mK, one-sided at the end of a range."""
    step = 1e-3
    ends = []
    for place in (at - step, at + step):
        try:
            ends.append((place, function(place)))
        except ValueError:
            ends.append((at, function(at)))
    (left, low), (right, high) = ends
    return (high - low) / (right - left) if right > left else 1.0


def _layers(text: str, stated: StatedText, goal: str, layer: Callable[[], Layer] | None) -> Converted:
    if layer is None:
        raise ValueError(no_substrate("--substrate NAME"))
    both = stated.unit in LAYER_WORDS and goal in LAYER_WORDS
    if not both:
        accepted_unit(goal if stated.unit in LAYER_WORDS else stated.unit, "coverage")
    one = layer()
    method = f"one layer on {one.address} is {one.coverage.format()}: {one.definition}"
    if both:
        return Converted(text, text, stated.value, stated.uncertainty, "layers", "number", method=method)
    of_layer = (one.coverage.si_uncertainty or 0.0) / one.coverage.si
    if stated.unit in LAYER_WORDS:
        value = stated.value * one.coverage.si
        spread = _product(value, stated.value, stated.uncertainty, of_layer)
        result = Quantity(value=value, uncertainty=spread, unit="mol/m^2", kind="coverage").to(goal)
        return Converted(
            text, _shown(result), result.value, result.uncertainty, result.unit, "coverage", method=method
        )
    coverage = Quantity.parse(text, "coverage")
    value = coverage.si / one.coverage.si
    spread = _product(value, coverage.si, coverage.si_uncertainty, of_layer)
    number = _shown(Quantity(value=value, uncertainty=spread, unit="1", kind="number"))
    return Converted(text, f"{number} layers", value, spread, "layers", "number", method=method)


def _product(value: float, first: float, spread: float | None, relative: float) -> float | None:
    """Return the standard uncertainty of a product or quotient of independent factors, first order (GUM, 5.1.6)."""
    if spread is None and relative == 0:
        return None
    return abs(value) * math.hypot((spread or 0.0) / abs(first) if first else 0.0, relative)
