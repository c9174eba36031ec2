"""Escaping for LaTeX: nothing a person writes is a command, and every character comes out or is named."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from jinja2 import UndefinedError
from jinja2.exceptions import SecurityError

from archive.reports.tex import Tex, tex, tex_environment


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (r"\input{x}", r"\textbackslash{}input\{x\}"),
        ("50 % & $5 #1 a_b x^2 ~", r"50 \% \& \$5 \#1 a\_\allowbreak{}b x\textasciicircum{}2 \textasciitilde{}"),
        ("<a|b>\"`", r"\textless{}a\textbar{}b\textgreater{}\textquotedbl{}\textasciigrave{}"),
        ("^^5cinput", r"\textasciicircum{}\textasciicircum{}5cinput"),
        ("a\nb\r\nc\td", "a b c d"),
        ("a\x00b\x1bc\x7fd", "abcd"),
        ("5 µm ± 1 × 2", r"5 \ensuremath{\mu}m \ensuremath{\pm} 1 \ensuremath{\times} 2"),
        ("Müller, Łódź", r"M\"{u}ller, \L{}\'{o}d\'{z}"),
        ("m⁻²", r"m\ensuremath{^{-}}\ensuremath{^{2}}"),
        ("氦", "{[}U+6C26{]}"),
        ("--", "-{}-"),
        ("[x]", "{[}x{]}"),
        ("right\u202eleft", "rightleft"),
    ],
    ids=["command", "specials", "angles", "caret-spelling", "line-ends", "controls", "signs", "accents", "superscripts", "named", "dashes", "brackets", "direction"],
)  # fmt: skip
def test_a_text_becomes_harmless(text, expected):
    assert tex(text) == expected


def test_what_our_own_code_made_passes_as_it_is():
    assert tex(Tex(r"\val{1}{1}{K}{K}")) == r"\val{1}{1}{K}{K}"


@given(st.text(max_size=200))
@settings(max_examples=300, deadline=None)
def test_any_text_is_printable_ascii_with_balanced_braces(text):
    made = tex(text)
    assert all(" " <= each <= "~" for each in made)
    bare = made.replace(r"\{", "").replace(r"\}", "")
    assert bare.count("{") == bare.count("}")
    assert r"\input" not in made
    assert r"\write" not in made


def test_a_template_escapes_every_value_and_refuses_what_is_not_there():
    environment = tex_environment()
    assert environment.from_string("a ((( x )))").render(x="50 %") == r"a 50 \%"
    with pytest.raises(UndefinedError):
        environment.from_string("((( missing )))").render()
    with pytest.raises(SecurityError):
        environment.from_string("((( x.__class__.__mro__ )))").render(x="")
