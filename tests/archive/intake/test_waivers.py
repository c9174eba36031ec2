"""Waivers meet warnings, and only them."""

from __future__ import annotations

from datetime import date

import pytest

from archive.intake.waivers import apply_waivers
from schemas.finding import Finding, Severity, Waiver


def finding(
    severity: Severity = "warning", place: str | None = "s017#period", code: str = "time-gap"
) -> Finding:
    """Return a finding."""
    return Finding(code=code, severity=severity, what="there is a gap", place=place)


def waiver(place: str = "s017#period", check: str = "time-gap") -> Waiver:
    """Return a waiver."""
    return Waiver(
        check=check, place=place, reason="the pump was changed", role="data steward", date=date(2026, 3, 20)
    )


def applied(findings: list[Finding], *waivers: Waiver) -> list[Finding]:
    """Return findings with waivers that stand at lines 100, 101, ..."""
    return apply_waivers(findings, waivers, file="cooldown.toml", line_of=lambda number: 100 + number)


def test_a_waived_warning_stays_a_warning_and_names_its_waiver() -> None:
    (result,) = applied([finding()], waiver())
    assert result.severity == "warning"
    assert result.waived == waiver()


@pytest.mark.parametrize(
    ("place", "meets"),
    [("s017#period", True), ("s017", True), ("s01", False), ("s017#per", False), ("s018", False)],
)
def test_a_waiver_holds_for_its_place(place: str, *, meets: bool) -> None:
    results = applied([finding()], waiver(place))
    assert (results[0].waived is not None) is meets
    assert [each.code for each in results[1:]] == ([] if meets else ["waiver-without-warning"])


def test_a_waiver_of_another_check_meets_nothing() -> None:
    results = applied([finding()], waiver(check="thermal-lag"))
    assert results[0].waived is None
    assert (results[1].code, results[1].severity, results[1].line, results[1].field) == (
        "waiver-without-warning",
        "warning",
        100,
        "waiver[1]",
    )


def test_an_error_cannot_be_waived() -> None:
    results = applied([finding("error")], waiver())
    assert results[0].waived is None
    assert (results[1].code, results[1].severity) == ("waiver-of-error", "error")


def test_a_note_needs_no_waiver() -> None:
    results = applied([finding("note")], waiver())
    assert results[0].waived is None
    assert results[1].code == "waiver-without-warning"


def test_of_several_findings_each_warning_is_waived() -> None:
    results = applied([finding(), finding(place="s017#drive"), finding("error", "s017")], waiver("s017"))
    assert [each.waived is not None for each in results[:3]] == [True, True, False]
    assert [each.code for each in results[3:]] == ["waiver-of-error"]


def test_the_second_waiver_of_one_warning_changes_nothing() -> None:
    first, second = waiver("s017"), waiver()
    (result,) = applied([finding()], first, second)
    assert result.waived == first


def test_a_finding_without_place_cannot_be_met() -> None:
    results = applied([finding(place=None)], waiver("s017"))
    assert results[0].waived is None
