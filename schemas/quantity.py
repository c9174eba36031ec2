"""A quantity as a person states it: value, standard uncertainty, unit, kind, convention, scale and origin.

Rules
-----
* A sheet writes ``"31.42(6) umol/m^2"``: the bracket is the standard uncertainty in the last digits (GUM 7.2.2).
* What was written is kept (`text`, `value`, `unit`); SI values are computed from it and never stored instead.
* Nothing is guessed: a missing unit, an unstated STP, rms or peak, gauge or absolute are asked about.
* Numbers are read as decimals, so ``31.42 umol/m^2`` is the float nearest to 31.42e-6, not a product of two floats.
* ``exact`` (or ``uncertainty = 0`` in a table) declares a value exact; a bracket of zero is refused.

References
----------
JCGM 100:2008 (GUM), Evaluation of measurement data, clauses 7.2.2 and 7.2.6.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field, replace
from decimal import Decimal
from fractions import Fraction as Ratio
from functools import lru_cache
from typing import TYPE_CHECKING, Annotated, Any, Literal, get_args

from pydantic_core import core_schema

from schemas.kinds import Kind, kind_of
from schemas.units import Unit, parse_unit, plain_number_text, ucum

if TYPE_CHECKING:
    from collections.abc import Mapping

    from numpy.typing import ArrayLike, NDArray
    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler

Convention = Literal["rms", "peak", "peak-to-peak", "absolute", "gauge"]
Known = Literal["measured", "computed", "document", "assumed", "not stated"]

MAX_TEXT = 200

# SCPI-1999, volume 1, 7.2.1: instruments send these for overflow and for "not a number".
_SENTINELS = (9.9e37, 9.91e37)

_NUMBER = r"[+-]?(?:[0-9]{1,40}(?:\.[0-9]{0,40})?|\.[0-9]{1,40})"
_POWER = r"[eE][+-]?[0-9]{1,3}"
_CONCISE = re.compile(rf"(?P<v>{_NUMBER})\((?P<u>[0-9]{{1,40}}(?:\.[0-9]{{1,40}})?)\)(?P<p>{_POWER})?(?![0-9.(])")
_GROUPED = re.compile(rf"\( ?(?P<v>{_NUMBER}) ?\+/- ?(?P<u>{_NUMBER}) ?\)(?P<p>{_POWER})?(?![0-9.(])")
_PAIR = re.compile(rf"(?P<v>{_NUMBER}(?:{_POWER})?) ?\+/- ?(?P<u>{_NUMBER}(?:{_POWER})?)(?![0-9.(])")
_PLAIN = re.compile(rf"(?P<v>{_NUMBER}(?:{_POWER})?)(?![0-9.(])")
_TIMES_TEN = re.compile(r"(?<=[0-9)]) ?[×x*] ?10 ?\^ ?\(?([+-]?[0-9]{1,3})\)?(?![0-9])")
_COMMA = re.compile(r"[+-]?[0-9]+,[0-9]")
_NOT_A_NUMBER = re.compile(r"[+-]?(?:nan|inf|infinity)\b", re.I)
_EXACT = re.compile(r" ?\(?exact\)?\Z")
_ON_SCALE = re.compile(r"(?:\A|(?<= ))on ([A-Za-z0-9][A-Za-z0-9 ._+-]{0,39})\Z")
_CONVENTION = re.compile(r"(?:\A| )(peak[- ]to[- ]peak|p-p|pk-pk|rms|peak|absolute|gauge)\Z")
_SAME_WORD = {"peak to peak": "peak-to-peak", "p-p": "peak-to-peak", "pk-pk": "peak-to-peak"}
# sine only: amplitude per rms
_PER_RMS = {"rms": 1.0, "peak": math.sqrt(2.0), "peak-to-peak": 2.0 * math.sqrt(2.0)}
_FIELDS = frozenset({"value", "uncertainty", "unit", "kind", "text", "convention", "scale", "known", "source", "quantity"})


@lru_cache(maxsize=2048)
def _accepted(unit: str, kind_name: str) -> tuple[Unit, Ratio, str]:
    """Return the unit, its factor to the kind's SI unit, and that SI unit; refuse what the kind does not take."""
    kind = kind_of(kind_name)
    try:
        read = parse_unit(unit)
    except ValueError as fault:
        raise ValueError(f"{fault} (expected {_expectation(kind)})") from None
    same = [si for si in kind.si if parse_unit(si).dimension == read.dimension]
    for name, sentence in kind.refused:
        if same and name in read.names:
            raise ValueError(f"found unit {read.text}; expected {_expectation(kind)}; {sentence}")
    named = (kind.allowed is None or read.names <= kind.allowed) and (
        not kind.required or bool(read.names & kind.required)
    )
    stray = not kind.radian and bool(read.names & {"rad", "deg"})
    if same and named and not stray:
        return read, read.factor, same[0]
    for other, factor in kind.also:
        if parse_unit(other).dimension == read.dimension:
            return read, read.factor * Ratio(factor), kind.si[0]
    for other, sentence in kind.hints:
        if parse_unit(other).dimension == read.dimension:
            raise ValueError(f"found unit {read.text}; expected {_expectation(kind)}; {sentence}")
    raise ValueError(f"found unit {read.text}; expected {_expectation(kind)}")


def _expectation(kind: Kind) -> str:
    if kind.pure:
        return f"{kind.words}, a number without a unit" + (" or in %" if kind.allowed and "%" in kind.allowed else "")
    return f"{kind.words} such as {' or '.join(kind.examples)}"


def unit_factor(unit: str, kind: str) -> float:
    """Return the number of SI units of a kind in one of a unit.

    Parameters
    ----------
    unit : str
        Any accepted unit of the kind.
    kind : str
        Name of the kind.

    Returns
    -------
    float
        The factor, correctly rounded.

    Raises
    ------
    ValueError
        If the kind is unknown or does not take the unit.

    Examples
    --------
    >>> unit_factor("umol/m^2", "coverage")
    1e-06
    """
    return float(_accepted(unit, kind)[1])


def convert_array(values: ArrayLike, unit: str, kind: str) -> NDArray[Any]:
    """Return the values of a column in the SI unit of its kind.

    Parameters
    ----------
    values : array_like
        Numbers in `unit`, any shape; NaN stays NaN.
    unit, kind : str
        The column's unit and kind.

    Returns
    -------
    ndarray of float64
        Same shape, in the canonical unit.

    Raises
    ------
    ValueError
        If the kind does not take the unit.
    """
    import numpy as np

    return np.asarray(values, dtype=np.float64) * unit_factor(unit, kind)


def canonical(kind: str) -> str:
    """Return the canonical SI unit of a kind, e.g. ``mol/m^2`` for a coverage."""
    return kind_of(kind).si[0]


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
        unit = _accepted(self.unit, self.kind)[0].text
        _check_number(self.value, "value")
        if self.uncertainty is not None:
            _check_number(self.uncertainty, "uncertainty")
            if self.uncertainty < 0:
                raise ValueError(f"found uncertainty {self.uncertainty:g}; expected a positive standard uncertainty")
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
        return _parsed(text, kind_of(kind))

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
        return _accepted(self.unit, self.kind)[2]

    @property
    def si(self) -> float:
        """The value in `si_unit`."""
        return _scaled(self.value, _accepted(self.unit, self.kind)[1])

    @property
    def si_uncertainty(self) -> float | None:
        """The standard uncertainty in `si_unit`, or None."""
        return None if self.uncertainty is None else _scaled(self.uncertainty, _accepted(self.unit, self.kind)[1])

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
        _, mine, my_si = _accepted(self.unit, self.kind)
        read, other, other_si = _accepted(unit, self.kind)
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
            raise ValueError(f"found {self._full_text()!r} without a convention; expected rms, peak or peak-to-peak after it")
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

    def __str__(self) -> str:
        """Return the quantity for people."""
        return self.format()

    def _full_text(self) -> str:
        """Return an unrounded text that reads back as this quantity."""
        number = repr(float(self.value))
        if self.uncertainty:
            number = f"{number} +/- {float(self.uncertainty)!r}"
        parts = [number, "" if self.unit == "1" else self.unit, self.convention or ""]
        parts += [f"on {self.scale}" if self.scale else "", "(exact)" if self.uncertainty == 0 else ""]
        return " ".join(part for part in parts if part)

    @classmethod
    def __get_pydantic_core_schema__(cls, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:  # noqa: ANN401, ARG003
        """Let pydantic read quantities that name their own kind."""
        return core_schema.no_info_plain_validator_function(_read, serialization=_serialised())

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:  # noqa: ARG003
        """Describe a quantity that names its own kind."""
        return _table_schema(None)


def _serialised() -> Any:  # noqa: ANN401 - a pydantic_core typed dictionary
    return core_schema.plain_serializer_function_ser_schema(lambda quantity: quantity.record())


def _scaled(value: float, factor: Ratio) -> float:
    """Return the float nearest to the decimal number times the exact factor."""
    if factor == 1:
        return value
    try:
        return float(Ratio(repr(value)) * factor)
    except OverflowError:
        raise ValueError(f"found {value!r}, which is out of range after conversion; correct the unit or the number") from None


def _check_number(number: object, what: str) -> None:
    if isinstance(number, bool) or not isinstance(number, (int, float)):
        raise ValueError(f"found {what} {number!r}; expected a number")
    try:
        finite = math.isfinite(number)
    except OverflowError:
        finite = False
    if not finite:
        raise ValueError(f"found {what} {str(number)[:40]}; expected a finite number; leave the field out if it is not known")
    if abs(number) in _SENTINELS:
        raise ValueError(f"found {what} {number:g}, which instruments send for overflow or no reading; leave it out")


def _as_float(decimal: Decimal) -> float:
    value = float(decimal)
    if not math.isfinite(value) or (value == 0 and decimal != 0):
        raise ValueError(f"found number {decimal:.3e}, which is out of range; correct the exponent")
    return value


def _parsed(text: str, kind: Kind) -> Quantity:
    if not isinstance(text, str):
        raise ValueError(f"found {text!r}; expected {_expectation(kind)}")  # noqa: TRY004 - pydantic collects ValueError
    if len(text) > MAX_TEXT:
        raise ValueError(f"found a text of {len(text)} characters; expected {_expectation(kind)}")
    plain = plain_number_text(text.replace("±", "+/-")).replace("+-", "+/-")
    plain = _TIMES_TEN.sub(r"e\1", plain)
    value, uncertainty, rest = _number_read(plain, text, kind)
    exact = _EXACT.search(rest)
    if exact:
        rest = rest[: exact.start()]
        if uncertainty is not None:
            raise ValueError(f"found {text!r}; expected either an uncertainty or the word exact")
        uncertainty = Decimal(0)
    rest, relative = _relative_read(rest, text, value, uncertainty)
    uncertainty = relative if relative is not None else uncertainty
    unit, convention, scale = _unit_read(rest)
    if not unit:
        if not kind.pure:
            raise ValueError(f"found {text!r} without a unit; expected {_expectation(kind)}")
        unit = "1"
    if unit == "%" and "+/-" in plain:
        raise ValueError(f"found {text!r}, where the uncertainty may be relative or not; write it in brackets, as in 50(2) %")
    return Quantity(
        value=_as_float(value),
        uncertainty=None if uncertainty is None else _as_float(uncertainty),
        unit=unit,
        kind=kind.name,
        text=text,
        convention=convention,  # type: ignore[arg-type]  # __post_init__ checks the word
        scale=scale,
    )


def _number_read(plain: str, text: str, kind: Kind) -> tuple[Decimal, Decimal | None, str]:
    """Return value, uncertainty and the rest of the text."""
    if _COMMA.match(plain):
        raise ValueError(f"found a decimal comma in {text!r}; write a decimal point, and no comma between thousands")
    if _NOT_A_NUMBER.match(plain):
        raise ValueError(f"found {text!r}; expected a finite number; leave the field out if it is not known")
    for pattern in (_CONCISE, _GROUPED, _PAIR, _PLAIN):
        found = pattern.match(plain)
        if found:
            break
    else:
        raise ValueError(f"found {text!r}; expected {_expectation(kind)}, with a number in front as in 31.42(6)")
    rest = plain[found.end() :].strip()
    if pattern is _PLAIN:
        return Decimal(found["v"]), None, rest
    value, uncertainty = Decimal(found["v"]), Decimal(found["u"])
    if pattern is _CONCISE and "." not in found["u"]:
        uncertainty = uncertainty.scaleb(int(value.as_tuple().exponent))
    if pattern is not _PAIR and found["p"]:
        shift = int(found["p"][1:])
        value, uncertainty = value.scaleb(shift), uncertainty.scaleb(shift)
    _check_written(uncertainty, text)
    return value, uncertainty, rest


def _check_written(uncertainty: Decimal, text: str) -> None:
    if uncertainty < 0:
        raise ValueError(f"found a negative uncertainty in {text!r}; expected a positive standard uncertainty")
    if uncertainty == 0:
        raise ValueError(f"found an uncertainty of zero in {text!r}; leave it out, or write (exact) after the unit")


def _relative_read(rest: str, text: str, value: Decimal, uncertainty: Decimal | None) -> tuple[str, Decimal | None]:
    """Return the unit part and the uncertainty of texts such as ``5.0 V +/- 2 %`` (after the number)."""
    if "+/-" not in rest:
        return rest, None
    unit, _, after = rest.partition("+/-")
    unit, after = unit.strip(), after.strip()
    found = _PLAIN.match(after)
    if uncertainty is not None or found is None or not unit:
        raise ValueError(f"found {text!r}; expected one uncertainty, as in 5.0 V +/- 0.1 V or 5.0 V +/- 2 %")
    stated, tail = Decimal(found["v"]), after[found.end() :].strip()
    _check_written(stated, text)
    if tail.startswith("%"):
        return f"{unit} {tail[1:].strip()}".strip(), abs(value) * stated / 100
    first, second = _unit_read(unit), _unit_read(tail)
    if not second[0] or parse_unit(first[0]).text != parse_unit(second[0]).text:
        raise ValueError(f"found {text!r}; expected the same unit for value and uncertainty, or %")
    return " ".join([first[0], *(first[1:2] if first[1] else second[1:2] if second[1] else ()), *_scale_words(first, second)]), stated


def _scale_words(first: tuple[str, str | None, str | None], second: tuple[str, str | None, str | None]) -> list[str]:
    scale = first[2] or second[2]
    return [f"on {scale}"] if scale else []


def _unit_read(rest: str) -> tuple[str, str | None, str | None]:
    """Return unit, convention and scale."""
    scale = convention = None
    found = _ON_SCALE.search(rest)
    if found:
        scale, rest = found[1].strip(), rest[: found.start()].strip()
    found = _CONVENTION.search(rest)
    if found:
        convention, rest = _SAME_WORD.get(found[1], found[1]), rest[: found.start()].strip()
    return rest, convention, scale


def _read(data: object, kind: str | None = None) -> Quantity:
    if isinstance(data, Quantity):
        if kind is not None and data.kind != kind:
            raise ValueError(f"found {data.kind} {data.text!r}; expected {_expectation(kind_of(kind))}")
        return data
    if isinstance(data, dict):
        return _table_read(data, kind)
    if kind is None:
        raise ValueError(f"found {data!r}; expected a table that names its kind of quantity")
    wanted = kind_of(kind)
    if isinstance(data, str):
        return _parsed(data, wanted)
    if isinstance(data, (int, float)) and not isinstance(data, bool):
        if not wanted.pure:
            raise ValueError(f"found {data!r} without a unit; expected {_expectation(wanted)}")
        return Quantity(value=data, unit="1", kind=kind)
    raise ValueError(f"found {data!r}; expected {_expectation(wanted)}")


def _table_read(data: Mapping[str, Any], kind: str | None) -> Quantity:
    unknown = sorted(str(name) for name in set(data) - _FIELDS)
    if unknown:
        raise ValueError(f"found {', '.join(unknown)} in a quantity; expected {', '.join(sorted(_FIELDS))}")
    named = data.get("kind", kind)
    if not isinstance(named, str) or (kind is not None and named != kind):
        raise ValueError(f"found kind {named!r}; expected {'a kind such as coverage' if kind is None else kind}")
    extra = {name: data[name] for name in ("known", "source") if data.get(name) is not None}
    if "quantity" in data:
        clash = sorted({"value", "uncertainty", "unit", "convention", "scale", "text"} & set(data))
        if clash:
            raise ValueError(f"found both quantity and {', '.join(clash)}; expected one or the other")
        return replace(_parsed(data["quantity"], kind_of(named)), **extra)
    wanted = kind_of(named)
    if "value" not in data:
        raise ValueError(f"found a table without a value; expected {_expectation(wanted)}")
    unit = data.get("unit", "1" if wanted.pure else None)
    if not isinstance(unit, str):
        raise ValueError(f"found unit {unit!r}; expected {_expectation(wanted)}")  # noqa: TRY004 - pydantic collects ValueError
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


def _table_schema(kind: Kind | None) -> dict[str, Any]:
    """Return the JSON Schema of the table forms."""
    said = {
        "known": {"enum": list(get_args(Known)), "description": "how the value is known"},
        "source": {"type": "string", "minLength": 1, "description": "document or record behind the value"},
    }
    kind_schema: dict[str, Any] = {"type": "string"} if kind is None else {"const": kind.name}
    units: dict[str, Any] = {"type": "string", "minLength": 1, "maxLength": 64}
    words: list[str] = list(get_args(Convention)) if kind is None else list(kind.conventions)
    if kind is not None:
        units["examples"] = list(kind.examples)
    full: dict[str, Any] = {
        "value": {"type": "number"},
        "uncertainty": {"type": "number", "minimum": 0, "description": "standard uncertainty in the same unit; 0 means exact"},
        "unit": units,
        "kind": kind_schema,
        "text": {"type": "string", "description": "what was written"},
        **said,
    }
    if words:
        full["convention"] = {"enum": words}
    if kind is None or kind.scaled:
        full["scale"] = {"type": "string", "minLength": 1, "maxLength": 40}
    needs = ["value"] if kind is not None and kind.pure else ["value", "unit"]
    named = ["kind"] if kind is None else []
    text = {"type": "string", "minLength": 1, "maxLength": MAX_TEXT}
    return {
        "anyOf": [
            {"type": "object", "properties": full, "required": needs + named, "additionalProperties": False},
            {
                "type": "object",
                "properties": {"quantity": text, "kind": kind_schema, **said},
                "required": ["quantity", *named],
                "additionalProperties": False,
            },
        ]
    }


@dataclass(frozen=True, slots=True)
class OfKind:
    """Marks a pydantic field as a quantity of one kind: ``Annotated[Quantity, OfKind("coverage")]``.

    Parameters
    ----------
    kind : str
        Name of the kind.
    conventions : tuple of str or None
        Words accepted after the unit; None for all of the kind.
    convention_required : bool
        Whether such a word must be written.
    """

    kind: str
    conventions: tuple[str, ...] | None = None
    convention_required: bool = False

    def __call__(self, data: object) -> Quantity:
        """Return the quantity in `data`, or raise ValueError with a sentence."""
        quantity = _read(data, self.kind)
        words = kind_of(self.kind).conventions if self.conventions is None else self.conventions
        if quantity.convention is None:
            if self.convention_required:
                raise ValueError(f"found {quantity.text!r}; expected the word {' or '.join(words)} after the unit")
        elif quantity.convention not in words:
            raise ValueError(
                f"found {quantity.text!r}; expected {kind_of(self.kind).words} that is {' or '.join(words)},"
                f" not {quantity.convention}"
            )
        return quantity

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:  # noqa: ANN401, ARG002
        """Let pydantic read the field."""
        return core_schema.no_info_plain_validator_function(self, serialization=_serialised())

    def __get_pydantic_json_schema__(self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:  # noqa: ARG002
        """Describe the text form with examples, and the table forms."""
        kind = kind_of(self.kind)
        suffix = f" {(self.conventions or kind.conventions)[0]}" if self.convention_required else ""
        units = ["" if unit == "1" else f" {unit}" for unit in kind.examples]
        forms: list[dict[str, Any]] = [
            {
                "type": "string",
                "minLength": 1,
                "maxLength": MAX_TEXT,
                "examples": [f"{number}{unit}{suffix}" for number, unit in zip(("1.234(5)", "1.2", "3.4", "5"), units, strict=False)],
            },
            *_table_schema(kind)["anyOf"],
        ]
        if kind.pure:
            forms.append({"type": "number"})
        return {
            "title": kind.name,
            "description": f"{kind.description}; {_expectation(kind)}; SI unit {kind.si[0]}",
            "anyOf": forms,
        }


def coverage_from_layers(layers: float | Quantity, *, layer_coverage: Quantity) -> Quantity:
    """Return the coverage of a number of layers, given what one layer holds on this substrate.

    Parameters
    ----------
    layers : float or Quantity
        Number of layers; a quantity of kind ``number`` brings its uncertainty.
    layer_coverage : Quantity
        Coverage of one layer by the substrate's own definition, kind ``coverage``.

    Returns
    -------
    Quantity
        A coverage in the unit of `layer_coverage`; its uncertainty combines both (GUM 5.1.2, uncorrelated), and is
        None when neither is stated.

    Raises
    ------
    ValueError
        If an argument is of another kind.
    """
    _read(layer_coverage, "coverage")
    number = _read(layers, "number")
    value = number.value * layer_coverage.value
    stated = [one for one in (number.uncertainty, layer_coverage.uncertainty) if one is not None]
    uncertainty = None
    if stated:
        uncertainty = math.hypot(
            number.value * (layer_coverage.uncertainty or 0.0), layer_coverage.value * (number.uncertainty or 0.0)
        )
    return Quantity(
        value=value,
        uncertainty=uncertainty,
        unit=layer_coverage.unit,
        kind="coverage",
        known="computed",
        source=f"{number.text} layers of {layer_coverage.text}",
    )


Temperature = Annotated[Quantity, OfKind("temperature")]
TemperatureDifference = Annotated[Quantity, OfKind("temperature_difference")]
TemperatureRate = Annotated[Quantity, OfKind("temperature_rate")]
Time = Annotated[Quantity, OfKind("time")]
Period = Annotated[Quantity, OfKind("period")]
Frequency = Annotated[Quantity, OfKind("frequency")]
AngularFrequency = Annotated[Quantity, OfKind("angular_frequency")]
Dissipation = Annotated[Quantity, OfKind("dissipation")]
QualityFactor = Annotated[Quantity, OfKind("quality_factor")]
Resistance = Annotated[Quantity, OfKind("resistance")]
MutualInductance = Annotated[Quantity, OfKind("mutual_inductance")]
Inductance = Annotated[Quantity, OfKind("inductance")]
Capacitance = Annotated[Quantity, OfKind("capacitance")]
# A plain pressure enters gas laws, so gauge readings are refused there; PressureAsRead takes both and wants the word.
Pressure = Annotated[Quantity, OfKind("pressure", conventions=("absolute",))]
GaugePressure = Annotated[Quantity, OfKind("pressure", conventions=("gauge",), convention_required=True)]
PressureAsRead = Annotated[Quantity, OfKind("pressure", convention_required=True)]
PressureRatio = Annotated[Quantity, OfKind("pressure_ratio")]
RelativePressure = Annotated[Quantity, OfKind("relative_pressure")]
Volume = Annotated[Quantity, OfKind("volume")]
Area = Annotated[Quantity, OfKind("area")]
SpecificArea = Annotated[Quantity, OfKind("specific_area")]
Length = Annotated[Quantity, OfKind("length")]
Mass = Annotated[Quantity, OfKind("mass")]
Amount = Annotated[Quantity, OfKind("amount")]
SpecificAmount = Annotated[Quantity, OfKind("specific_amount")]
Coverage = Annotated[Quantity, OfKind("coverage")]
ArealMassDensity = Annotated[Quantity, OfKind("areal_mass_density")]
Density = Annotated[Quantity, OfKind("density")]
MomentOfInertia = Annotated[Quantity, OfKind("moment_of_inertia")]
TorsionConstant = Annotated[Quantity, OfKind("torsion_constant")]
MassSensitivity = Annotated[Quantity, OfKind("mass_sensitivity")]
ArealMassSensitivity = Annotated[Quantity, OfKind("areal_mass_sensitivity")]
AmountSensitivity = Annotated[Quantity, OfKind("amount_sensitivity")]
AngularMomentum = Annotated[Quantity, OfKind("angular_momentum")]
HeatCapacity = Annotated[Quantity, OfKind("heat_capacity")]
MolarHeatCapacity = Annotated[Quantity, OfKind("molar_heat_capacity")]
SpecificHeat = Annotated[Quantity, OfKind("specific_heat")]
Viscosity = Annotated[Quantity, OfKind("viscosity")]
Diffusivity = Annotated[Quantity, OfKind("diffusivity")]
Velocity = Annotated[Quantity, OfKind("velocity")]
Voltage = Annotated[Quantity, OfKind("voltage")]
Current = Annotated[Quantity, OfKind("current")]
Amplitude = Annotated[Quantity, OfKind("amplitude", convention_required=True)]
Drive = Annotated[Quantity, OfKind("drive", convention_required=True)]
Power = Annotated[Quantity, OfKind("power")]
Charge = Annotated[Quantity, OfKind("charge")]
Angle = Annotated[Quantity, OfKind("angle")]
Phase = Annotated[Quantity, OfKind("phase")]
MagneticFluxDensity = Annotated[Quantity, OfKind("magnetic_flux_density")]
Torque = Annotated[Quantity, OfKind("torque")]
SurfaceTension = Annotated[Quantity, OfKind("surface_tension")]
MolarMass = Annotated[Quantity, OfKind("molar_mass")]
AtomsArea = Annotated[Quantity, OfKind("atoms_area")]
Fraction = Annotated[Quantity, OfKind("fraction")]
Number = Annotated[Quantity, OfKind("number")]
Count = Annotated[Quantity, OfKind("count")]
