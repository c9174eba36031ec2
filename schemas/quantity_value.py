"""A quantity as a person states it: value, standard uncertainty, unit, kind, convention, scale and origin.

Rules
-----
* What was written is kept (`text`, `value`, `unit`); SI values are computed from it and never stored instead.
* Nothing is guessed: a missing unit, an unstated STP, rms or peak, gauge or absolute are asked about.
* Numbers convert as decimals, so ``31.42 umol/m^2`` is the float nearest to 31.42e-6, not a product of two floats.
* ``exact`` (or ``uncertainty = 0`` in a table) declares a value exact; a bracket of zero is refused.

References
----------
JCGM 100:2008 (GUM), clauses 7.2.2 and 7.2.6.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from fractions import Fraction
from typing import TYPE_CHECKING, Any, Literal, cast, get_args

from pydantic_core import core_schema
from typing_extensions import override

from schemas.kind_units import accepted_unit, expectation
from schemas.kinds import kind_of
from schemas.quantity_schema import Convention, Known, table_schema
from schemas.quantity_text import stated_text

if TYPE_CHECKING:
    from collections.abc import Mapping

    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler

__all__ = ["Quantity"]

# SCPI-1999, volume 1, 7.2.1: instruments send these for overflow and for "not a number".
_SENTINELS = (9.9e37, 9.91e37)
# sine only: amplitude per rms
_PER_RMS = {"rms": 1.0, "peak": math.sqrt(2.0), "peak-to-peak": 2.0 * math.sqrt(2.0)}
_FIELDS = frozenset(
    {"value", "uncertainty", "unit", "kind", "text", "convention", "scale", "known", "source", "quantity"}
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Quantity:
    """A value with its unit and all that was said about it.

    Parameters
    ----------
    value : float
        In `unit`; finite.
    unit : str
        Stored in its canonical spelling.
    kind : str
        A name of `schemas.kinds.KINDS`.
    uncertainty : float or None
        Standard uncertainty in `unit`; None when not stated, 0 when the value is declared exact.
    text : str
        What was written. Not compared.
    convention : str or None
        rms, peak or peak-to-peak; absolute or gauge.
    scale : str or None
        Temperature scale.
    known : str
        How it is known.
    source : str or None
        Document, record or person's role behind it.

    Notes
    -----
    `si` and the rest keep the convention: a gauge pressure stays a gauge pressure, a peak voltage a peak voltage.
    """

    value: float
    unit: str
    kind: str
    uncertainty: float | None = None
    text: str = field(default="", compare=False)
    convention: Convention | None = None
    scale: str | None = None
    known: Known = "not stated"
    source: str | None = None

    def __post_init__(self) -> None:
        """Check everything and settle the unit's spelling."""
        kind = kind_of(self.kind)
        unit = accepted_unit(self.unit, self.kind)[0].text
        _check_number(self.value, "value")
        if self.uncertainty is not None:
            _check_number(self.uncertainty, "uncertainty")
            if self.uncertainty < 0:
                raise ValueError(
                    f"found uncertainty {self.uncertainty:g}; expected a positive standard uncertainty"
                )
        if self.convention is not None and self.convention not in kind.conventions:
            words = " or ".join(kind.conventions) or "no such word"
            raise ValueError(f"found {self.convention!r} after the unit; for {kind.words} expected {words}")
        if self.scale is not None and not kind.scaled:
            raise ValueError(f"found a temperature scale {self.scale!r}; {kind.words} has none")
        if self.known not in get_args(Known):
            raise ValueError(f"found known = {self.known!r}; expected one of {', '.join(get_args(Known))}")
        for name, text in (("scale", self.scale), ("source", self.source)):
            if text is not None and not (isinstance(text, str) and text.strip()):
                raise ValueError(f"found {name} = {text!r}; expected some words, or leave it out")
        put = object.__setattr__
        put(self, "unit", unit)
        put(self, "value", float(self.value))
        if self.uncertainty is not None:
            put(self, "uncertainty", float(self.uncertainty))
        if not self.text:
            put(self, "text", self._full_text())

    @classmethod
    def parse(cls, text: str, kind: str) -> Quantity:
        """Return the quantity a text states.

        Parameters
        ----------
        text : str
            For instance ``31.42(6) umol/m^2``, ``4.31 +/- 0.06 m^2``, ``5.0 V rms +/- 2 %``, ``1.5 K on ITS-90``.
        kind : str
            Name of the kind it must be.

        Returns
        -------
        Quantity
            With `text` as given.

        Raises
        ------
        ValueError
            With a sentence saying what was found, what was expected and what to do.

        Examples
        --------
        >>> Quantity.parse("31.42(6) umol/m^2", "coverage").si
        3.142e-05
        """
        return _parsed(text, kind)

    @classmethod
    def read(cls, data: object, kind: str | None = None) -> Quantity:
        """Return the quantity in a text, a table, a bare number of a pure kind, or a quantity.

        Parameters
        ----------
        data : object
            A string; a mapping with ``value`` and ``unit`` or with ``quantity``; a number where no unit is needed.
        kind : str, optional
            The kind it must be; may be left out where `data` names it.

        Returns
        -------
        Quantity

        Raises
        ------
        ValueError
            If it cannot be read as that kind.
        """
        return _read(data, kind)

    @property
    def si_unit(self) -> str:
        """The SI unit of `si`: the canonical one of the kind (of the matching dimension for a drive)."""
        return accepted_unit(self.unit, self.kind)[2]

    @property
    def si(self) -> float:
        """The value in `si_unit`."""
        return _scaled(self.value, accepted_unit(self.unit, self.kind)[1])

    @property
    def si_uncertainty(self) -> float | None:
        """The standard uncertainty in `si_unit`, or None."""
        return (
            None
            if self.uncertainty is None
            else _scaled(self.uncertainty, accepted_unit(self.unit, self.kind)[1])
        )

    @property
    def exact(self) -> bool:
        """Whether the value was declared exact."""
        return self.uncertainty == 0

    def to(self, unit: str) -> Quantity:
        """Return the same quantity in another unit of its kind; the original text is kept.

        Parameters
        ----------
        unit : str
            Any unit of the kind (and, for a drive, of the same dimension).

        Returns
        -------
        Quantity

        Raises
        ------
        ValueError
            If the kind does not take the unit.
        """
        _, mine, my_si = accepted_unit(self.unit, self.kind)
        read, other, other_si = accepted_unit(unit, self.kind)
        if my_si != other_si:
            raise ValueError(f"found unit {read.text}; expected one that {self.unit} converts to")
        ratio = mine / other
        return replace(
            self,
            value=_scaled(self.value, ratio),
            uncertainty=None if self.uncertainty is None else _scaled(self.uncertainty, ratio),
            unit=read.text,
        )

    def for_sine(self, convention: Literal["rms", "peak", "peak-to-peak"]) -> Quantity:
        """Return the same oscillating quantity in another convention, for a sine wave only.

        Parameters
        ----------
        convention : str
            The convention wanted.

        Returns
        -------
        Quantity

        Raises
        ------
        ValueError
            If this quantity does not say whether it is rms, peak or peak-to-peak.

        Notes
        -----
        Peak is sqrt(2) times rms and peak-to-peak twice the peak; for any other wave form this is wrong.
        """
        if self.convention not in _PER_RMS:
            raise ValueError(
                f"found {self._full_text()!r} without a convention; expected rms, peak or peak-to-peak after it"
            )
        ratio = _PER_RMS[convention] / _PER_RMS[self.convention]
        uncertainty = None if self.uncertainty is None else self.uncertainty * ratio
        return replace(self, value=self.value * ratio, uncertainty=uncertainty, convention=convention)

    def json(self) -> dict[str, float | str | None]:
        """Return value, uncertainty and unit as stated, for JSON at full precision."""
        return {"value": self.value, "uncertainty": self.uncertainty, "unit": self.unit}

    def record(self) -> dict[str, Any]:
        """Return everything as plain data; `Quantity.read` gives back an equal quantity."""
        found = {
            "value": self.value,
            "uncertainty": self.uncertainty,
            "unit": self.unit,
            "kind": self.kind,
            "text": self.text,
            "convention": self.convention,
            "scale": self.scale,
            "known": self.known,
            "source": self.source,
        }
        return {name: item for name, item in found.items() if item is not None}

    def format(self) -> str:
        """Return the quantity for people, rounded to two digits of its uncertainty, in its own unit."""
        from schemas.uncertain_text import plain_text

        return plain_text(self)

    @override
    def __str__(self) -> str:
        """Return the quantity for people."""
        return self.format()

    def _full_text(self) -> str:
        """Return an unrounded text that reads back as this quantity."""
        number = repr(float(self.value))
        if self.uncertainty:
            number = f"({number} +/- {float(self.uncertainty)!r})"
        parts = [number, "" if self.unit == "1" else self.unit, self.convention or ""]
        parts += [f"on {self.scale}" if self.scale else "", "(exact)" if self.uncertainty == 0 else ""]
        return " ".join(part for part in parts if part)

    @classmethod
    def __get_pydantic_core_schema__(
        cls, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Let pydantic read quantities that name their own kind."""
        return core_schema.no_info_plain_validator_function(_read, serialization=_serialised())

    @classmethod
    def __get_pydantic_json_schema__(
        cls, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        """Describe a quantity that names its own kind."""
        return table_schema(None)


def _serialised() -> Any:
    return core_schema.plain_serializer_function_ser_schema(lambda quantity: quantity.record())


def _scaled(value: float, factor: Fraction) -> float:
    """Return the float nearest to the decimal number times the exact factor."""
    if factor == 1:
        return value
    try:
        return float(Fraction(repr(value)) * factor)
    except OverflowError:
        raise ValueError(
            f"found {value!r}, which is out of range after conversion; correct the unit or the number"
        ) from None


def _check_number(number: object, what: str) -> None:
    if isinstance(number, bool) or not isinstance(number, (int, float)):
        raise ValueError(f"found {what} {number!r}; expected a number")  # noqa: TRY004 - pydantic collects ValueError
    try:
        finite = math.isfinite(number)
    except OverflowError:
        finite = False
    if not finite:
        raise ValueError(
            f"found {what} {str(number)[:40]}; expected a finite number; leave the field out if it is not known"
        )
    if abs(number) in _SENTINELS:
        raise ValueError(
            f"found {what} {number:g}, which instruments send for overflow or no reading; leave it out"
        )


def _parsed(text: object, kind_name: str) -> Quantity:
    kind = kind_of(kind_name)
    if not isinstance(text, str):
        raise ValueError(f"found {text!r}; expected {expectation(kind)}")  # noqa: TRY004 - pydantic collects ValueError
    stated = stated_text(text, expectation=expectation(kind))
    if not stated.unit and not kind.pure:
        raise ValueError(f"found {text!r} without a unit; expected {expectation(kind)}")
    return Quantity(
        value=stated.value,
        uncertainty=stated.uncertainty,
        unit=stated.unit,
        kind=kind_name,
        text=text,
        convention=cast("Convention | None", stated.convention or None),
        scale=stated.scale or None,
    )


def _read(data: object, kind: str | None = None) -> Quantity:
    if isinstance(data, Quantity):
        if kind is not None and data.kind != kind:
            raise ValueError(f"found {data.kind} {data.text!r}; expected {expectation(kind_of(kind))}")
        return data
    if isinstance(data, dict):
        return _table_read(data, kind)
    if kind is None:
        raise ValueError(f"found {data!r}; expected a table that names its kind of quantity")
    wanted = kind_of(kind)
    if isinstance(data, str):
        return _parsed(data, kind)
    if isinstance(data, (int, float)) and not isinstance(data, bool):
        if not wanted.pure:
            raise ValueError(f"found {data!r} without a unit; expected {expectation(wanted)}")
        return Quantity(value=data, unit="1", kind=kind)
    raise ValueError(f"found {data!r}; expected {expectation(wanted)}")


def _table_read(data: Mapping[str, Any], kind: str | None) -> Quantity:
    unknown = sorted(str(name) for name in set(data) - _FIELDS)
    if unknown:
        raise ValueError(f"found {', '.join(unknown)} in a quantity; expected {', '.join(sorted(_FIELDS))}")
    named = data.get("kind", kind)
    if not isinstance(named, str) or (kind is not None and named != kind):
        raise ValueError(
            f"found kind {named!r}; expected {'a kind such as coverage' if kind is None else kind}"
        )
    extra = {name: data[name] for name in ("known", "source") if data.get(name) is not None}
    if "quantity" in data:
        clash = sorted({"value", "uncertainty", "unit", "convention", "scale", "text"} & set(data))
        if clash:
            raise ValueError(f"found both quantity and {', '.join(clash)}; expected one or the other")
        return replace(_parsed(data["quantity"], named), **extra)
    wanted = kind_of(named)
    if "value" not in data:
        raise ValueError(f"found a table without a value; expected {expectation(wanted)}")
    unit = data.get("unit", "1" if wanted.pure else None)
    if not isinstance(unit, str):
        raise ValueError(f"found unit {unit!r}; expected {expectation(wanted)}")  # noqa: TRY004 - pydantic collects ValueError
    return Quantity(
        value=data["value"],
        uncertainty=data.get("uncertainty"),
        unit=unit,
        kind=named,
        text=str(data.get("text", "")),
        convention=data.get("convention"),
        scale=data.get("scale"),
        **extra,
    )
