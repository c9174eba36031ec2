"""Text made harmless for LaTeX, and the environment that applies this to every value.

Rules
-----
* One function escapes every value that a template prints; only `Tex`, which our own code makes, passes as it is.
* The table is looked up once per character, so that no replacement sees the result of another.
* Control characters are dropped, line ends become spaces, and a character that pdflatex lacks is described in words.

References
----------
OWASP Application Security Verification Standard 5.0.0, 1.2.8 (LaTeX injection).
"""

from __future__ import annotations

import unicodedata
from functools import cache
from importlib.resources import files

from jinja2 import DictLoader, StrictUndefined
from jinja2.sandbox import ImmutableSandboxedEnvironment

__all__ = ["Tex", "tex", "tex_environment"]


class Tex(str):
    """LaTeX that our own code made; it is printed as it is."""

    __slots__ = ()


_SPECIAL = {
    "\\": r"\textbackslash{}", "{": r"\{", "}": r"\}", "$": r"\$", "&": r"\&", "#": r"\#", "%": r"\%", "_": r"\_\allowbreak{}", "/": r"/\allowbreak{}",
    "^": r"\textasciicircum{}", "~": r"\textasciitilde{}", "<": r"\textless{}", ">": r"\textgreater{}",
    "|": r"\textbar{}", '"': r"\textquotedbl{}", "`": r"\textasciigrave{}",
    "[": "{[}", "]": "{]}",
}  # fmt: skip
_MATHS = {
    "±": r"\pm", "×": r"\times", "·": r"\cdot", "−": "-", "≤": r"\le", "≥": r"\ge", "≈": r"\approx", "∝": r"\propto",
    "→": r"\rightarrow", "←": r"\leftarrow", "↑": r"\uparrow", "↓": r"\downarrow", "∞": r"\infty", "√": r"\surd",
    "≠": r"\neq", "≪": r"\ll", "≫": r"\gg", "°": r"^{\circ}", "⊥": r"\perp", "∥": r"\parallel", "∂": r"\partial",
    "α": r"\alpha", "β": r"\beta", "γ": r"\gamma", "δ": r"\delta", "ε": r"\epsilon", "ζ": r"\zeta", "η": r"\eta",
    "θ": r"\theta", "ι": r"\iota", "κ": r"\kappa", "λ": r"\lambda", "μ": r"\mu", "ν": r"\nu", "ξ": r"\xi", "π": r"\pi",
    "ρ": r"\rho", "σ": r"\sigma", "ς": r"\varsigma", "τ": r"\tau", "υ": r"\upsilon", "φ": r"\phi", "χ": r"\chi",
    "ψ": r"\psi", "ω": r"\omega", "Γ": r"\Gamma", "Δ": r"\Delta", "Θ": r"\Theta", "Λ": r"\Lambda", "Ξ": r"\Xi",
    "Π": r"\Pi", "Σ": r"\Sigma", "Φ": r"\Phi", "Ψ": r"\Psi", "Ω": r"\Omega", "∑": r"\sum", "∫": r"\int",
}  # fmt: skip
_TEXT = {
    "µ": r"\ensuremath{\mu}", "–": "--", "—": "---", "‘": "`", "’": "'", "“": "``", "”": "''", "„": r"\quotedblbase{}",
    "…": r"\ldots{}", "•": r"\textbullet{}", "§": r"\S{}", "¶": r"\P{}", "©": r"\textcopyright{}", "®": r"\textregistered{}",
    "€": "EUR", "£": r"\pounds{}", "Å": r"\AA{}", "å": r"\aa{}", "ß": r"\ss{}", "ø": r"\o{}", "Ø": r"\O{}", "æ": r"\ae{}",
    "Æ": r"\AE{}", "œ": r"\oe{}", "Œ": r"\OE{}", "ł": r"\l{}", "Ł": r"\L{}", "ı": r"\i{}", "«": r"\guillemotleft{}",
    "»": r"\guillemotright{}", "\u2212": r"\ensuremath{-}", "\u2010": "-{}", "\u2011": "-{}", "K": "K",
    "\u00ad": "", "\u200b": r"\allowbreak{}", "\u200c": "{}", "\u00a0": "~", "\u2009": r"\,", "\u202f": r"\,",
}  # fmt: skip
_SUPER = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻ⁿ", "0123456789+-n")
_SUB = str.maketrans("₀₁₂₃₄₅₆₇₈₉₊₋", "0123456789+-")
# Combining marks that LaTeX has as accents; a letter with one of them is taken apart.
_ACCENTS = {
    "\u0300": "`", "\u0301": "'", "\u0302": "^", "\u0303": "~", "\u0304": "=", "\u0306": "u", "\u0307": ".", "\u0308": '"',
    "\u030a": "r", "\u030b": "H", "\u030c": "v", "\u0327": "c", "\u0328": "k", "\u0323": "d", "\u0331": "b",
}  # fmt: skip


def tex(value: object) -> Tex:
    r"""Return a value as LaTeX text in which nothing is a command.

    Parameters
    ----------
    value : object
        Printed as ``str`` does; a `Tex` is returned as it is.

    Returns
    -------
    Tex
        Printable ASCII only.

    Examples
    --------
    >>> print(tex(r"50 % of \input{x}"))
    50 \% of \textbackslash{}input\{x\}
    >>> print(tex("µm"))
    \ensuremath{\mu}m
    """
    if isinstance(value, Tex):
        return value
    text = (
        " ".join(str(value).split())
        if any(c in str(value) for c in "\n\r\t\v\f\x85\u2028\u2029")
        else str(value)
    )
    # Two hyphens, commas or quotes in a row would become another sign.
    for pair in ("--", ",,", "''"):
        text = text.replace(pair, "\u200c".join(pair))
    return Tex("".join(_one(character) for character in text))


@cache
def _one(character: str) -> str:
    if character in _SPECIAL:
        return _SPECIAL[character]
    if " " <= character <= "~":
        return character
    if character in _TEXT:
        return _TEXT[character]
    if character in _MATHS:
        return rf"\ensuremath{{{_MATHS[character]}}}"
    for table, mark in ((_SUPER, "^"), (_SUB, "_")):
        if ord(character) in table:
            return rf"\ensuremath{{{mark}{{{character.translate(table)}}}}}"
    return _accented(character)


def _accented(character: str) -> str:
    category = unicodedata.category(character)
    if category in ("Cc", "Cf", "Cs", "Co", "Cn"):
        return ""
    if category.startswith("Z"):
        return " "
    parts = unicodedata.normalize("NFD", character)
    if len(parts) == 2 and parts[0].isascii() and parts[0].isalpha() and parts[1] in _ACCENTS:
        letter = (
            {"i": r"\i{}", "j": r"\j{}"}.get(parts[0], parts[0])
            if parts[1] not in "\u0327\u0328\u0323"
            else parts[0]
        )
        return rf"\{_ACCENTS[parts[1]]}{{{letter}}}"
    simple = unicodedata.normalize("NFKD", character)
    if simple.isascii() and simple != character:
        return "".join(_one(each) for each in simple)
    # A character that the fonts of pdflatex lack is named, never dropped and never guessed.
    return f"{{[}}U+{ord(character):04X}{{]}}"


@cache
def tex_environment() -> ImmutableSandboxedEnvironment:
    """Return the environment of LaTeX templates: other delimiters, every value escaped, nothing undefined."""
    folder = files("templates")
    sources = {
        entry.name: entry.read_text(encoding="utf-8")
        for entry in folder.iterdir()
        if entry.name.endswith(".tex.j2")
    }
    return ImmutableSandboxedEnvironment(
        loader=DictLoader(sources),
        block_start_string="((*", block_end_string="*))",
        variable_start_string="(((", variable_end_string=")))",
        comment_start_string="((#", comment_end_string="#))",
        undefined=StrictUndefined, finalize=tex, autoescape=False,
        trim_blocks=True, lstrip_blocks=True, keep_trailing_newline=True,
    )  # fmt: skip
