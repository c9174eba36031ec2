"""The unit names this trade uses, as literal tables: the allow-list, other spellings, and answers to mistakes.

Rules
-----
* A name that is not here never reaches pint, which would take M for molar, R for the gas constant, k for the Boltzmann
  constant, c for the speed of light, e for the elementary charge, u for an atomic mass and B for a byte.
* A prefix stands beside a name only where the trade uses it; that alone keeps MK, Ms and kK out.

References
----------
The International System of Units (SI Brochure), 9th edition, BIPM 2019, table 7.
The Unified Code for Units of Measure (UCUM), version 2.2, 2024.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["HINTS", "NAMES", "PREFIXES", "SPELLINGS", "STP_QUESTION", "Name"]

# SI Brochure, table 7; the words are pint's.
PREFIXES = {
    "f": ("femto", -15),
    "p": ("pico", -12),
    "n": ("nano", -9),
    "u": ("micro", -6),
    "m": ("milli", -3),
    "c": ("centi", -2),
    "h": ("hecto", 2),
    "k": ("kilo", 3),
    "M": ("mega", 6),
    "G": ("giga", 9),
}


@dataclass(frozen=True, slots=True)
class Name:
    """One row of the allow-list: what pint calls it, its UCUM code ("" if UCUM cannot say it), prefixes, siunitx."""

    pint: str
    ucum: str
    prefixes: str = ""
    tex: str = ""
    shown: str = ""
    bare: bool = True


# The whole vocabulary. A prefix stands here only where the trade uses it; that alone keeps MK, Ms and kK out.
# UCUM: the torr has no code; mm[Hg] is tabulated as 133.322 Pa, 2.9 ppm below the conventional value; an annotation
# such as cm3{STP} is ignored by UCUM software and would turn an amount into a volume. All three get no code.
NAMES: dict[str, Name] = {
    "1": Name("", "1", tex="1"),
    "%": Name("percent", "%", tex=r"\%"),
    "ppm": Name("ppm", "[ppm]", tex="ppm"),
    "K": Name("kelvin", "K", "num"),
    "s": Name("second", "s", "pnum"),
    "min": Name("minute", "min"),
    "h": Name("hour", "h"),
    "d": Name("day", "d"),
    "Hz": Name("hertz", "Hz", "numkMG"),
    "rad": Name("radian", "rad", "num"),
    "deg": Name("degree", "deg"),
    "m": Name("meter", "m", "pnumck"),
    "angstrom": Name("angstrom", "Ao", tex=r"\mbox{\AA}", shown="Å"),
    "g": Name("gram", "g", "pnumk"),
    "mol": Name("mole", "mol", "pnumk"),
    "atoms": Name("stillroom_atom", "{atoms}"),
    "molecules": Name("stillroom_atom", "{molecules}"),
    "Pa": Name("pascal", "Pa", "numhkMG"),
    "bar": Name("bar", "bar", "num"),
    "atm": Name("standard_atmosphere", "atm"),
    "Torr": Name("torr", "", "um"),
    "mmHg_0C": Name("stillroom_mercury", "", tex=r"mmHg\,(0\,{}^{\circ}C)"),
    "psi": Name("pound_force_per_square_inch", "[psi]"),
    "L": Name("liter", "L", "num"),
    "cm3_STP_0C_101325Pa": Name("stillroom_stp_atm", "", tex=r"cm^{3}\,(0\,{}^{\circ}C,\,101325\,Pa)"),
    "cm3_STP_0C_100kPa": Name("stillroom_stp_bar", "", tex=r"cm^{3}\,(0\,{}^{\circ}C,\,100\,kPa)"),
    "N": Name("newton", "N", "pnumk"),
    "dyn": Name("dyne", "dyn"),
    "J": Name("joule", "J", "pnumk"),
    "erg": Name("erg", "erg"),
    "cal_th": Name("thermochemical_calorie", "cal_th", tex=r"cal_{th}"),
    "W": Name("watt", "W", "fpnumk"),
    "V": Name("volt", "V", "pnumk"),
    "A": Name("ampere", "A", "fpnumk"),
    "Ohm": Name("ohm", "Ohm", "numkMG", tex=r"\Omega", shown="Ω"),
    "S": Name("siemens", "S", "pnum"),
    "F": Name("farad", "F", "fpnum"),
    "H": Name("henry", "H", "pnum"),
    "C": Name("coulomb", "C", "fpnum"),
    "T": Name("tesla", "T", "num"),
    # P alone reads as poise or as a lost prefix (peta): only the prefixed poise of the tables is taken.
    "P": Name("poise", "P", "umc", bare=False),
}

SPELLINGS = {
    "ohm": "Ohm",
    "Ω": "Ohm",
    "torr": "Torr",
    "l": "L",
    "Å": "angstrom",
    "Angstrom": "angstrom",
    "atom": "atoms",
    "molecule": "molecules",
    "°": "deg",
    "poise": "P",
}

STP_QUESTION = (
    "a standard cubic centimetre needs its reference state (44.6150 umol at 0 C and 101325 Pa, 44.0316 umol at 0 C"
    " and 100 kPa); write cm3_STP_0C_101325Pa or cm3_STP_0C_100kPa, or give the amount in umol"
)
_LAYER = (
    "a layer needs the substrate's own definition; write the coverage in umol/m^2 or atoms/nm^2, or give the number of"
    " layers and the coverage of one layer"
)
_CELSIUS = "an archive keeps temperatures in kelvin; add 273.15 to degrees Celsius and write K"
_DEGREE_K = "the kelvin carries no degree; write K or mK, and the scale after 'on'"

# What people write instead, with the sentence that helps. Looked up before the allow-list.
HINTS: dict[str, str] = {
    "mmHg": "write Torr (101325/760 Pa), or mmHg_0C for the height of a real mercury column reduced to 0 C",
    "mm[Hg]": "write Torr (101325/760 Pa), or mmHg_0C for the height of a real mercury column reduced to 0 C",
    "umHg": "write mTorr, or mmHg_0C for the height of a real mercury column reduced to 0 C",
    "MK": "MK is a million kelvin; for millikelvin write mK",
    "mk": "there is no such unit; for millikelvin write mK",
    "k": "k alone is a prefix, not a unit; for kelvin write K",
    "kelvin": "write K",
    "Kelvin": "write K",
    "degK": _DEGREE_K,
    "°K": _DEGREE_K,
    "mdeg": "as a temperature write mK; as an angle write mrad or a fraction of deg",
    "degC": _CELSIUS,
    "°C": _CELSIUS,
    "celsius": _CELSIUS,
    "Celsius": _CELSIUS,
    "℃": _CELSIUS,
    "Cel": _CELSIUS,
    "degF": "write the temperature in K",
    "°F": "write the temperature in K",
    "Ms": "Ms is a million seconds; for milliseconds write ms",
    "sec": "write s",
    "msec": "write ms",
    "usec": "write us",
    "hr": "write h",
    "day": "write d",
    "days": "write d",
    "P": "P alone may be a poise or a lost prefix; write mPa s or uP",
    "R": "R alone is the gas constant, not a unit; for resistance write Ohm",
    "M": "M alone is a prefix or a molarity, not a unit; write mol or m",
    "c": "c alone is no unit here; for length write cm",
    "e": "e alone is no unit here; write C for a charge",
    "a": "a alone is no unit here; write d or s",
    "t": "t alone is no unit here; write kg",
    "B": "B alone is no unit here",
    "G": "G may be a gauss or a lost prefix; 1 gauss is 1e-4 T, write T",
    "Oe": "1 oersted in vacuum is 1e-4 T; write T",
    "gauss": "1 gauss is 1e-4 T; write T",
    "u": "u alone is a prefix or an atomic mass; for molar mass write g/mol",
    "micron": "a bare micron may be a length or a pressure; write um or mTorr",
    "microns": "a bare micron may be a length or a pressure; write um or mTorr",
    "cc": "write cm^3 for a volume, or an amount in umol",
    "psig": "write 'psi gauge'",
    "psia": "write 'psi absolute'",
    "barg": "write 'bar gauge'",
    "bara": "write 'bar absolute'",
    "mbara": "write 'mbar absolute'",
    "Vrms": "write 'V rms'",
    "Vpp": "write 'V peak-to-peak'",
    "Vpk": "write 'V peak'",
    "Vp": "write 'V peak'",
    "mVrms": "write 'mV rms'",
    "mVpp": "write 'mV peak-to-peak'",
    "layer": _LAYER,
    "layers": _LAYER,
    "ML": _LAYER,
    "monolayer": _LAYER,
    "monolayers": _LAYER,
    "dB": "a decibel needs its reference; write the ratio itself, or W or V",
    "dBm": "write the power in W or mW",
    "Da": "for molar mass write g/mol",
    "Q": "write the number alone: a quality factor and its inverse have no unit",
}

# Units written out in words.
_IN_WORDS = {
    "second": "s", "minute": "min", "hour": "h", "hertz": "Hz", "radian": "rad", "degree": "deg", "meter": "m",
    "metre": "m", "gram": "g", "mole": "mol", "pascal": "Pa", "newton": "N", "joule": "J", "watt": "W", "volt": "V",
    "ampere": "A", "amp": "A", "farad": "F", "henry": "H", "coulomb": "C", "tesla": "T", "liter": "L", "litre": "L",
    "percent": "%",
}  # fmt: skip
HINTS |= {
    spelling: f"write {symbol}"
    for word, symbol in _IN_WORDS.items()
    for spelling in (word, f"{word}s", word.capitalize(), f"{word.capitalize()}s")
}
