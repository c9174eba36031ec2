"""The text of a quantity taken apart: number, standard uncertainty, unit, convention, scale.

Rules
-----
* Forms: ``31.42(6)``, ``9.96(1.2)``, ``12(3)e2``, ``4.31 +/- 0.06``, ``(1.2345 +/- 0.0012)e-3``, each with a unit, and
  ``5.0 V +/- 2 %``; then a convention (rms, gauge), a scale (``on ITS-90``) or ``(exact)``.
* Numbers are decimals here, so nothing is lost before the unit is known.
* A decimal comma, a NaN, a bracket of zero and an ambiguous percentage are refused, each with its own sentence.

References
----------
JCGM 100:2008 (GUM), clause 7.2.2.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Decimal

from schemas.units import parse_unit, plain_number_text

__all__ = ["StatedText", "stated_text"]

MAX_TEXT = 200

_NUMBER = r"[+-]?(?:[0-9]{1,40}(?:\.[0-9]{0,40})?|\.[0-9]{1,40})"
_POWER = r"[eE][+-]?[0-9]{1,3}"
_CONCISE = re.compile(
    rf"(?P<v>{_NUMBER})\((?P<u>[0-9]{{1,40}}(?:\.[0-9]{{1,40}})?)\)(?P<p>{_POWER})?(?![0-9.(])"
)
_GROUPED = re.compile(
    rf"\( ?(?P<v>{_NUMBER}(?:{_POWER})?) ?\+/- ?(?P<u>{_NUMBER}(?:{_POWER})?) ?\)(?P<p>{_POWER})?(?![0-9.(])"
)
_PAIR = re.compile(rf"(?P<v>{_NUMBER}(?:{_POWER})?) ?\+/- ?(?P<u>{_NUMBER}(?:{_POWER})?)(?![0-9.(])")
_PLAIN = re.compile(rf"(?P<v>{_NUMBER}(?:{_POWER})?)(?![0-9.(])")
_TIMES_TEN = re.compile(r"(?<=[0-9)]) ?[×x*] ?10 ?\^ ?\(?([+-]?[0-9]{1,3})\)?(?![0-9])")
_COMMA = re.compile(r"[+-]?[0-9]+,[0-9]")
_NOT_A_NUMBER = re.compile(r"[+-]?(?:nan|inf|infinity)\b", re.I)
_EXACT = re.compile(r" ?\(?exact\)?\Z")
_ON_SCALE = re.compile(r"(?:\A|(?<= ))on ([A-Za-z0-9][A-Za-z0-9 :._+-]{0,45})\Z")
_CONVENTION = re.compile(r"(?:\A| )(peak[- ]to[- ]peak|p-p|pk-pk|rms|peak|absolute|gauge)\Z")
_SAME_WORD = {"peak to peak": "peak-to-peak", "p-p": "peak-to-peak", "pk-pk": "peak-to-peak"}


@dataclass(frozen=True, slots=True)
class StatedText:
    """What one text states, before its kind is known.

    Parameters
    ----------
    value : float
        In `unit`.
    uncertainty : float or None
        Standard uncertainty in `unit`; 0 if the text says exact.
    unit, convention, scale : str
        As written, "" where nothing was.
    """

    value: float
    uncertainty: float | None
    unit: str
    convention: str
    scale: str


def stated_text(text: str, *, expectation: str) -> StatedText:
    """Return the parts of a quantity's text.

    Parameters
    ----------
    text : str
        At most 200 characters.
    expectation : str
        What stands in the sentence after "expected".

    Returns
    -------
    StatedText
        Numbers and words; the unit is not looked at unless the text names two.

    Raises
    ------
    ValueError
        If the text has no such form.

    Examples
    --------
    >>> stated_text("1.2345(12)e-3 s", expectation="a period")
    StatedText(value=0.0012345, uncertainty=1.2e-06, unit='s', convention='', scale='')
    """
    if len(text) > MAX_TEXT:
        raise ValueError(f"found a text of {len(text)} characters; expected {expectation}")
    plain = plain_number_text(text.replace("±", "+/-")).replace("+-", "+/-")
    plain = _TIMES_TEN.sub(r"e\1", plain)
    value, uncertainty, rest = _numbers(plain, text, expectation)
    exact = _EXACT.search(rest)
    if exact:
        rest = rest[: exact.start()]
        if uncertainty is not None:
            raise ValueError(f"found {text!r}; expected either an uncertainty or the word exact")
        uncertainty = Decimal(0)
    if "+/-" in rest:
        if uncertainty is not None:
            raise ValueError(f"found two uncertainties in {text!r}; expected one")
        words, uncertainty = _after_the_unit(rest, text, value)
    else:
        words = _words(rest)
    # "(50 +/- 2) %" can only mean percent both times
    if words[0] in {"%", "ppm"} and "+/-" in plain and not plain.startswith("("):
        raise ValueError(
            f"found {text!r}, where the uncertainty may be relative or not; write it in brackets, as in 50(2) %"
        )
    return StatedText(_as_float(value), None if uncertainty is None else _as_float(uncertainty), *words)


def _numbers(plain: str, text: str, expectation: str) -> tuple[Decimal, Decimal | None, str]:
    """Return value, uncertainty and the rest of the text."""
    if _COMMA.match(plain):
        raise ValueError(
            f"found a decimal comma in {text!r}; write a decimal point, and no comma between thousands"
        )
    if _NOT_A_NUMBER.match(plain):
        raise ValueError(f"found {text!r}; expected a finite number; leave the field out if it is not known")
    for pattern in (_CONCISE, _GROUPED, _PAIR, _PLAIN):
        found = pattern.match(plain)
        if found:
            break
    else:
        raise ValueError(f"found {text!r}; expected {expectation}, with a number in front as in 31.42(6)")
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
        raise ValueError(
            f"found a negative uncertainty in {text!r}; expected a positive standard uncertainty"
        )
    if uncertainty == 0:
        raise ValueError(
            f"found an uncertainty of zero in {text!r}; leave it out, or write (exact) after the unit"
        )


def _after_the_unit(rest: str, text: str, value: Decimal) -> tuple[tuple[str, str, str], Decimal]:
    """Return words and uncertainty of texts such as ``5.0 V +/- 2 %``, given what follows the first number."""
    left, _, right = rest.partition("+/-")
    first, right = _words(left.strip()), right.strip()
    found = _PLAIN.match(right)
    if found is None or not first[0]:
        raise ValueError(f"found {text!r}; expected one uncertainty, as in 5.0 V +/- 0.1 V or 5.0 V +/- 2 %")
    uncertainty, tail = Decimal(found["v"]), right[found.end() :].strip()
    _check_written(uncertainty, text)
    if tail.startswith("%"):
        # a relative uncertainty; the unit is still that in front
        uncertainty, second = abs(value) * uncertainty / 100, _words(tail[1:].strip())
        same = not second[0]
    else:
        second = _words(tail)
        same = bool(second[0]) and parse_unit(first[0]).text == parse_unit(second[0]).text
    if not same:
        raise ValueError(f"found {text!r}; expected the same unit for value and uncertainty, or %")
    if first[1] and second[1] and first[1] != second[1]:
        raise ValueError(f"found both {first[1]} and {second[1]} in {text!r}; expected one")
    if uncertainty == 0:
        raise ValueError(
            f"found a relative uncertainty of zero in {text!r}; give it in the unit of the value"
        )
    return (first[0], first[1] or second[1], first[2] or second[2]), uncertainty


def _words(rest: str) -> tuple[str, str, str]:
    """Return unit, convention and scale."""
    scale = convention = ""
    found = _ON_SCALE.search(rest)
    if found:
        scale, rest = found[1].strip(), rest[: found.start()].strip()
    found = _CONVENTION.search(rest)
    if found:
        convention, rest = _SAME_WORD.get(found[1], found[1]), rest[: found.start()].strip()
    return rest, convention, scale


def _as_float(decimal: Decimal) -> float:
    value = float(decimal)
    if not math.isfinite(value) or (value == 0 and decimal != 0):
        raise ValueError(f"found number {decimal:.3e}, which is out of range; correct the exponent")
    return value
