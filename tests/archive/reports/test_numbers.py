"""Numbers as they are shown: rounded once, never bare, the same digits in every spelling."""

from __future__ import annotations

import math

import pytest

from archive.reports.appendix_tables import number_and_unit
from archive.reports.numbers import shown, shown_output, shown_value
from archive.reports.prose import prose, symbol_of
from schemas.lineage import OutputEntry, Value
from schemas.quantity import Quantity


@pytest.mark.parametrize(
    ("value", "uncertainty", "expected"),
    [
        (0.73124, 0.00119, "0.7312(12)"),
        (0.0996, 0.00995, "0.100(10)"),
        (9.96, 0.996, "10.0(1.0)"),
        (1234.0, 120.0, "1.23(12)e3"),
        (-0.001, 0.01, "-0.001(10)"),
    ],
    ids=["two-digits", "carry", "crosses-the-point", "power-of-ten", "near-zero"],
)
def test_a_value_is_rounded_to_two_digits_of_its_uncertainty(value, uncertainty, expected):
    # GUM 7.2.6; the digits are worked by hand.
    made = shown(Quantity(value=value, uncertainty=uncertainty, unit="Hz", kind="frequency"))
    assert made.plain == f"{expected} Hz"
    assert made.latex.startswith(rf"\val{{{expected}}}")


@pytest.mark.parametrize("value", [math.nan, math.inf])
def test_what_is_no_number_is_said_to_be_lost(value):
    output = OutputEntry.model_construct(
        name="T", quantity="temperature", unit="K", value=value, uncertainty=0.1, verdict=None, scale=None
    )
    assert shown_output(output).plain == "[lost]"


def test_an_uncertainty_of_zero_is_never_shown_as_exact():
    assert shown_value(Value(value=1.5, uncertainty=0.0, unit="K"), "temperature").plain == "1.5 K [u nr]"


def test_what_was_counted_is_exact():
    order = OutputEntry(
        name="order",
        quantity="count",
        unit="1",
        description="highest power",
        step=1,
        value=5.0,
        digest="0" * 64,
    )
    shape = order.model_copy(update={"quantity": "number"})
    assert (shown_output(order).plain, number_and_unit(order)[0].plain) == ("5", "5")
    assert (shown_output(shape).plain, number_and_unit(shape)[0].plain) == ("5 [u nr]", "5 [u nr]")


def test_a_verdict_stands_in_place_of_a_number():
    output = OutputEntry.model_construct(
        name="f",
        quantity="frequency",
        unit="Hz",
        value=None,
        uncertainty=0.0,
        verdict="no resonance in range",
        scale=None,
    )
    assert shown_output(output).plain == "no resonance in range"
    assert shown(None).plain == "[nr]"


@pytest.mark.parametrize(
    ("sentence", "latex"),
    [
        ("Q = 3.97(4)e5.", r"Q = $3.97(4)\times 10^{5}$."),
        ("at 0.25(1) K", r"at \val{0.25(1)}{0.25(1)}{K}{K}"),
        ("T_KT and chi^2", r"\ensuremath{T_{\mathrm{KT}}} and \ensuremath{\chi^{2}}"),
        ("(1 - T/T_c)^zeta", r"(1 - T/\allowbreak{}\ensuremath{T_{c}})\ensuremath{^{\zeta}}"),
        ("2026-03/s001@film.1", r"2026-03/\allowbreak{}s001@film.1"),
        ("digest 1e45 0000 9e12 abcd", "digest 1e45 0000 9e12 abcd"),
        (r"\input{x} 3 K", r"\textbackslash{}input\{x\} \val{3}{3}{K}{K}"),
    ],
    ids=["power", "unit", "symbols", "exponent", "address", "digest", "hostile"],
)
def test_a_sentence_is_set_without_changing_its_digits(sentence, latex):
    assert prose(sentence).latex == latex
    assert prose(sentence).plain == sentence


def test_html_of_a_sentence_is_escaped():
    assert prose("<b> T_c & 3").__html__() == "&lt;b&gt; <i>T</i><sub>c</sub> &amp; 3"


def test_names_of_outputs_are_symbols_or_words():
    assert symbol_of("T_KT").__html__() == "<i>T</i><sub>KT</sub>"
    assert str(symbol_of("mass_sensitivity")) == "mass sensitivity"
