"""Numbers as they are shown: rounded once, in one place, in three spellings that carry the same digits.

Rules
-----
* Nothing is shown bare: a measured value without a stated uncertainty carries ``[u nr]``.
* What is absent is shown as its code, never as a blank, a zero or a dash.
"""

from __future__ import annotations

import html
import math
from dataclasses import dataclass

from typing_extensions import override

from archive.reports.tex import Tex, tex
from schemas.kinds import KINDS, kind_of_si
from schemas.lineage import OutputEntry, Value
from schemas.quantity import Quantity
from schemas.uncertain_text import html_text, in_preferred_unit, latex_text, plain_text, rounded

__all__ = [
    "CODES",
    "LOST",
    "NOT_RECORDED",
    "Shown",
    "absent",
    "grouped",
    "shown",
    "shown_number",
    "shown_output",
    "shown_value",
    "words",
]

_DIGITS_WITHOUT_UNCERTAINTY = 4

CODES: dict[str, str] = {
    "[nr]": "not recorded",
    "[u nr]": "standard uncertainty not recorded",
    "[nm]": "not measured",
    "[na]": "does not apply",
    "[pend]": "not reduced yet",
    "[lost]": "the rows hold no value",
}
"""What each code of absence means, as the legend prints it."""


@dataclass(frozen=True)
class Shown:
    """One value as it is printed.

    Parameters
    ----------
    plain : str
        ASCII, as JSON and CSV carry it.
    text : str
        Typographic Unicode for page and paper.
    latex : Tex
        For LaTeX.
    """

    plain: str
    text: str
    latex: Tex

    @override
    def __str__(self) -> str:
        return self.text


def words(text: str) -> Shown:
    """Return words as they are."""
    return Shown(text, text, tex(text))


def grouped(count: int) -> str:
    r"""Return a count with thin spaces between groups of three digits, from five digits on.

    Examples
    --------
    >>> grouped(1234), grouped(75736).split("\u2009")
    ('1234', ['75', '736'])
    """
    return f"{count:,}".replace(",", "\u2009") if count >= 10000 else str(count)


def absent(code: str) -> Shown:
    """Return the code of an absent value, such as ``nr``."""
    return words(f"[{code}]")


NOT_RECORDED = absent("nr")
LOST = absent("lost")


def shown(
    quantity: Quantity | None, *, preferred: bool = False, setting: bool = False, code: str = "nr"
) -> Shown:
    """Return a quantity as it is printed.

    Parameters
    ----------
    quantity : Quantity or None
        None is shown as its code.
    preferred : bool
        In the unit people like to read, not in its own.
    setting : bool
        A setting or the end of a range: no uncertainty is expected of it.
    code : str
        Code of absence.
    """
    if quantity is None:
        return absent(code)
    if preferred:
        quantity = in_preferred_unit(quantity)
    plain, text, latex = plain_text(quantity), html.unescape(html_text(quantity)), Tex(latex_text(quantity))
    if quantity.uncertainty is None and not setting:
        return Shown(f"{plain} [u nr]", f"{text} [u\u00a0nr]", Tex(rf"{latex}~{{[}}u~nr{{]}}"))
    return Shown(plain, text, latex)


def shown_value(
    value: Value | None, kind: str, *, setting: bool = False, code: str = "nr", unit: str | None = None
) -> Shown:
    """Return a value of a document as it is printed, in the unit people like to read unless one is named."""
    if value is None or value.value is None:
        return absent(code)
    return _of(
        value.value, value.uncertainty, value.unit, kind, value.scale, setting=setting, unit_shown=unit
    )


def shown_output(output: OutputEntry | None) -> Shown:
    """Return a scalar result: its number, else its verdict, else why there is none."""
    if output is None:
        return absent("pend")
    if output.value is None or not math.isfinite(output.value):
        return words(output.verdict) if output.verdict else LOST
    return _of(output.value, output.uncertainty, output.unit, output.quantity, output.scale)


def shown_number(
    value: float | None, uncertainty: float | None, unit: str, *, setting: bool = False
) -> Shown:
    """Return a number of which only the unit is known, as a list of the index has it, in the unit people like to read.

    Examples
    --------
    >>> shown_number(0.00100321409, 2.9e-13, "s").plain
    '1.00321409000(29) ms'
    """
    if value is None or not math.isfinite(value):
        return LOST
    if unit == "1":
        # A pure number may be of any kind: it is shown as it is.
        return _of(value, uncertainty, unit, "", None, setting=setting)
    kind = kind_of_si(unit, value)
    if unit == "K":
        # Temperatures of one table are compared with each other, so they keep one unit.
        return _of(value, uncertainty, unit, "temperature", None, setting=setting, unit_shown="K")
    return _of(value, uncertainty, unit, kind or "", None, setting=setting)


def _of(
    value: float,
    u: float | None,
    unit: str,
    kind: str,
    scale: str | None,
    *,
    setting: bool = False,
    unit_shown: str | None = None,
) -> Shown:
    # What was counted is exact: an order, a number of lines.
    setting = setting or kind == "count"
    # A zero uncertainty in a document says that none is known, not that the value is exact.
    spread = u if u is not None and math.isfinite(u) and u > 0 else None
    if spread is None and not setting:
        # A computed number whose uncertainty is not known shows no more than this.
        value = float(f"{value:.{_DIGITS_WITHOUT_UNCERTAINTY}g}")
    if kind not in KINDS:
        number = rounded(value, spread)
        tail = "" if spread is not None or setting else " [u nr]"
        name = "" if unit == "1" else f" {unit}"
        return Shown(
            number.plain() + name + tail,
            number.typographic() + name + tail,
            Tex(rf"${number.maths()}$" + tex(name + tail)),
        )
    scaled = scale if KINDS[kind].scaled else None
    quantity = Quantity(value=value, uncertainty=spread, unit=unit, kind=kind, scale=scaled)
    if unit_shown is not None:
        return shown(quantity.to(unit_shown), setting=setting)
    return shown(quantity, preferred=True, setting=setting)
