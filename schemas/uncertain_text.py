"""Quantities as text for people: value(uncertainty) unit, in plain, typographic and LaTeX form.

Rules
-----
* Rounding is a display act, done here once, on decimals, ties to even: the three forms show the same digits.
* Two digits of the standard uncertainty, the value to the same place; the bracket keeps its decimal mark when it
  crosses it, as 9.96(1.00).
* Where the uncertainty in the printed unit is 10 or more, a power of ten is taken out: 1.23(12)e3, never 1230(120).
* An uncertainty of zero is refused unless the value is exact; NaN and infinity are refused.

References
----------
JCGM 100:2008 (GUM), clauses 7.2.2 and 7.2.6.
"""

from __future__ import annotations

import html
import math
from dataclasses import dataclass
from decimal import ROUND_HALF_EVEN, Context, Decimal
from typing import TYPE_CHECKING

from schemas.kinds import kind_of
from schemas.units import parse_unit

if TYPE_CHECKING:
    from schemas.quantity_value import Quantity

__all__ = ["RoundedText", "html_text", "in_preferred_unit", "latex_text", "plain_text", "rounded"]

_THIN = "\u2009"
_NO_BREAK = "\u00a0"
_MINUS = "\u2212"
_TIMES = "\u00d7"
_SUPERSCRIPT = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")
_WIDE = Context(prec=700, rounding=ROUND_HALF_EVEN)
# A value without uncertainty is shown as a person wrote it; beyond these a power of ten reads better.
_LARGE, _SMALL = 6, -4
_POWER_TAKEN = 9.95
_LONG, _NOT_TOO_SHORT = 9999.5, 9.9e-4
# More digits than this come from converting units, not from a person or an instrument (common practice, no source).
_MOST_DIGITS = 12


@dataclass(frozen=True, slots=True)
class RoundedText:
    """The digits of a rounded value, before any typography.

    Parameters
    ----------
    digits : str
        Value with sign, e.g. ``-0.7312``.
    bracket : str
        Digits of the standard uncertainty, "" if there is none.
    power : int
        Power of ten taken out, 0 for none.
    """

    digits: str
    bracket: str
    power: int = 0

    def plain(self) -> str:
        """Return ``1.23(12)e3``, which reads back as the same numbers."""
        bracket = f"({self.bracket})" if self.bracket else ""
        return f"{self.digits}{bracket}" + (f"e{self.power}" if self.power else "")

    def typographic(self) -> str:
        """Return the number with a true minus and superscripts; it needs no HTML escaping."""
        bracket = f"({self.bracket})" if self.bracket else ""
        power = f"{_THIN}{_TIMES}{_THIN}10{str(self.power).translate(_SUPERSCRIPT)}" if self.power else ""
        return self.digits.replace("-", _MINUS) + bracket + power

    def maths(self) -> str:
        """Return the number for LaTeX maths."""
        bracket = f"({self.bracket})" if self.bracket else ""
        return f"{self.digits}{bracket}" + (rf"\times 10^{{{self.power}}}" if self.power else "")


def rounded(value: float, uncertainty: float | None, *, exact: bool = False) -> RoundedText:
    """Return value and standard uncertainty rounded for display.

    Parameters
    ----------
    value : float
        Finite.
    uncertainty : float or None
        Standard uncertainty in the same unit, finite and positive; None when not stated.
    exact : bool
        Whether the value is exact; then `uncertainty` may be 0.

    Returns
    -------
    RoundedText
        Two digits of the uncertainty, the value to the same place, ties to even on the shortest decimal form of
        both numbers. Without an uncertainty, all digits of the value up to twelve; an exact value keeps all.

    Raises
    ------
    ValueError
        For NaN, infinity, a negative uncertainty, or zero without `exact`.

    Examples
    --------
    >>> rounded(0.73124, 0.00119).plain()
    '0.7312(12)'
    >>> rounded(1234.0, 120.0).plain()
    '1.23(12)e3'
    """
    if not math.isfinite(value):
        raise ValueError(f"found value {value}; expected a finite number")
    if uncertainty is not None and not math.isfinite(uncertainty):
        raise ValueError(f"found uncertainty {uncertainty}; expected a finite number")
    number = Decimal(repr(float(value)))
    if uncertainty is None:
        if len(number.as_tuple().digits) > _MOST_DIGITS:
            number = _at_place(number, number.adjusted() - _MOST_DIGITS + 1)
        return _all_digits(number)
    if uncertainty == 0 and exact:
        return _all_digits(number)
    if uncertainty <= 0:
        raise ValueError(
            f"found uncertainty {uncertainty:g}; expected a positive one, or a value declared exact"
        )
    spread = Decimal(repr(float(uncertainty)))
    place = spread.adjusted() - 1
    spread = _at_place(spread, place)
    if spread.adjusted() - 1 > place:
        # 0.0996 becomes 0.10: one place fewer keeps two digits.
        place += 1
        spread = _at_place(spread, place)
    number = _at_place(number, place)
    # A power of ten where u >= 10, and where leading zeros would drown both numbers.
    lead = max(number.adjusted() if number else place + 1, place + 1)
    power = lead if place >= 0 or lead < _SMALL else 0
    return RoundedText(_fixed(number, place, power), _bracket(spread, place, power), power)


def _at_place(number: Decimal, place: int) -> Decimal:
    return number.quantize(Decimal(1).scaleb(place), context=_WIDE)


def _fixed(number: Decimal, place: int, power: int) -> str:
    text = f"{number.scaleb(-power, context=_WIDE):f}"
    # minus zero says nothing: -0.00(10) is 0.00(10)
    return text.removeprefix("-") if number == 0 else text


def _bracket(spread: Decimal, place: int, power: int) -> str:
    shown = spread.scaleb(-power, context=_WIDE)
    if shown >= 1:
        return f"{shown:f}"
    return str(int(spread.scaleb(-place, context=_WIDE)))


def _all_digits(number: Decimal) -> RoundedText:
    if number == 0:
        return RoundedText("0", "")
    lead = number.adjusted()
    power = lead if lead >= _LARGE or lead < _SMALL else 0
    text = f"{number.scaleb(-power, context=_WIDE).normalize(_WIDE):f}"
    return RoundedText(text, "", power)


def plain_text(quantity: Quantity) -> str:
    """Return a quantity as plain text, e.g. ``0.7312(12) K on ITS-90``; `Quantity.parse` reads it back.

    Parameters
    ----------
    quantity : Quantity
        Shown in its own unit.

    Returns
    -------
    str
        Rounded value, bracket, unit, convention and scale.

    Notes
    -----
    Where nothing was said about the uncertainty the number stands alone; who prints it adds "u nr".
    """
    number = rounded(quantity.value, quantity.uncertainty, exact=quantity.exact).plain()
    unit = "" if quantity.unit == "1" else quantity.unit
    return " ".join(part for part in (number, unit, *_words(quantity)) if part)


def html_text(quantity: Quantity) -> str:
    """Return a quantity in typographic Unicode that may stand in HTML as it is.

    Parameters
    ----------
    quantity : Quantity
        Shown in its own unit.

    Returns
    -------
    str
        True minus, multiplication sign, superscripts, no-break space before the unit; a scale's name is escaped.
    """
    number = rounded(quantity.value, quantity.uncertainty, exact=quantity.exact).typographic()
    parts = [number, "" if quantity.unit == "1" else parse_unit(quantity.unit).typographic]
    parts += [html.escape(word) for word in _words(quantity)]
    return _NO_BREAK.join(part for part in parts if part)


def latex_text(quantity: Quantity) -> str:
    r"""Return a quantity as ``\val{...}{...}{...}{...}``: siunitx number, maths number, siunitx unit, maths unit.

    Parameters
    ----------
    quantity : Quantity
        Shown in its own unit.

    Returns
    -------
    str
        The macro with its four arguments, then convention and scale as words. The caller defines ``\val`` as
        ``\qty{#1}{#3}`` with siunitx and as ``\ensuremath{#2\,\mathrm{#4}}`` without.
    """
    number = rounded(quantity.value, quantity.uncertainty, exact=quantity.exact)
    unit = parse_unit(quantity.unit)
    macro = rf"\val{{{number.plain()}}}{{{number.maths()}}}{{{unit.siunitx}}}{{{unit.latex}}}"
    words = [word.translate(_LATEX) for word in _words(quantity)]
    return "~".join([macro, *words])


_LATEX = str.maketrans(
    {"\\": r"\textbackslash{}", "_": r"\_", "%": r"\%", "#": r"\#", "&": r"\&", "$": r"\$", "{": r"\{", "}": r"\}",
     "^": r"\textasciicircum{}", "~": r"\textasciitilde{}"}
)  # fmt: skip


def _words(quantity: Quantity) -> list[str]:
    words: list[str] = [quantity.convention] if quantity.convention else []
    words += [f"on {quantity.scale}"] if quantity.scale else []
    return words + (["(exact)"] if quantity.exact else [])


def in_preferred_unit(quantity: Quantity) -> Quantity:
    """Return the quantity in the display unit of its kind that reads best.

    Parameters
    ----------
    quantity : Quantity
        In any unit of its kind.

    Returns
    -------
    Quantity
        In the largest display unit that leaves at least one digit before the point; where a standard uncertainty of 10
        or more would take a power of ten out there, or five digits stand before the point, the next larger one, so that
        60(140) nmol reads 0.06(14) umol and an inverse quality factor of 0.1 is not 100000 ppm. The smallest if none leaves a digit, the middle of the list for zero. Exact fractions convert, so the digits shown do
        not depend on the way.
    """
    units = [
        unit
        for unit in kind_of(quantity.kind).display
        if parse_unit(unit).dimension == parse_unit(quantity.si_unit).dimension
    ]
    shown = [quantity.to(unit) for unit in units]
    size = [max(abs(one.value), one.uncertainty or 0.0) for one in shown]
    if size[0] == 0:
        return shown[len(shown) // 2]
    place = max((place for place, big in enumerate(size) if big >= 1), default=0)
    larger = [at for at, big in enumerate(size) if big < size[place]]
    if not larger:
        return shown[place]
    following = max(larger, key=size.__getitem__)
    long = size[place] >= _LONG and size[following] >= _NOT_TOO_SHORT
    # 9.95 rounds to 10, which takes a power of ten out as well.
    return shown[following if long or (shown[place].uncertainty or 0.0) >= _POWER_TAKEN else place]
