"""Unit texts in column headings, as people write them.

Rules: a unit is what a heading marks as one, `T (mK)`, `R [Ohm]`, `Period/ms` or `p_Pa`. It is left as text; whether
it is a unit at all is decided elsewhere. A heading without such a mark has no unit: none is guessed from a name.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Final

__all__ = ["holds_units", "unit_text"]

_BRACKETED: Final = re.compile(
    r"^(?P<name>.*?\S)\s*(?:\((?P<round>[^()]{1,30})\)|\[(?P<square>[^\[\]]{1,30})\])$"
)
_DIVIDED: Final = re.compile(r"^(?P<name>[^/]*[^/\s])\s*/\s*(?P<unit>[^/\s][^/]{0,29})$")
_APPENDED: Final = re.compile(r"^(?P<name>.+)_(?P<unit>[A-Za-zµμΩ%]{1,8})$")
# After `/` or `_` almost anything can stand (`P/P0`, `T_bath`), so only these are taken for units there.
# fmt: off
_KNOWN: Final = frozenset({
    "s", "ms", "us", "µs", "μs", "ns", "min", "h", "K", "mK", "uK", "µK", "μK", "Pa", "kPa", "hPa", "MPa", "mbar",
    "bar", "ubar", "µbar", "μbar", "Torr", "mTorr", "torr", "mmHg", "psi", "atm", "Hz", "mHz", "kHz", "MHz", "V", "mV",
    "uV", "µV", "μV", "nV", "A", "mA", "uA", "µA", "μA", "nA", "pA", "Ohm", "ohm", "kOhm", "mOhm", "Ω", "kΩ", "mΩ",
    "F", "pF", "nF", "H", "mH", "uH", "µH", "μH", "W", "mW", "uW", "µW", "μW", "nW", "pW", "J", "mJ", "uJ", "µJ",
    "μJ", "mol", "mmol", "umol", "µmol", "μmol", "m", "mm", "um", "µm", "μm", "nm", "cm3", "g", "mg", "ug", "µg",
    "μg", "kg", "T", "mT", "G", "deg", "rad", "%", "ppm",
})
# fmt: on


def unit_text(heading: str) -> tuple[str, str | None, str]:
    """Return the name and the unit text in a heading, and why they are taken for that.

    Parameters
    ----------
    heading : str
        One cell of a header line.

    Returns
    -------
    name : str
        The heading without its unit.
    unit : str or None
        Unit as it stands there; None if the heading marks none.
    why : str
        One sentence.

    Examples
    --------
    >>> unit_text("T (mK)")[:2], unit_text("Period/ms")[:2], unit_text("P/P0")[:2]
    (('T', 'mK'), ('Period', 'ms'), ('P/P0', None))
    """
    bare = heading.strip()
    found = _BRACKETED.match(bare)
    if found:
        unit = found["round"] or found["square"]
        return found["name"], unit.strip() or None, "the heading ends with it in brackets"
    for pattern, mark in ((_DIVIDED, "/"), (_APPENDED, "_")):
        found = pattern.match(bare)
        if found and found["unit"].strip() in _KNOWN:
            return found["name"], found["unit"].strip(), f"the heading ends with {mark} and a unit symbol"
    return bare, None, "the heading marks no unit"


def holds_units(cells: Sequence[str]) -> bool:
    """Whether at least half of the cells of a second header line are unit symbols, in brackets or not.

    Examples
    --------
    >>> holds_units(["(s)", "[mK]", ""]), holds_units(["time", "T", "P"])
    (True, False)
    """
    filled = [cell.strip() for cell in cells if cell.strip()]
    units = [cell for cell in filled if cell in _KNOWN or re.fullmatch(r"\([^()]*\)|\[[^\[\]]*\]", cell)]
    return bool(filled) and 2 * len(units) >= len(filled)
