"""Units as this trade writes them: read, refused with a reason, spelled in one way, and turned into SI.

Rules
-----
* Text is read here, against a literal table of names; pint only ever sees names from that table. So ``M``, ``R``,
  ``k``, ``c`` or ``e``, which pint takes for molar, gas constant, Boltzmann constant, speed of light and
  elementary charge, and ``9**9**9``, which would keep it busy for ever, never reach it.
* Case matters (mK and MK differ by 10^9); ``u``, the micro sign and the Greek mu all mean micro.
* After a solidus only one unit or a bracket may stand: "J/mol K" has two readings and is refused.
* A unit that hides a convention (cm3 STP, mmHg, layers) is not guessed: the sentence asks which one is meant.
* Factors are exact fractions until the last step, so 1 umol is 1e-6 mol and not its neighbour.
* pint is loaded at the first conversion, not when this module is imported.

References
----------
The International System of Units (SI Brochure), 9th edition, BIPM 2019, sections 2.3 and 5.4.
The Unified Code for Units of Measure (UCUM), version 2.2, 2024.
"""

from __future__ import annotations

import difflib
import pickle
import re
from dataclasses import dataclass
from fractions import Fraction
from functools import cache, lru_cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Iterable

__all__ = ["Dimension", "Unit", "parse_unit", "plain_number_text", "ucum"]

MAX_LENGTH = 64
MAX_NESTING = 4
MAX_EXPONENT = 9

Dimension = tuple[tuple[str, int], ...]
"""Sorted pairs of an SI base dimension (as pint names it, without brackets) and its exponent."""

# SI Brochure, table 7; the words are pint's.
_PREFIXES = {
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
class _Name:
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
_NAMES: dict[str, _Name] = {
    "1": _Name("", "1", tex="1"),
    "%": _Name("percent", "%", tex=r"\%"),
    "ppm": _Name("ppm", "[ppm]", tex="ppm"),
    "K": _Name("kelvin", "K", "num"),
    "s": _Name("second", "s", "pnum"),
    "min": _Name("minute", "min"),
    "h": _Name("hour", "h"),
    "d": _Name("day", "d"),
    "Hz": _Name("hertz", "Hz", "numkMG"),
    "rad": _Name("radian", "rad", "num"),
    "deg": _Name("degree", "deg", "m"),
    "m": _Name("meter", "m", "pnumck"),
    "angstrom": _Name("angstrom", "Ao", tex=r"\text{\AA}", shown="Å"),
    "g": _Name("gram", "g", "pnumk"),
    "mol": _Name("mole", "mol", "pnumk"),
    "atoms": _Name("stillroom_atom", "{atoms}"),
    "molecules": _Name("stillroom_atom", "{molecules}"),
    "Pa": _Name("pascal", "Pa", "numhkMG"),
    "bar": _Name("bar", "bar", "num"),
    "atm": _Name("standard_atmosphere", "atm"),
    "Torr": _Name("torr", "", "um"),
    "mmHg_0C": _Name("stillroom_mercury", "", tex=r"mmHg\,(0\,{}^{\circ}C)"),
    "psi": _Name("pound_force_per_square_inch", "[psi]"),
    "L": _Name("liter", "L", "num"),
    "cm3_STP_0C_101325Pa": _Name("stillroom_stp_atm", "", tex=r"cm^{3}\,(0\,{}^{\circ}C,\,101325\,Pa)"),
    "cm3_STP_0C_100kPa": _Name("stillroom_stp_bar", "", tex=r"cm^{3}\,(0\,{}^{\circ}C,\,100\,kPa)"),
    "N": _Name("newton", "N", "pnumk"),
    "dyn": _Name("dyne", "dyn"),
    "J": _Name("joule", "J", "pnumk"),
    "erg": _Name("erg", "erg"),
    "cal_th": _Name("thermochemical_calorie", "cal_th", tex=r"cal_{th}"),
    "W": _Name("watt", "W", "fpnumk"),
    "V": _Name("volt", "V", "pnumk"),
    "A": _Name("ampere", "A", "fpnumk"),
    "Ohm": _Name("ohm", "Ohm", "numkMG", tex=r"\Omega", shown="Ω"),
    "F": _Name("farad", "F", "fpnum"),
    "H": _Name("henry", "H", "pnum"),
    "C": _Name("coulomb", "C", "fpnum"),
    "T": _Name("tesla", "T", "num"),
    # P alone reads as poise or as a lost prefix (peta): only the prefixed poise of the tables is taken.
    "P": _Name("poise", "P", "umc", bare=False),
}

_SPELLINGS = {
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

_DEFINITIONS = (
    # SI Brochure, 2.3.1: the Avogadro constant is exactly 6.02214076e23 per mole.
    "stillroom_atom = mole / 6.02214076e23",
    # 13595.1 kg/m3 x 9.80665 m/s2 x 1 mm, the conventional millimetre of mercury at 0 C.
    "stillroom_mercury = 133.322387415 * pascal",
    # n = p V / (R T) of an ideal gas at 273.15 K, R = 8.31446261815324 J/(mol K) exactly (CODATA 2022).
    "stillroom_stp_atm = 101325e-6 / 8.31446261815324 / 273.15 * mole",
    "stillroom_stp_bar = 100000e-6 / 8.31446261815324 / 273.15 * mole",
)

_STP_QUESTION = (
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
_HINTS: dict[str, str] = {
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
    "S": "S is the siemens; for seconds write s",
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

_STP = re.compile(r"(?<![A-Za-z])(?:sccm|sccs|sccs?|cc[_ ]?\(?STP\)?|N?ccSTP|slpm|NTP|STP)(?![A-Za-z])|STP|sccm", re.I)
_ALLOWED = re.compile(r"[A-Za-z0-9 ./*^()%_+\[\]{}°ΩÅ℃-]*\Z")
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")
_SUPERSCRIPT_RUN = re.compile("[⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺]+")
_SPACES = re.compile("[\\s\u00a0\u2000-\u200a\u202f\u205f]+")
_TOKEN = re.compile(
    r"(?P<name>cm3_STP_0C_101325Pa|cm3_STP_0C_100kPa|mmHg_0C|mm\[Hg\]|cal_th|℃|°[CFK]?|[A-Za-zΩÅ]+|%|1(?![0-9]))"
    r"|(?P<power>\*\*|\^)|(?P<times>[ *.]+)|(?P<over> ?/ ?)|(?P<open>\()|(?P<close>\))|(?P<integer>[+-]?[0-9]+)"
)


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit read from text: its one spelling, UCUM code, factor to coherent SI and dimension.

    Parameters
    ----------
    text : str
        The canonical spelling, e.g. ``umol/m^2``; reading it again gives the same unit.
    factor : Fraction
        Exact number of coherent SI units in one of these.
    dimension : Dimension
        Exponents of the SI base dimensions; radian and counted things other than mol carry none.
    ucum : str
        Case-sensitive UCUM code, "" where UCUM has none.
    siunitx, latex : str
        The literal unit for siunitx (``umol.m^{-2}``) and the maths form for use without it.
    typographic : str
        For pages: micro sign, superscripts and middle dots; needs no HTML escaping.
    names : frozenset of str
        Unit names used, without prefixes.
    """

    text: str
    factor: Fraction
    dimension: Dimension
    ucum: str
    siunitx: str
    latex: str
    typographic: str
    names: frozenset[str]


_Factor = tuple[str, str, int]  # prefix, name, exponent


def plain_number_text(text: str) -> str:
    """Return `text` with typographic signs replaced by the ASCII signs that mean the same.

    Parameters
    ----------
    text : str
        Any text, for instance pasted from a report.

    Returns
    -------
    str
        Text with a plain minus, ``u`` for both micro signs, ``^`` before superscripts and single plain spaces.

    Examples
    --------
    >>> plain_number_text("5 µW·m⁻²")
    '5 uW m^-2'
    """
    text = text.replace("\u2212", "-").replace("\u00b5", "u").replace("\u03bc", "u")
    text = text.replace("\u2126", "Ω").replace("\u212b", "Å").replace("A\u030a", "Å").replace("º", "°")
    text = text.replace("·", " ").replace("⋅", " ").replace("\u2062", " ")
    text = _SUPERSCRIPT_RUN.sub(lambda run: "^" + run.group().translate(_SUPERSCRIPTS), text)
    return _SPACES.sub(" ", text).strip()


@lru_cache(maxsize=2048)
def parse_unit(text: str) -> Unit:
    """Return the unit a piece of text names.

    Parameters
    ----------
    text : str
        At most 64 characters, e.g. ``umol/m^2``, ``J/(mol K)``, ``W m^-2``, ``cm3``.

    Returns
    -------
    Unit
        Spelled canonically, with exact factor and dimension.

    Raises
    ------
    ValueError
        If the text is no unit of the allow-list, is ambiguous, or hides a convention; the sentence says which.

    Examples
    --------
    >>> parse_unit("µmol m⁻²").text
    'umol/m^2'
    """
    factors = _merged(_Reader(_guarded(text)).factors())
    value = Fraction(1)
    dimension: dict[str, int] = {}
    for prefix, name, exponent in factors:
        root, dims = _root(_NAMES[name].pint)
        scale = Fraction(10) ** (_PREFIXES[prefix][1] if prefix else 0)
        value *= (root * scale) ** exponent
        for base, power in dims:
            dimension[base] = dimension.get(base, 0) + power * exponent
    spelled = _spelled(factors)
    return Unit(
        text=spelled,
        factor=value,
        dimension=tuple(sorted((base, power) for base, power in dimension.items() if power)),
        ucum=_ucum(factors),
        siunitx=_siunitx(factors),
        latex=_latex(factors),
        typographic=_typographic(factors),
        names=frozenset(name for _, name, _ in factors),
    )


def ucum(unit: str) -> str:
    """Return the case-sensitive UCUM code of a unit, or "" where UCUM has none.

    Parameters
    ----------
    unit : str
        A unit in any accepted spelling.

    Returns
    -------
    str
        For instance ``umol/m2``; "" for torr, mercury columns and standard cubic centimetres.

    Raises
    ------
    ValueError
        If the unit cannot be read.

    Examples
    --------
    >>> ucum("J/(mol K)"), ucum("Torr")
    ('J/(mol.K)', '')
    """
    return parse_unit(unit).ucum


def _guarded(text: str) -> str:
    """Return the normalised text once it is harmless to read (length, characters, powers, nesting)."""
    if len(text) > MAX_LENGTH:
        raise ValueError(f"found a unit of {len(text)} characters; expected at most {MAX_LENGTH}")
    plain = plain_number_text(text)
    if not plain:
        raise ValueError("found no unit; expected one such as K, umol/m^2 or J/(mol K), or 1 for a pure number")
    asked = plain.replace("cm3_STP_0C_101325Pa", "mol").replace("cm3_STP_0C_100kPa", "mol")
    if _STP.search(asked):
        raise ValueError(f"found unit {_shown(text)}; {_STP_QUESTION}")
    if not _ALLOWED.match(plain):
        strange = next(sign for sign in plain if not _ALLOWED.match(sign))
        raise ValueError(f"found the sign {strange!r} in unit {_shown(text)}; expected letters, digits and / ^ ( )")
    if re.search(r"(?:\*\*|\^)[^A-Za-z/]*(?:\*\*|\^)", plain):
        raise ValueError(f"found a power of a power in unit {_shown(text)}; expected one exponent per unit")
    depth = deepest = 0
    for sign in plain:
        depth += (sign == "(") - (sign == ")")
        deepest = max(deepest, depth)
    if deepest > MAX_NESTING:
        raise ValueError(f"found brackets {deepest} deep in unit {_shown(text)}; expected at most {MAX_NESTING}")
    return plain


class _Reader:
    """Reads a guarded unit text into factors, from left to right."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.tokens: list[tuple[str, str]] = []
        place = 0
        while place < len(text):
            token = _TOKEN.match(text, place)
            if token is None or token.lastgroup is None:
                raise ValueError(f"found {text[place:]!r} in unit {text!r}; expected a unit such as umol/m^2")
            self.tokens.append((token.lastgroup, token.group()))
            place = token.end()
        self.place = 0

    def kind(self) -> str:
        return self.tokens[self.place][0] if self.place < len(self.tokens) else "end"

    def take(self) -> str:
        self.place += 1
        return self.tokens[self.place - 1][1]

    def factors(self) -> list[_Factor]:
        found = self.product()
        if self.kind() != "end":
            raise ValueError(f"found {self.take()!r} out of place in unit {self.text!r}; expected matching brackets")
        return found

    def product(self) -> list[_Factor]:
        found = self.term()
        below = False
        while self.kind() in {"times", "over", "open", "name"}:
            # In "a/b c" and "a/b/c" nobody can tell what is divided by what (SI Brochure 5.4.6).
            if below:
                raise ValueError(
                    f"found unit {self.text!r}, which has two readings; put everything after the / in brackets,"
                    " as in J/(mol K)"
                )
            sign = 1
            if self.kind() == "over":
                sign, below = -1, True
            if self.kind() in {"times", "over"}:
                self.take()
            found += [(prefix, name, sign * exponent) for prefix, name, exponent in self.term()]
        return found

    def term(self) -> list[_Factor]:
        if self.kind() == "open":
            self.take()
            inner = self.product()
            if self.kind() != "close":
                raise ValueError(f"found an open bracket in unit {self.text!r}; expected ')'")
            self.take()
        elif self.kind() == "name":
            inner = [_named(self.take(), self.text)]
        else:
            found = self.take() if self.kind() != "end" else "the end"
            raise ValueError(f"found {found!r} in unit {self.text!r}; expected a unit name such as K or umol")
        exponent = self.exponent()
        return [(prefix, name, power * exponent) for prefix, name, power in inner]

    def exponent(self) -> int:
        if self.kind() == "power":
            self.take()
            bracket = self.kind() == "open"
            if bracket:
                self.take()
            if self.kind() != "integer":
                raise ValueError(f"found no whole number as exponent in unit {self.text!r}; expected one, as in m^-2")
            digits = self.take()
            if bracket:
                if self.kind() != "close":
                    raise ValueError(f"found an open bracket in unit {self.text!r}; expected ')'")
                self.take()
        elif self.kind() == "integer":
            digits = self.take()
        else:
            return 1
        value = int(digits) if len(digits) <= 3 else MAX_EXPONENT + 1
        if value == 0 or abs(value) > MAX_EXPONENT:
            raise ValueError(f"found exponent {digits[:12]} in unit {self.text!r}; expected 1 to {MAX_EXPONENT} or negative")
        return value


@cache
def _vocabulary() -> dict[str, tuple[str, str]]:
    """Return every accepted name with its prefix split off."""
    words: dict[str, tuple[str, str]] = {}
    spellings = [(name, name) for name in _NAMES] + list(_SPELLINGS.items())
    for spelling, name in spellings:
        row = _NAMES[name]
        if row.bare:
            words[spelling] = ("", name)
        for prefix in row.prefixes:
            words[prefix + spelling] = (prefix, name)
    return words


def _named(word: str, text: str) -> _Factor:
    found = _vocabulary().get(word)
    if found is not None:
        return (*found, 1)
    hint = _HINTS.get(word)
    if hint is None:
        near = [name for name in _vocabulary() if name.lower() == word.lower()]
        near = near or difflib.get_close_matches(word, _vocabulary(), n=2, cutoff=0.6)
        hint = f"did you mean {' or '.join(near)}? (case matters)" if near else "write it in SI units"
    raise ValueError(f"found {word!r} in unit {text!r}, which is not a unit known here; {hint}")


def _merged(factors: Iterable[_Factor]) -> list[_Factor]:
    powers: dict[tuple[str, str], int] = {}
    for prefix, name, exponent in factors:
        if name != "1":
            powers[prefix, name] = powers.get((prefix, name), 0) + exponent
    kept = [(prefix, name, power) for (prefix, name), power in powers.items() if power]
    if any(abs(power) > MAX_EXPONENT for _, _, power in kept):
        raise ValueError(f"found an exponent beyond {MAX_EXPONENT}; expected a unit of this trade")
    if len(kept) > 1 and any(name in {"%", "ppm"} for _, name, _ in kept):
        raise ValueError("found % or ppm beside another unit; expected it alone, or one unit, as in 5.0 V +/- 2 %")
    return kept or [("", "1", 1)]


def _sides(factors: list[_Factor]) -> tuple[list[_Factor], list[_Factor]]:
    return (
        [factor for factor in factors if factor[2] > 0],
        [(prefix, name, -power) for prefix, name, power in factors if power < 0],
    )


def _fraction(above: list[str], below: list[str], times: str) -> str:
    text = times.join(above) or "1"
    if not below:
        return text
    return f"{text}/{below[0]}" if len(below) == 1 else f"{text}/({times.join(below)})"


def _spelled(factors: list[_Factor]) -> str:
    above, below = _sides(factors)

    def one(factor: _Factor) -> str:
        prefix, name, power = factor
        return prefix + name + (f"^{power}" if power != 1 else "")

    return _fraction([one(factor) for factor in above], [one(factor) for factor in below], " ")


def _ucum(factors: list[_Factor]) -> str:
    if any(not _NAMES[name].ucum for _, name, _ in factors):
        return ""
    above, below = _sides(factors)

    def one(factor: _Factor) -> str:
        prefix, name, power = factor
        return prefix + _NAMES[name].ucum + (str(power) if power != 1 else "")

    return _fraction([one(factor) for factor in above], [one(factor) for factor in below], ".")


def _tex_name(prefix: str, name: str) -> str:
    return (r"\mu " if prefix == "u" else prefix) + (_NAMES[name].tex or name)


def _latex(factors: list[_Factor]) -> str:
    if factors == [("", "1", 1)]:
        return ""
    return r"\,".join(
        _tex_name(prefix, name) + (f"^{{{power}}}" if power != 1 else "") for prefix, name, power in factors
    )


def _siunitx(factors: list[_Factor]) -> str:
    # A literal siunitx unit: "." separates, nothing is looked up, so no \DeclareSIUnit is needed.
    if factors == [("", "1", 1)]:
        return ""
    parts = []
    for prefix, name, power in factors:
        word = (r"\ensuremath{\mu}" if prefix == "u" else prefix) + (_NAMES[name].tex or name)
        word = word.replace(r"\Omega", r"\ensuremath{\Omega}")
        parts.append(word + (f"^{{{power}}}" if power != 1 else ""))
    return ".".join(parts)


def _typographic(factors: list[_Factor]) -> str:
    parts = []
    for prefix, name, power in factors:
        shown = _NAMES[name].shown or name
        raised = "" if power == 1 else str(power).translate(_RAISED)
        parts.append(("µ" if prefix == "u" else prefix) + shown + raised)
    return "·".join(parts)


def _shown(text: str) -> str:
    return repr(text if len(text) <= MAX_LENGTH else text[:MAX_LENGTH] + "...")


@cache
def _root(name: str) -> tuple[Fraction, Dimension]:
    """Return factor to coherent SI and dimension of one unprefixed unit, as pint defines it."""
    if not name:
        return Fraction(1), ()
    quantity = _registry().Quantity(1, name).to_base_units()
    dims = tuple((base.strip("[]"), int(power)) for base, power in quantity.dimensionality.items())
    return Fraction(quantity.magnitude), dims


@cache
def _registry() -> Any:  # noqa: ANN401 - pint's registry class is generated at run time
    """Return the one pint registry of the process, from its disk cache where there is one."""
    import pint
    from platformdirs import user_cache_path

    def built(folder: str | None) -> Any:  # noqa: ANN401
        # Fractions keep decimal prefixes exact; pint's own floats give 1 umol = 9.999...e-7 mol on some paths.
        registry: Any = pint.UnitRegistry(cache_folder=folder, non_int_type=Fraction)
        for definition in _DEFINITIONS:
            registry.define(definition)
        return registry

    try:
        folder = user_cache_path("stillroom") / f"units-{pint.__version__}"
        folder.mkdir(parents=True, exist_ok=True)
        return built(str(folder))
    except (OSError, EOFError, pickle.UnpicklingError, AttributeError, ImportError, IndexError, TypeError, ValueError):
        # The cache only saves time: a folder that cannot be written, or a file another process is just
        # writing, must not stop anybody.
        return built(None)
