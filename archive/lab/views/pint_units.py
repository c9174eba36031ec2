"""Numbers with a unit of the archive, as quantities of pint.

Rule: the units go through the allow-list of `schemas.units`, so that pint never reads a text of a file.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Any

from schemas.unit_names import NAMES, PREFIXES
from schemas.unit_registry import DEFINITIONS
from schemas.units import parse_unit

if TYPE_CHECKING:
    import pint

__all__ = ["pint_quantity", "pint_words"]


def pint_words(unit: str) -> str:
    """Unit in the words that pint reads.

    Parameters
    ----------
    unit : str
        Unit as sheets write it.

    Raises
    ------
    ValueError
        If it is no unit.

    Examples
    --------
    >>> pint_words("umol/m^2"), pint_words("J/(mol K)"), pint_words("1")
    ('micromole/meter**2', 'joule/(mole*kelvin)', '')
    """
    text = parse_unit(unit).text
    if text == "1":
        return ""
    return _words(text)


def _words(text: str) -> str:
    # Exponents are set apart first: their digits are no names.
    parts = re.split(r"(\^-?\d+|[ /()])", text)
    signs = {" ": "*", "/": "/", "(": "(", ")": ")"}
    return "".join(
        "**" + part[1:] if part.startswith("^") else signs.get(part) or (_word(part) if part else "")
        for part in parts
    )


def _word(name: str) -> str:
    if name in NAMES:
        return NAMES[name].pint or "1"
    return PREFIXES[name[0]][0] + NAMES[name[1:]].pint


def pint_quantity(values: Any, unit: str) -> pint.Quantity[Any]:
    """Numbers with their unit, in the registry that other quantities of the process have, too.

    Parameters
    ----------
    values : float or ndarray
        Numbers in `unit`.
    unit : str
        Unit as sheets write it.

    Examples
    --------
    >>> print(pint_quantity(2.0, "umol/m^2"))
    2.0 micromole / meter ** 2
    """
    import pint

    # It has no annotations.
    registry: Any = pint.get_application_registry()  # type: ignore[no-untyped-call]
    for definition in DEFINITIONS:
        # Names of our own; whoever set up the registry has them only from here.
        if definition.partition(" ")[0] not in registry:
            registry.define(definition)
    quantity: pint.Quantity[Any] = registry.Quantity(values, pint_words(unit))
    return quantity
