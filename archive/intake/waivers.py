"""Waivers: a warning accepted by a person, with the reason; it stays printed.

Rules: only a warning can be waived. A waiver of a sweep also holds for its channels. A waiver that meets no warning is
told of, since the warning it was written for may have gone or moved.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

from schemas.finding import Finding, Waiver

__all__ = ["apply_waivers"]


def apply_waivers(
    findings: Iterable[Finding], waivers: Sequence[Waiver], *, file: str, line_of: Callable[[int], int]
) -> list[Finding]:
    """Return the findings, each warning that a waiver meets with that waiver, and what is wrong with waivers.

    Parameters
    ----------
    findings : iterable of Finding
        Of all checks.
    waivers : sequence of Waiver
        In the order of the sheet.
    file : str
        The sheet's file name.
    line_of : callable
        Line of a waiver in the sheet, by its position from 0.
    """
    found = list(findings)
    told: list[Finding] = []
    for number, waiver in enumerate(waivers):
        met = [index for index, finding in enumerate(found) if _meets(waiver, finding)]
        for index in met:
            if found[index].severity == "warning" and found[index].waived is None:
                found[index] = found[index].model_copy(update={"waived": waiver})
        severities = {found[index].severity for index in met}
        if "error" in severities:
            told.append(
                Finding(
                    code="waiver-of-error",
                    severity="error",
                    what=f"{waiver.check} in {waiver.place} is an error, and an error cannot be waived",
                    file=file,
                    line=line_of(number),
                    field=f"waiver[{number + 1}]",
                    place=waiver.place,
                    remedy="correct what it is about, or leave the rows out with the reason; then remove the waiver",
                )
            )
        elif "warning" not in severities:
            told.append(
                Finding(
                    code="waiver-without-warning",
                    severity="warning",
                    what=f"there is no warning {waiver.check} in {waiver.place} that this waiver could accept",
                    file=file,
                    line=line_of(number),
                    field=f"waiver[{number + 1}]",
                    place=waiver.place,
                    remedy="remove the waiver, or correct its check or place",
                )
            )
    return [*found, *told]


def _meets(waiver: Waiver, finding: Finding) -> bool:
    place = finding.place or ""
    return waiver.check == finding.code and (place == waiver.place or place.startswith(f"{waiver.place}#"))
