"""Sentences of steps and checks set properly: numbers, units and symbols in them, for paper, page and LaTeX.

Rules: digits are never changed here, only how they stand; what is not recognised stays as it was written.
"""

from __future__ import annotations

import html
import re
from dataclasses import dataclass
from functools import cache
from itertools import chain

from typing_extensions import override

from archive.reports.tex import Tex, tex
from schemas.kinds import KINDS
from schemas.uncertain_text import RoundedText
from schemas.units import parse_unit

__all__ = ["Piece", "Prose", "article", "breakable", "prose", "symbol_of"]

# Words longer than this may break: names have up to 64 characters, addresses 200.
_LONGEST_UNBROKEN = 20
_PIECE = 12

_GREEK = {
    "alpha": "α", "chi": "χ", "sigma": "σ", "zeta": "ζ", "rho": "ρ", "tau": "τ", "kappa": "κ", "omega": "ω", "lambda": "λ", "theta": "θ", "xi": "ξ",
    "Gamma": "Γ", "Delta": "Δ", "hbar": "ħ",
}  # fmt: skip
# With a power of ten one digit stands before the point: that keeps hexadecimal digests apart from numbers.
_NUMBER = (
    r"(?:(?P<scaled>[+-]?\d(?:\.\d+)?)(?:\((?P<scaled_bracket>\d+(?:\.\d+)?)\))?e(?P<power>[+-]?\d{1,3})"
    r"|(?P<digits>[+-]?\d+(?:\.\d+)?)(?:\((?P<bracket>\d+(?:\.\d+)?)\))?)"
)
_DIGEST = r"(?P<digest>(?<![0-9A-Za-z])(?:(?:[0-9a-f]{4} ){3,15}[0-9a-f]{4}|[0-9a-f]{16,64})(?![0-9A-Za-z]))"
# A name or number with its sign, a sign alone (the side of a transition), or a short sum or ratio in brackets, which are not printed.
_RAISED = r"-?(?:\d+\.\d+|[A-Za-z0-9]+)|[+-](?![A-Za-z0-9])|\([A-Za-z0-9+/ -]{1,12}\)"
_SYMBOL = rf"(?P<base>{'|'.join(_GREEK)}|[A-Za-z])(?:_(?P<sub>[A-Za-z0-9]{{1,6}}))?(?:\^(?P<sup>{_RAISED}))?(?![A-Za-z0-9_]|\.[A-Za-z0-9])"


@dataclass(frozen=True)
class Piece:
    """A stretch of a sentence: its text, ``sub``, ``sup`` or ``i`` for how it stands, and its LaTeX."""

    text: str
    style: str
    latex: Tex


@dataclass(frozen=True)
class Prose:
    """A sentence set properly."""

    plain: str
    pieces: tuple[Piece, ...]

    @override
    def __str__(self) -> str:
        return self.plain

    def __html__(self) -> str:
        """Return the sentence as HTML, every text in it escaped."""
        tags = {"sub": "sub", "sup": "sup", "i": "i"}
        return "".join(
            f"<{tags[piece.style]}>{html.escape(piece.text)}</{tags[piece.style]}>"
            if piece.style
            else html.escape(piece.text)
            for piece in self.pieces
        )

    @property
    def latex(self) -> Tex:
        """The sentence as LaTeX."""
        return Tex("".join(piece.latex for piece in self.pieces))


@cache
def _pattern() -> re.Pattern[str]:
    names = set(chain.from_iterable((*kind.display, *kind.si, *kind.examples) for kind in KINDS.values()))
    names |= {"ns m^2/kg", "ns/mmol", "min", "d", "cm^3/mol"}
    names -= {"1", "A", "T"}
    units = "|".join(re.escape(name) for name in sorted(names, key=lambda name: (-len(name), name)))
    return re.compile(
        rf"{_DIGEST}|(?<![A-Za-z0-9_.#@/-]){_NUMBER}(?:(?P<space> ?)(?P<unit>{units})(?![A-Za-z0-9_^/]))?(?![A-Za-z0-9_]|\.\d)"
        rf"|(?<![A-Za-z0-9_.#@-]){_SYMBOL}"
        rf"|(?:(?<=[)|])|(?<=layer))\^(?P<power_of>{_RAISED})",
        re.ASCII,  # digits of other scripts are no numbers here, and LaTeX lacks them
    )


@cache
def prose(sentence: str) -> Prose:
    r"""Return a sentence with its numbers, units and symbols set.

    Examples
    --------
    >>> str(prose("The rise is 168.0(3) ns/mmol.").latex)
    'The rise is \\val{168.0(3)}{168.0(3)}{ns.mmol^{-1}}{ns\\,mmol^{-1}}.'
    """
    pieces: list[Piece] = []
    end = 0
    for found in _pattern().finditer(sentence):
        if found["digest"]:
            made: list[Piece] | None = [_text(found["digest"])]
        else:
            made = _number(found) if found["digits"] or found["scaled"] else _symbol(found)
        if made is None:
            continue
        if found.start() > end:
            pieces.append(_text(sentence[end : found.start()]))
        pieces += made
        end = found.end()
    if end < len(sentence):
        pieces.append(_text(sentence[end:]))
    return Prose(sentence, tuple(pieces))


def article(words: str) -> str:
    """Return the indefinite article that words of a record take.

    Examples
    --------
    >>> article("annulus"), article("cylinder"), article("U-tube")
    ('an', 'a', 'a')
    """
    return "an" if words[:1].lower() in "aeio" and words else "a"


def symbol_of(name: str) -> Prose:
    """Return the name of an output as a symbol (``T_KT``), a symbol with words (``T_KT_by_fit``) or as words (``mass_sensitivity``)."""
    begin = re.fullmatch(r"([A-Z]_[A-Za-z]{1,6})_([a-z].*)", name)
    if begin:
        return prose(f"{begin[1]} {begin[2].replace('_', ' ')}")
    found = prose(name)
    return found if found.pieces and found.pieces[0].style else prose(name.replace("_", " "))


def _text(text: str) -> Piece:
    return Piece(text, "", tex(breakable(text)))


def breakable(text: str, most: int = _LONGEST_UNBROKEN, piece: int = _PIECE) -> str:
    """Return a text in which long words may break: a zero-width space after the marks of an address, and every few characters of what is between.

    Examples
    --------
    >>> breakable("2025-11/s001@empty-calorimeter.1").split("\u200b")
    ['2025-11/', 's001@', 'empty-', 'calorimeter.', '1']
    """
    return " ".join(word if len(word) <= most else _broken(word, piece) for word in text.split(" "))


def _broken(word: str, piece: int) -> str:
    # Not within a date or a range of numbers.
    parts = [part for part in re.split(r"(?<=[/@#._])|(?<=-)(?=[A-Za-z])", word) if part]
    return "\u200b".join(part[k : k + piece] for part in parts for k in range(0, len(part), piece))


def _number(found: re.Match[str]) -> list[Piece] | None:
    if not found["unit"] and not found["power"] and not found["bracket"]:
        if found["digits"].startswith("-"):
            return [Piece("\u2212" + found["digits"][1:], "", Tex(f"${found['digits']}$"))]
        return None
    digits, bracket = (
        (found["scaled"], found["scaled_bracket"]) if found["scaled"] else (found["digits"], found["bracket"])
    )
    number = RoundedText(digits.removeprefix("+"), bracket or "", int(found["power"] or 0))
    if not found["unit"]:
        return [Piece(number.typographic(), "", Tex(f"${number.maths()}$"))]
    unit = parse_unit(found["unit"])
    macro = rf"\val{{{number.plain()}}}{{{number.maths()}}}{{{unit.siunitx}}}{{{unit.latex}}}"
    return [Piece(f"{number.typographic()}\u00a0{unit.typographic}", "", Tex(macro))]


def _symbol(found: re.Match[str]) -> list[Piece] | None:
    if found["power_of"]:
        raised = found["power_of"]
        return [Piece(_spoken(raised), "sup", Tex(rf"\ensuremath{{^{{{_inner(raised)}}}}}"))]
    base, sub, sup = found["base"], found["sub"], found["sup"]
    if sub is None and sup is None and base not in _GREEK:
        return None
    greek = base in _GREEK
    letter = rf"\{base}" if greek else base
    latex = letter + (f"_{{{_inner(sub)}}}" if sub else "") + (f"^{{{_inner(sup)}}}" if sup else "")
    pieces = [Piece(_GREEK.get(base, base), "i", Tex(rf"\ensuremath{{{latex}}}"))]
    pieces += [Piece(_GREEK.get(sub, sub), "sub", Tex(""))] if sub else []
    pieces += [Piece(_spoken(sup), "sup", Tex(""))] if sup else []
    return pieces


def _spoken(raised: str) -> str:
    """Return what is raised, as it stands on a page."""
    words = re.findall(r"[A-Za-z0-9.]+|[^A-Za-z0-9.()]", raised)
    return "".join("\u2212" if word == "-" else _GREEK.get(word, word) for word in words)


def _inner(text: str) -> str:
    """Return what is raised or lowered, as LaTeX within maths."""
    words = re.findall(r"[A-Za-z0-9.]+|[^A-Za-z0-9.()]", text)
    return "".join(
        rf"\{word}" if word in _GREEK
        else word if len(word) == 1 or word.replace(".", "").isdigit()
        else rf"\mathrm{{{word}}}"
        for word in words
    )  # fmt: skip
