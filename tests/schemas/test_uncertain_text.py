"""Numbers are rounded once, to two digits of their uncertainty, and look the same in every form."""

from __future__ import annotations

import math
import re
import subprocess
from decimal import Decimal
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from schemas.kinds import KINDS
from schemas.quantity import Quantity
from schemas.uncertain_text import RoundedText, html_text, in_preferred_unit, latex_text, plain_text, rounded
from schemas.unit_names import NAMES
from schemas.units import parse_unit
from tests.outside import program

# Expected by hand from GUM 7.2.6: two digits of u, value to the same place, ties to even.
ROUNDED = [
    (0.0996, 0.00995, "0.100(10)"),  # 99.5 is a tie and goes to 100, which is 10 one place up
    (9.96, 0.996, "10.0(1.0)"),
    (1234.0, 120.0, "1.23(12)e3"),
    (-0.00, 0.01, "0.000(10)"),
    (-0.0001, 0.01, "0.000(10)"),
    (0.73124, 0.00119, "0.7312(12)"),
    (123.45, 1.20, "123.4(1.2)"),  # tie to even
    (123.55, 1.20, "123.6(1.2)"),  # tie to even
    (0.12345, 0.0025, "0.1234(25)"),
    (1.0, 0.0125, "1.000(12)"),  # u itself ties to even
    (1.0, 0.0135, "1.000(14)"),
    (1234.5, 0.7, "1234.50(70)"),
    (3.214e-5, 5.2e-7, "3.214(52)e-5"),
    (5.0, 9.94, "5.0(9.9)"),
    (50.0, 9.96, "5.0(1.0)e1"),
    (99.9, 9.96, "1.00(10)e2"),
    (1234.0, 12.0, "1.234(12)e3"),
    (0.0, 120.0, "0.0(1.2)e2"),
    (5.0, 1200.0, "0.0(1.2)e3"),
    (0.0, 1.2e-9, "0.0(1.2)e-9"),
    (-31.42, 0.06, "-31.420(60)"),
    (0.001234, 0.000012, "0.001234(12)"),
    (1e300, 1.2e299, "1.00(12)e300"),
    (5e-324, 5e-324, "5.0(5.0)e-324"),  # the smallest float, whose shortest decimal form is 5e-324
]


@pytest.mark.parametrize(
    ("value", "uncertainty", "text"), ROUNDED, ids=[f"{row[0]!r} u {row[1]!r}" for row in ROUNDED]
)
def test_value_and_uncertainty_are_rounded_together(value: float, uncertainty: float, text: str) -> None:
    assert rounded(value, uncertainty).plain() == text


WITHOUT = [
    (0.731, "0.731"),
    (0.0, "0"),
    (-0.0, "0"),
    (1200.0, "1200"),
    (123456.0, "123456"),
    (1234567.0, "1.234567e6"),
    (1e-4, "0.0001"),
    (1.5e-5, "1.5e-5"),
    (1e22, "1e22"),
    (-2.5e-9, "-2.5e-9"),
    (123.456789012, "123.456789012"),
]


@pytest.mark.parametrize(("value", "text"), WITHOUT, ids=[f"{row[0]!r}" for row in WITHOUT])
def test_without_an_uncertainty_up_to_twelve_digits_stay(value: float, text: str) -> None:
    assert rounded(value, None).plain() == text
    assert float(text) == value


@pytest.mark.parametrize(
    ("value", "uncertainty"),
    [
        (math.nan, 1.0),
        (math.inf, 1.0),
        (1.0, math.nan),
        (1.0, math.inf),
        (0.0, 0.0),
        (1.0, 0.0),
        (1.0, -0.1),
        (math.nan, None),
    ],
)
def test_what_cannot_be_rounded_is_refused(value: float, uncertainty: float | None) -> None:
    with pytest.raises(ValueError, match=r"found (value|uncertainty) .*expected"):
        rounded(value, uncertainty)


def test_more_than_twelve_digits_are_shown_only_of_an_exact_value() -> None:
    assert rounded(2.0 / 3.0, None).plain() == "0.666666666667"
    assert rounded(9999999999999.0, None).plain() == "1e13"
    assert rounded(2.718281828459045, 0.0, exact=True).plain() == "2.718281828459045"


def test_zero_uncertainty_is_shown_only_for_an_exact_value() -> None:
    assert rounded(2.5, 0.0, exact=True) == RoundedText("2.5", "")
    assert plain_text(Quantity.parse("2.5 m (exact)", "length")) == "2.5 m (exact)"


def test_the_three_forms_of_one_quantity() -> None:
    quantity = Quantity.parse("-3.214(52)e-5 mol/m^2", "coverage")
    assert plain_text(quantity) == quantity.format() == str(quantity) == "-3.214(52)e-5 mol/m^2"
    assert html_text(quantity) == "−3.214(52)\u2009×\u200910⁻⁵\u00a0mol·m⁻²"
    # the form of the four arguments: siunitx number, maths number, siunitx unit, maths unit
    assert latex_text(quantity) == r"\val{-3.214(52)e-5}{-3.214(52)\times 10^{-5}}{mol.m^{-2}}{mol\,m^{-2}}"


def test_words_follow_the_unit_in_every_form() -> None:
    quantity = Quantity(value=0.7312, uncertainty=0.0012, unit="K", kind="temperature", scale="A_1 & <b>")
    assert plain_text(quantity) == "0.7312(12) K on A_1 & <b>"
    assert html_text(quantity) == "0.7312(12)\u00a0K\u00a0on A_1 &amp; &lt;b&gt;"
    assert latex_text(quantity).endswith(r"{K}{K}~on A\_1 \& <b>")
    assert plain_text(Quantity.parse("1.20(5) V rms", "drive")) == "1.200(50) V rms"


PREFERRED = [
    ("0.00731(2) K", "temperature", "7.310(20) mK"),
    ("2.0(1) K", "temperature", "2.00(10) K"),
    ("5e-12 m^3", "volume", "0.005 mm^3"),
    ("3.142e-5 mol/m^2", "coverage", "31.42 umol/m^2"),
    ("1200 Pa", "pressure", "1.2 kPa"),
    ("2 Torr", "pressure", "266.644736842 Pa"),
    ("1e-9 W", "power", "1 nW"),
    ("0 K", "temperature", "0 mK"),
    ("0.0(2) mK", "temperature", "0.00(20) mK"),
    ("60(140) nmol", "amount", "0.06(14) umol"),
    ("600(14) nmol", "amount", "0.600(14) umol"),
    ("0.5(9.9) nmol", "amount", "0.5(9.9) nmol"),
    ("0.5(9.96) nmol", "amount", "0.000(10) umol"),
    ("20 uA rms", "drive", "20 uA rms"),
    ("0.02 V rms", "drive", "20 mV rms"),
    ("3.3e5", "quality_factor", "330000"),
    ("0.5", "fraction", "0.5"),
    ("2.5(1)e-6", "dissipation", "2.50(10) ppm"),
    ("2.4(1)e-7", "dissipation", "2.40(10)e-7"),
    ("5.61(30)", "dissipation", "5.61(30)"),
    ("0.1", "dissipation", "0.1"),
    ("90 deg", "phase", "1.57079632679 rad"),
]


@pytest.mark.parametrize(("written", "kind", "shown"), PREFERRED, ids=[row[0] for row in PREFERRED])
def test_a_display_unit_is_chosen(written: str, kind: str, shown: str) -> None:
    found = in_preferred_unit(Quantity.parse(written, kind))
    assert plain_text(found) == shown


NUMBERS = st.floats(allow_nan=False, allow_infinity=False).filter(
    lambda number: abs(number) not in {9.9e37, 9.91e37}
)
SPREADS = st.floats(min_value=1e-300, max_value=1e300)


@settings(max_examples=300, deadline=None)
@given(NUMBERS, SPREADS)
def test_rounding_keeps_two_digits_and_stays_within_half_of_the_last_place(
    value: float, uncertainty: float
) -> None:
    text = rounded(value, uncertainty)
    digits = text.bracket.replace(".", "").lstrip("0")
    assert len(digits) == 2
    places = len(text.digits.partition(".")[2])
    last = Decimal(1).scaleb(text.power - places)
    shown_spread = Decimal(int(digits)) * last
    assert abs(shown_spread - Decimal(repr(uncertainty))) <= last / 2
    shown = Decimal(text.digits).scaleb(text.power)
    assert abs(shown - Decimal(repr(value))) <= last / 2
    # nothing that needs a power of ten is left: the printed u is below 10
    if "." in text.bracket:
        assert Decimal(text.bracket) < 10
    assert "E" not in text.digits


@settings(max_examples=300, deadline=None)
@given(
    st.sampled_from(sorted(KINDS)),
    st.floats(min_value=-1e12, max_value=1e12),
    st.none() | st.floats(min_value=1e-12, max_value=1e12),
)
def test_what_is_shown_reads_back_and_shows_the_same(
    kind: str, value: float, uncertainty: float | None
) -> None:
    for unit in KINDS[kind].display:
        quantity = Quantity(value=value, uncertainty=uncertainty, unit=unit, kind=kind)
        for text in (plain_text(quantity), html_text(quantity)):
            again = Quantity.parse(text, kind)
            assert plain_text(again) == plain_text(quantity)
            assert again.unit == quantity.unit
        if uncertainty is None:
            assert math.isclose(Quantity.parse(plain_text(quantity), kind).value, value, rel_tol=1e-11)


def test_the_typographic_form_needs_no_escaping() -> None:
    for name, row in NAMES.items():
        for word in ([name] if row.bare else []) + [prefix + name for prefix in row.prefixes]:
            assert not set("<>&\"'") & set(parse_unit(word).typographic)


@pytest.mark.latex
def test_every_unit_compiles_without_siunitx(tmp_path: Path) -> None:
    pdflatex = program("pdflatex")
    lines = [
        r"\documentclass{article}",
        r"\newcommand{\val}[4]{\ensuremath{#2\,\mathrm{#4}}}",
        r"\begin{document}",
    ]
    lines += [
        latex_text(Quantity(value=3.2e-7, uncertainty=1e-8, unit=unit, kind=kind.name)) + r"\par"
        for kind in KINDS.values()
        for unit in sorted({*kind.si, *kind.display, *kind.examples})
    ]
    (tmp_path / "units.tex").write_text("\n".join([*lines, r"\end{document}", ""]), encoding="utf-8")
    done = subprocess.run(
        [pdflatex, "-interaction=nonstopmode", "-halt-on-error", "-no-shell-escape", "units.tex"],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=False,
        errors="replace",
    )
    assert done.returncode == 0, done.stdout[-2000:]
    assert not re.search(r"Missing character|Overfull", done.stdout)
