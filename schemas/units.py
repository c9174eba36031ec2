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
import re
from dataclasses import dataclass
from fractions import Fraction
from functools import cache, lru_cache
from typing import TYPE_CHECKING

from schemas.unit_names import HINTS, NAMES, PREFIXES, SPELLINGS, STP_QUESTION
from schemas.unit_registry import Dimension, root
from schemas.unit_spelling import Factor, latex, siunitx, spelled, typographic, ucum_code

if TYPE_CHECKING:
    from collections.abc import Iterable

__all__ = ["Dimension", "Unit", "parse_unit", "plain_number_text", "ucum"]

MAX_LENGTH = 64
MAX_NESTING = 4
MAX_EXPONENT = 9


_STP = re.compile(
    r"(?<![A-Za-z])(?:sccm|sccs|sccs?|cc[_ ]?\(?STP\)?|N?ccSTP|slpm|NTP|STP)(?![A-Za-z])|STP|sccm", re.I
)
_ALLOWED = re.compile(r"[A-Za-z0-9 ./*^()%_+\[\]{}°ΩÅ℃-]*\Z")
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_SUPERSCRIPT_RUN = re.compile("[⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺]+")
_SPACES = re.compile("[\\s\u00a0\u2000-\u200a\u202f\u205f]+")
_TOKEN = re.compile(
    r"(?P<name>cm3_STP_0C_101325Pa|cm3_STP_0C_100kPa|mmHg_0C|mm\[Hg\]|cal_th|℃|°[CFK]?|[A-Za-zΩÅ]+|%|1(?![0-9]))"
    r"|(?P<power>\*\*|\^)|(?P<over> ?/ ?)|(?P<times>[ *.]+)|(?P<open>\()|(?P<close>\))|(?P<integer>[+-]?[0-9]+)"
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
        Exponents of the SI base dimensions and of the plane angle.
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
        base_factor, dims = root(NAMES[name].pint)
        scale = Fraction(10) ** (PREFIXES[prefix][1] if prefix else 0)
        value *= (base_factor * scale) ** exponent
        for base, power in dims:
            dimension[base] = dimension.get(base, 0) + power * exponent
    return Unit(
        text=spelled(factors),
        factor=value,
        dimension=tuple(sorted((base, power) for base, power in dimension.items() if power)),
        ucum=ucum_code(factors),
        siunitx=siunitx(factors),
        latex=latex(factors),
        typographic=typographic(factors),
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
        raise ValueError(
            "found no unit; expected one such as K, umol/m^2 or J/(mol K), or 1 for a pure number"
        )
    asked = plain.replace("cm3_STP_0C_101325Pa", "mol").replace("cm3_STP_0C_100kPa", "mol")
    if _STP.search(asked):
        raise ValueError(f"found unit {_shown(text)}; {STP_QUESTION}")
    if not _ALLOWED.match(plain):
        strange = next(sign for sign in plain if not _ALLOWED.match(sign))
        raise ValueError(
            f"found the sign {strange!r} in unit {_shown(text)}; expected letters, digits and / ^ ( )"
        )
    if re.search(r"(?:\*\*|\^)[^A-Za-z/]*(?:\*\*|\^)", plain):
        raise ValueError(f"found a power of a power in unit {_shown(text)}; expected one exponent per unit")
    depth = deepest = 0
    for sign in plain:
        depth += (sign == "(") - (sign == ")")
        deepest = max(deepest, depth)
    if deepest > MAX_NESTING:
        raise ValueError(
            f"found brackets {deepest} deep in unit {_shown(text)}; expected at most {MAX_NESTING}"
        )
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

    def factors(self) -> list[Factor]:
        found = self.product()
        if self.kind() != "end":
            raise ValueError(
                f"found {self.take()!r} out of place in unit {self.text!r}; expected matching brackets"
            )
        return found

    def product(self) -> list[Factor]:
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

    def term(self) -> list[Factor]:
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
                raise ValueError(
                    f"found no whole number as exponent in unit {self.text!r}; expected one, as in m^-2"
                )
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
            raise ValueError(
                f"found exponent {digits[:12]} in unit {self.text!r}; expected 1 to {MAX_EXPONENT} or negative"
            )
        return value


@cache
def _vocabulary() -> dict[str, tuple[str, str]]:
    """Return every accepted name with its prefix split off."""
    words: dict[str, tuple[str, str]] = {}
    spellings = [(name, name) for name in NAMES] + list(SPELLINGS.items())
    for spelling, name in spellings:
        row = NAMES[name]
        if row.bare:
            words[spelling] = ("", name)
        for prefix in row.prefixes:
            words[prefix + spelling] = (prefix, name)
    return words


def _named(word: str, text: str) -> Factor:
    found = _vocabulary().get(word)
    if found is not None:
        return (*found, 1)
    place = f"found {word!r}" + (f" in unit {text!r}" if word != text else " as a unit")
    if word in HINTS:
        raise ValueError(f"{place}; {HINTS[word]}")
    near = [name for name in _vocabulary() if name.lower() == word.lower()]
    near = near or difflib.get_close_matches(word, [*_vocabulary(), *HINTS], n=2, cutoff=0.6)
    if near and near[0] in HINTS:
        raise ValueError(f"{place}, which is not known here; did you mean {near[0]}? then {HINTS[near[0]]}")
    near = [name for name in near if name not in HINTS]
    advice = f"did you mean {' or '.join(near)}? (case matters)" if near else "write it in SI units"
    raise ValueError(f"{place}, which is not known here; {advice}")


def _merged(factors: Iterable[Factor]) -> list[Factor]:
    powers: dict[tuple[str, str], int] = {}
    for prefix, name, exponent in factors:
        if name != "1":
            powers[prefix, name] = powers.get((prefix, name), 0) + exponent
    kept = [(prefix, name, power) for (prefix, name), power in powers.items() if power]
    if any(abs(power) > MAX_EXPONENT for _, _, power in kept):
        raise ValueError(f"found an exponent beyond {MAX_EXPONENT}; expected a unit of this trade")
    if len(kept) > 1 and any(name in {"%", "ppm"} for _, name, _ in kept):
        raise ValueError(
            "found % or ppm beside another unit; expected it alone, or one unit, as in 5.0 V +/- 2 %"
        )
    return kept or [("", "1", 1)]


def _shown(text: str) -> str:
    return repr(text if len(text) <= MAX_LENGTH else text[:MAX_LENGTH] + "...")
