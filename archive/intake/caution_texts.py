"""Sentences and numbers of the cautions; the text fixed for every output that carries one.

Rules: a fact, what follows, who decides. Words of approval do not occur; rules of a jurisdiction are not paraphrased.
Numbers have two digits and are rounded to the unfavourable side.
"""

from __future__ import annotations

import math
from typing import Final

__all__ = ["BIAS", "EVENTS", "FIXED_TEXT", "amount_text", "pressure_text", "unfavourable"]

FIXED_TEXT: Final = (
    "Estimate from recorded values, ideal mixing and stated assumptions. It does not replace the rules of this site, the "
    "institution's safety officer, or work that law reserves to licensed or qualified persons. Where they differ from "
    "this sheet, they prevail."
)

EVENTS: Final[dict[str, tuple[tuple[str, str, tuple[str, ...]], ...]]] = {
    "transfer": (
        (
            "cold burns",
            "A transfer is recorded. Cold metal and cold gas injure as liquid does: loose dry gloves, a face shield, no "
            "jewellery, no open pockets. The rules of this site decide.",
            (),
        ),
        (
            "oxygen in the room",
            "A transfer is recorded. Liquid that is lost becomes some 750 times its volume of gas at 293 K (helium) or some "
            "690 times (nitrogen) and displaces air; local pockets are worse than the mean, and layering is not to be relied on. "
            "Ask {contact}.",
            ("free volume of the room", "amount of liquid", "measured flow of fresh air"),
        ),
        (
            "oxygen-rich condensate",
            "Surfaces below 90 K that are open to air condense air rich in oxygen: keep oil and fuel away, and leave no "
            "nitrogen trap open to air or pumping air.",
            (),
        ),
        (
            "working alone, lifts",
            "A transfer is recorded. Nobody travels in a lift with a vessel of cryogen; whether anybody may work alone is for "
            "the rules of this site to say.",
            (),
        ),
    ),
    "plug": (
        (
            "plug",
            "A plug is recorded. Treat the volume behind it as closed; both sides may hold gas that presses when it warms. "
            "Stand clear of the neck, do not improvise, and call {contact}.",
            ("volume behind the plug", "amount of gas behind the plug"),
        ),
    ),
    "leak": (
        (
            "gas in the vacuum space",
            "A leak is recorded. Gas that froze or was adsorbed in the vacuum space comes free when it warms. Ask {contact} "
            "before warming.",
            ("volume of the vacuum space", "amount of gas in it", "relief device of the vacuum space"),
        ),
    ),
    "magnet": (
        (
            "magnetic field",
            "A magnet was used. Beyond the contour of 0.5 mT people with implants stay outside; loose iron becomes a missile. "
            "A quench boils the bath and warms closed volumes; the stored energy is L I^2/2. Ask {contact}.",
            ("inductance and current of the magnet", "volume of the bath"),
        ),
    ),
    "power-loss": (
        (
            "power loss",
            "A loss of power is recorded. Volumes that warm while pumps stand and valves keep their state may be closed. "
            "Look at the trapped gas above and ask {contact}.",
            (),
        ),
    ),
}
"""Per kind of event: subject, text, inputs that the record does not hold."""

BIAS: Final = (
    "Stored charge can shock after the supply is off, and a startle is a hazard in itself. For orientation: 300 V on 400 pF "
    "hold 18 uJ, with a filter of 1 uF 45 mJ. The electrical rules of this site decide.",
    "Helium at low pressure breaks down above about 156 V near 4 Torr cm (from memory): for a gap of 0.1 mm at about 0.76 kPa "
    "and 4.2 K. Switch the bias off while gas is admitted or pumped.",
)
"""Stored energy; discharge (R. Massarczyk et al., arXiv:1612.07170, for the scaling with temperature)."""


def unfavourable(value: float, digits: int = 2) -> str:
    """Return a number rounded up to a few digits.

    Examples
    --------
    >>> unfavourable(3.722), unfavourable(0.0073), unfavourable(114.2)
    ('3.8', '0.0073', '120')
    """
    if not value > 0:
        return "0"
    place = 10.0 ** (math.floor(math.log10(value)) - digits + 1)
    # A value that has just so many digits stays as it is.
    steps = math.ceil(round(value / place, 9))
    return f"{float(f'{steps * place:.{digits}g}'):.12g}"


def pressure_text(pressure: float) -> str:
    """Return a pressure in Pa, kPa or MPa, rounded up."""
    for least, factor, unit in ((1e5, 1e-6, "MPa"), (1e3, 1e-3, "kPa")):
        if pressure >= least:
            return f"{unfavourable(pressure * factor)} {unit}"
    return f"{unfavourable(pressure)} Pa"


def amount_text(amount: float) -> str:
    """Return an amount in umol or mmol, rounded up."""
    return f"{unfavourable(1e3 * amount)} mmol" if amount >= 1e-3 else f"{unfavourable(1e6 * amount)} umol"
